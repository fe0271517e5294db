import stringWidth from 'string-width'
import { describe, expect, it } from 'vitest'
import { textReport } from '../../src/reports/text.js'
import { checkText, storyText } from '../findings/story.js'

/** Hostile and wide names in every place that a report shows. */
const NAMES = [
  '\u001b[31mred\u001b[0m',
  'a\r\nb\tc',
  '\u202egnirts',
  '港口/泊位-七号',
  'e\u0301'.repeat(40),
  '👩‍👩‍👧'.repeat(20),
  'x'.repeat(500),
  '\u0000\u0007\u0090',
]

function history(name: string): string {
  const n = JSON.stringify(name)
  return [
    `{"history":1,"title":${n}}`,
    `{"client":${n},"op":"write","key":${n},"value":${n},"start":1,"end":2}`,
    `{"client":${n},"op":"write","key":${n},"value":{${n}:[${n}]},"start":3,"end":4}`,
    `{"client":"kiosk","op":"read","key":${n},"value":${n},"start":5,"end":6}`,
    `{"mark":${n},"start":1}`,
  ]
    .join('\n')
    .concat('\n')
}

describe('the text of a result', () => {
  it.each([60, 80, 100, 200])('keeps to %i columns, whatever stands in the input', async (width) => {
    for (const name of NAMES) {
      const { result } = await checkText(history(name))
      const text = textReport(result, { width, colour: false, limit: 20, out: 'findings' })
      for (const line of text.split('\n')) expect(stringWidth(line), line).toBeLessThanOrEqual(width)
    }
  })

  it('never sends control or direction characters to the terminal', async () => {
    for (const name of NAMES) {
      const { result } = await checkText(history(name))
      const text = textReport(result, { width: 100, colour: false, limit: 20 })
      expect(text.replaceAll('\n', '')).not.toMatch(/[\p{Cc}\u202a-\u202e\u2066-\u2069]/u)
    }
  })

  it('has colour only when asked for', async () => {
    const { result } = await checkText(storyText('A w1 | A w2 | C r1'))
    expect(textReport(result, { width: 100, colour: false, limit: 20 })).not.toContain('\u001b[')
    expect(textReport(result, { width: 100, colour: true, limit: 20 })).toContain('\u001b[')
  })

  it('tells findings of one cause together, the worst first', async () => {
    const { result } = await checkText(storyText('A w1 | A w2 | C r1 | A r1 | D r2'))
    const text = textReport(result, { width: 100, colour: false, limit: 20 })
    expect(result.findings).toHaveLength(2)
    expect(text.indexOf('own-write-missed  k')).toBeLessThan(
      text.indexOf('stale-read  k') < 0 ? Number.POSITIVE_INFINITY : text.indexOf('stale-read  k'),
    )
    expect(text).toContain('own-write-missed')
  })
})

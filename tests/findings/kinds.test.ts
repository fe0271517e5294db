/** The examples of the contract for findings, and more of their kind. */
import { describe, expect, it } from 'vitest'
import { findingsOf } from './story.js'

const CASES: [story: string, kinds: string[]][] = [
  ['A w1 | A w2 | C r1 | D r1', ['lost-write']],
  ['A w1 | A w2 | C r1 | D r2', ['stale-read']],
  // One read does not prove a loss.
  ['A w1 | A w2 | C r1', ['stale-read']],
  ['A w1 | C r1 | A w2 | C r2 | D r1 | A w3 | D r3', ['reverted-value']],
  // The newer value comes back: it flaps, so each stale read is told by itself.
  ['A w1 | C r1 | A w2 | C r2 | D r1 | E r2', ['stale-read']],
  ['B w1 | A w2 | A r1 | C r2', ['own-write-missed']],
  ['A w1 | B w2~ | C r2 | D r1', ['read-inversion']],
  ['A w1 | B w2~ | C r2 | C r1', ['backward-read']],
  ['A w1 | B w2? | C r2 | D r1', ['read-inversion']],
  ['A w1 & B w2 | C r1 & D r2', ['order-conflict']],
  ['A w1 | B r7', ['unwritten-value']],
  ['A w1! | B r1', ['refused-write-seen']],
  ['B r1 | A w1', ['early-read']],
  ['A w{"a":1,"b":1} | B w{"a":2,"b":2} | C r{"a":1,"b":2}', ['torn-row']],
  // All members from one write: part of a row, but not torn.
  ['A w{"a":1,"b":1} | C r{"a":1}', ['unwritten-value']],
  ['A w1 | B c1>2 & C c1>3', ['lost-update']],
  ['B cnull>2 & C cnull>3', ['lost-update']],
  // Counters
  ['B r0 | C i | D r0', ['lost-increment']],
  ['B r0 | C i | D r2', ['repeated-increment']],
  ['A i~ | B r1 | C r0', ['backward-counter']],
  ['A i=1 & B i=1', ['lost-increment']],
  ['A i | C r{"a":1}', ['unwritten-value']],
  // After a blamed read the count goes on from it: one lost increment does not accuse every later read.
  ['B r0 | C i | D r0 | C i | D r1 | C i | D r2', ['lost-increment']],
]

describe('findings are called what a person would say was seen', () => {
  it.each(CASES)('%s', async (story, kinds) => {
    expect((await findingsOf(story)).map(({ kind }) => kind)).toEqual(kinds)
  })

  it('tells of the increment that was lost between 5 and 5', async () => {
    const [finding] = await findingsOf('B r5 | C i | D r5', undefined, { initial: { k: 5 } })
    expect(finding.kind).toBe('lost-increment')
    expect(finding.bounds).toEqual({ from: 0, fromCount: '5', toCount: '5', least: '1', most: '1' })
    expect(finding.summary).toContain('it should be 6 or more')
  })

  it('names older lost writes in the finding of the newest', async () => {
    const findings = await findingsOf('A w1 | A w2 | A w3 | C r1 | D r1')
    expect(findings.map(({ kind }) => kind)).toEqual(['lost-write'])
    expect(findings[0].summary).toMatch(/write of 3 .* \(and 1 older acknowledged write with it\)/)
  })

  it('does not tell losses under promises that are not about them', async () => {
    const story = 'A w1 | A w2 | A r1 | C r1'
    expect((await findingsOf(story, 'linearizable')).map(({ kind }) => kind)).toEqual(['lost-write'])
    expect((await findingsOf(story, 'read-your-writes')).map(({ kind }) => kind)).toEqual([
      'own-write-missed',
    ])
  })

  it.each([
    ['A w1 | A w2 | A w3 | C r1', 'bounded-staleness versions=1', ['stale-read']],
    ['A w1 | A w2 | A w3 | C r2', 'bounded-staleness versions=1', []],
    ['A w1 | A w2 | C w3 | C r1', 'bounded-staleness versions=1', ['own-write-missed']],
    ['A w1 | B c1>2 & C c1>3', 'no-lost-updates', ['lost-update']],
    ['A w1 | A w2 | C r1 | D r1', 'durable', ['lost-write']],
    ['A w1 | A w2 | C r1 | D r1', 'coherent', []],
    ['A w1 | C r1 | A w2 | C r2 | C r1', 'monotonic-reads', ['backward-read']],
    ['A w1 | C r1 | A w2 | C r2 | C r1', 'read-your-writes', []],
  ])('%s under %s', async (story, promise, kinds) => {
    expect((await findingsOf(story, promise)).map(({ kind }) => kind)).toEqual(kinds)
  })
})

/** The library as its user sees it. */
import { describe, expect, it } from 'vitest'
import {
  check,
  InputError,
  jsonReport,
  parsePromise,
  readHistory,
  resultSchema,
  surveyHistory,
  textReport,
  textSource,
} from '../src/index.js'

const text = `{"client":"a","op":"write","key":"berth/1","value":18446744073709551615,"start":1,"end":2}
{"client":"b","op":"read","key":"berth/1","value":null,"start":3,"end":4,"trace":"4bf92f35"}
`

describe('the library', () => {
  it('reads, checks and reports', async () => {
    const sources = [textSource('drill.ndjson', text)]
    const history = await readHistory(sources)
    const { result, counterexamples } = await check(history, sources, {
      promises: [parsePromise('linearizable'), parsePromise('written-values')],
      counterexamples: 1,
    })
    expect(resultSchema.parse(JSON.parse(jsonReport(result)))).toEqual(result)
    expect(result.promises.map(({ verdict }) => verdict)).toEqual(['broken', 'holds'])
    expect(result.findings[0].operations[0].record).toBe(text.split('\n')[0])
    // Unknown fields come back unchanged.
    expect(counterexamples[0].text).toContain('"trace":"4bf92f35"')
    expect(textReport(result, { width: 80, colour: false, limit: 5 })).toContain('stale-read')
    expect(surveyHistory(history).keys).toEqual({ register: 1, counter: 0, mixed: 0 })
  })

  it('refuses what it cannot use with problems as data', async () => {
    await expect(readHistory([textSource('bad', '{')])).rejects.toBeInstanceOf(InputError)
  })

  it('counts keys on which nothing was tested', async () => {
    const sources = [textSource('f', text.split('\n')[0].concat('\n'))]
    const { result } = await check(await readHistory(sources), sources, {
      promises: [parsePromise('linearizable')],
      everyKey: true,
    })
    expect(result.promises[0]).toMatchObject({ verdict: 'holds', holds: 1, untested: 1 })
    expect(result.keys[0].untested).toEqual(['linearizable'])
  })
})

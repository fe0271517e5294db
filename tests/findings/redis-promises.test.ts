/** Which promises clients of a real Redis lose by where they read (recordings and how they were made: histories/README.md). */
import { describe, expect, it } from 'vitest'
import { check } from '../../src/findings/check.js'
import { readHistory } from '../../src/history/read.js'
import { fileSource } from '../../src/history/source.js'
import { parsePromise } from '../../src/promises/parse-request.js'

const PROMISES = [
  'written-values',
  'read-your-writes',
  'monotonic-reads',
  'writes-follow-reads',
  'regular',
  'linearizable',
  'causal',
]

async function verdicts(file: string): Promise<Record<string, string>> {
  const sources = [await fileSource(`histories/${file}`)]
  const { result } = await check(await readHistory(sources), sources, {
    promises: PROMISES.map(parsePromise),
  })
  return Object.fromEntries(result.promises.map(({ name, verdict }) => [name, verdict]))
}

describe('a real Redis primary and replica', () => {
  it('keeps every promise to clients of the primary', async () => {
    expect(Object.values(await verdicts('redis-primary.ndjson.gz'))).toEqual(PROMISES.map(() => 'holds'))
  })

  it('read-your-writes is lost to clients that read from the replica; by one connection each they never go back', async () => {
    expect(await verdicts('redis-replica.ndjson.gz')).toMatchObject({
      'written-values': 'holds',
      'read-your-writes': 'broken',
      'monotonic-reads': 'holds',
      'writes-follow-reads': 'holds',
      regular: 'broken',
      linearizable: 'broken',
    })
  })

  it('and clients that read from either server go back as well', async () => {
    expect(await verdicts('redis-either.ndjson.gz')).toMatchObject({
      'written-values': 'holds',
      'read-your-writes': 'broken',
      'monotonic-reads': 'broken',
      linearizable: 'broken',
      causal: 'broken',
    })
  })
})

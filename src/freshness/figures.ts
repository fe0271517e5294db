/**
 * What the samples come to: the read-after-write curve, the answers to "how long after a write may I read?", and how
 * far behind stale reads were. JSON, version 1.
 */
import { z } from 'zod'
import type { Samples } from './samples.js'
import { type Spans, sortedSpans } from './spans.js'
import { wilson } from './wilson.js'

const count = z.int().min(0)
const ns = z.string().regex(/^[0-9]+$/)
const share = z.number().min(0).max(1)

const binSchema = z.object({
  fromNs: ns.describe('from so long after the newest write'),
  toNs: ns.exactOptional().describe('up to, exclusive; missing: and later'),
  reads: count,
  fresh: count,
  share: share.describe('of these reads that returned that write or a newer one'),
  low: share.describe('95% Wilson interval of the share'),
  high: share,
})

const answerSchema = z.object({
  wanted: z.enum(['99%', '99.9%', 'all']),
  afterNs: ns
    .exactOptional()
    .describe('reads at least so long after the newest write; missing: no such time was seen'),
  reads: count.exactOptional().describe('that started so late or later'),
  fresh: count.exactOptional(),
  low: share.exactOptional().describe('the true share is at least this, with 97.5% confidence'),
})

export const groupSchema = z.object({
  name: z.string().describe('of the keys, client or mark; "all reads"'),
  reads: count.describe('that could be judged'),
  afterWrite: count.describe('those with an acked write before them'),
  stale: count,
  staleNs: z
    .object({ median: ns, p90: ns, p99: ns, most: ns })
    .exactOptional()
    .describe('of the stale reads, nearest rank: since what they returned was certainly overwritten'),
  behind: z
    .object({ median: count, p90: count, p99: count, most: count })
    .exactOptional()
    .describe('of the stale reads, nearest rank: acked writes that they certainly missed'),
  curve: z.array(binSchema),
  answers: z.array(answerSchema),
})

export const freshnessSchema = z.object({
  freshness: z.literal(1),
  misread: z.string(),
  inputs: z.array(z.object({ file: z.string(), bytes: count })),
  clockErrorNs: ns,
  groups: z.array(groupSchema),
  leftOut: z.object({
    counters: count.describe('reads of keys with increments'),
    ambiguous: count.describe('reads that could have seen one of several writes'),
    wrong: count.describe('reads of what nobody wrote, or before it was written'),
  }),
})

export type Freshness = z.infer<typeof freshnessSchema>
export type FreshnessGroup = z.infer<typeof groupSchema>
export type CurveBin = z.infer<typeof binSchema>

/** Limits of the curve's bins, in nanoseconds: 1, 2 and 5 of every power of ten from 1 us to 1,000 s. */
const LIMITS: readonly number[] = [
  0,
  ...Array.from({ length: 10 }, (_, i) => [1, 2, 5].map((n) => n * 10 ** (i + 3))).flat(),
]

/** Sums up the samples at these places. O(n log n). */
export function sumUp(name: string, samples: Samples, places: Int32Array): FreshnessGroup {
  const stale: number[] = []
  const behind: number[] = []
  const after: number[] = []
  for (const i of places) {
    if (samples.isStale[i] === 1) {
      stale.push(i)
      behind.push(samples.behind[i])
    }
    if (samples.isAfterWrite[i] === 1) after.push(i)
  }
  const { ageNs } = samples
  const ages = Int32Array.from(after).sort((a, b) => (ageNs[a] < ageNs[b] ? -1 : ageNs[a] > ageNs[b] ? 1 : 0))
  const staleNs = sortedSpans(samples.staleNs, Int32Array.from(stale))
  const versions = Float64Array.from(behind).sort()
  return {
    name,
    reads: places.length,
    afterWrite: ages.length,
    stale: stale.length,
    ...(stale.length === 0
      ? {}
      : {
          staleNs: {
            median: digits(rank(staleNs, 0.5)),
            p90: digits(rank(staleNs, 0.9)),
            p99: digits(rank(staleNs, 0.99)),
            most: digits(rank(staleNs, 1)),
          },
          behind: {
            median: rank(versions, 0.5),
            p90: rank(versions, 0.9),
            p99: rank(versions, 0.99),
            most: rank(versions, 1),
          },
        }),
    curve: curveOf(samples, ages),
    answers: answersOf(samples, ages),
  }
}

function digits(value: number | bigint): string {
  return BigInt(value).toString()
}

/** The nearest-rank quantile of sorted spans or numbers, at least one. */
export function rank<S extends Spans>(sorted: S, share: number): S[number] {
  return sorted[Math.max(0, Math.ceil(share * sorted.length) - 1)]
}

/** `ages`: samples by age. Bins without a read are left out. */
function curveOf(samples: Samples, ages: Int32Array): CurveBin[] {
  const bins: CurveBin[] = []
  let at = 0
  LIMITS.forEach((from, i) => {
    const to = LIMITS[i + 1]
    let reads = 0
    let fresh = 0
    for (; at < ages.length && (to === undefined || samples.ageNs[ages[at]] < to); at++) {
      reads++
      fresh += 1 - samples.isStale[ages[at]]
    }
    if (reads === 0) return
    bins.push({
      fromNs: digits(from),
      ...(to === undefined ? {} : { toNs: digits(to) }),
      reads,
      fresh,
      share: fresh / reads,
      ...wilson(fresh, reads),
    })
  })
  return bins
}

/** The least age such that of the reads at it or later so great a share was fresh. */
function answersOf(samples: Samples, ages: Int32Array): FreshnessGroup['answers'] {
  const n = ages.length
  const wanted = [
    { wanted: '99%', least: 0.99 },
    { wanted: '99.9%', least: 0.999 },
    { wanted: 'all', least: 1 },
  ] as const
  return wanted.map(({ wanted: name, least }) => {
    let best = -1
    let bestFresh = 0
    let fresh = 0
    for (let at = n - 1; at >= 0; at--) {
      fresh += 1 - samples.isStale[ages[at]]
      // Reads of one age belong together.
      const isFirst = at === 0 || samples.ageNs[ages[at - 1]] !== samples.ageNs[ages[at]]
      if (isFirst && fresh >= least * (n - at)) {
        best = at
        bestFresh = fresh
      }
    }
    if (best < 0) return { wanted: name }
    return {
      wanted: name,
      afterNs: digits(samples.ageNs[ages[best]]),
      reads: n - best,
      fresh: bestFresh,
      low: wilson(bestFresh, n - best).low,
    }
  })
}

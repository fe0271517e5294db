/**
 * What is in a recording, before any promise is asked: counts, rates, concurrency, latency, what will be hard.
 */
import { z } from 'zod'
import {
  CAS,
  DELETE,
  type History,
  INCREMENT,
  KIND_NAMES,
  NULL_VALUE,
  OUTCOME_NAMES,
  READ,
  REFUSED,
} from './columns.js'

const count = z.int().min(0)
const digits = z.string().regex(/^-?[0-9]+$/)
const place = z.object({
  code: z.string(),
  file: z.string(),
  line: z.int().exactOptional(),
  column: z.int().exactOptional(),
  found: z.string(),
  expected: z.string(),
  advice: z.string().exactOptional(),
})

/** The survey, version 1. Nanoseconds and times are digits. */
export const surveySchema = z.object({
  survey: z.literal(1),
  misread: z.string(),
  inputs: z.array(z.object({ file: z.string(), bytes: count })),
  title: z.string().exactOptional(),
  operations: z.array(
    z.object({
      op: z.enum(KIND_NAMES),
      acked: count,
      refused: count,
      unsure: count,
      latencyNs: z
        .object({ least: digits, median: digits, p99: digits, p999: digits, most: digits })
        .exactOptional()
        .describe('of acked operations, nearest rank'),
    }),
  ),
  clients: count,
  hosts: count.describe('named hosts'),
  keys: z.object({ register: count, counter: count, mixed: count }),
  busiestKeys: z.array(z.object({ key: z.string(), operations: count })),
  firstStart: digits.exactOptional(),
  lastEnd: digits.exactOptional(),
  perSecond: z.number().exactOptional().describe('operations over the whole span'),
  inFlight: z.object({ most: count, mean: z.number() }),
  neverEnded: count.describe('requests that never came back'),
  ambiguous: z.object({
    keys: count.describe('keys on which some read could have seen one of several writes'),
    values: count.describe('values written more than once on their key, absence among them'),
  }),
  gaps: z
    .array(z.object({ startNs: digits, lengthNs: digits }))
    .describe('longest times with nothing in flight'),
  marks: z.array(z.object({ mark: z.string(), startNs: digits, endNs: digits })),
  clockErrorNs: digits,
  problems: z
    .object({ count, first: z.array(place) })
    .describe('records that cannot be used, left out above'),
  warnings: z.array(
    z.object({
      code: z.string(),
      file: z.string().exactOptional(),
      line: z.int().exactOptional(),
      text: z.string(),
    }),
  ),
})
export type Survey = z.infer<typeof surveySchema>

const BUSIEST = 5
const GAPS = 3

/** Surveys a history; problems, inputs and version are the caller's to add. O(n log n). */
export function surveyHistory(history: History): Omit<Survey, 'survey' | 'misread' | 'problems'> {
  const { keys, perKey } = surveyKeys(history)
  const span = surveyTime(history)
  const busiest = Array.from(perKey.keys())
    .sort((a, b) => perKey[b] - perKey[a] || a - b)
    .slice(0, BUSIEST)
    .filter((k) => perKey[k] > 0)
  return {
    inputs: history.files.map(({ name, bytes }) => ({ file: name, bytes })),
    ...(history.title === undefined ? {} : { title: history.title }),
    operations: KIND_NAMES.map((op, kind) => surveyKind(history, op, kind)).filter(
      ({ acked, refused, unsure }) => acked + refused + unsure > 0,
    ),
    clients: countUsed(history.client, history),
    hosts: countUsed(history.host, history),
    keys,
    busiestKeys: busiest.map((k) => ({ key: history.keys.name(k), operations: perKey[k] })),
    ...span,
    ambiguous: surveyAmbiguity(history),
    marks: history.marks.map(({ text, startNs, endNs }) => ({
      mark: text,
      startNs: startNs.toString(),
      endNs: endNs.toString(),
    })),
    clockErrorNs: history.clockErrorNs.toString(),
    warnings: history.warnings.map((warning) => ({ ...warning })),
  }
}

/** How many ids a column uses; the name tables also hold names of records that could not be used. */
function countUsed(column: Int32Array, { count: n }: History): number {
  const used = new Set<number>()
  for (let i = 0; i < n; i++) if (column[i] >= 0) used.add(column[i])
  return used.size
}

function surveyKind(
  history: History,
  op: (typeof KIND_NAMES)[number],
  kind: number,
): Survey['operations'][number] {
  const outcomes = [0, 0, 0]
  const latencies: bigint[] = []
  for (let i = 0; i < history.count; i++) {
    if (history.kind[i] !== kind) continue
    outcomes[history.outcome[i]]++
    if (OUTCOME_NAMES[history.outcome[i]] === 'acked')
      latencies.push(history.times.endNs(i) - history.times.startNs(i))
  }
  const sorted = BigInt64Array.from(latencies).sort()
  const rank = (share: number): string =>
    sorted[Math.min(sorted.length - 1, Math.max(0, Math.ceil(share * sorted.length) - 1))].toString()
  const [acked, refused, unsure] = outcomes
  return {
    op,
    acked,
    refused,
    unsure,
    ...(sorted.length > 0
      ? {
          latencyNs: { least: rank(0), median: rank(0.5), p99: rank(0.99), p999: rank(0.999), most: rank(1) },
        }
      : {}),
  }
}

function surveyKeys({ count: n, key, kind, keys }: History): { keys: Survey['keys']; perKey: Int32Array } {
  const perKey = new Int32Array(keys.size)
  const increments = new Uint8Array(keys.size)
  const writes = new Uint8Array(keys.size)
  for (let i = 0; i < n; i++) {
    perKey[key[i]]++
    if (kind[i] === INCREMENT) increments[key[i]] = 1
    else if (kind[i] !== READ) writes[key[i]] = 1
  }
  const kinds = { register: 0, counter: 0, mixed: 0 }
  for (let k = 0; k < keys.size; k++) {
    if (perKey[k] === 0) continue
    kinds[increments[k] === 0 ? 'register' : writes[k] === 0 ? 'counter' : 'mixed']++
  }
  return { keys: kinds, perKey }
}

function surveyTime(
  history: History,
): Pick<Survey, 'firstStart' | 'lastEnd' | 'perSecond' | 'inFlight' | 'neverEnded' | 'gaps'> {
  const { count: n, hasEnd, times } = history
  const starts = BigInt64Array.from({ length: n }, (_, i) => times.startNs(i)).sort()
  const ended: bigint[] = []
  for (let i = 0; i < n; i++) if (hasEnd[i]) ended.push(times.endNs(i))
  const ends = BigInt64Array.from(ended).sort()
  const neverEnded = n - ends.length
  if (n === 0) return { inFlight: { most: 0, mean: 0 }, neverEnded, gaps: [] }
  const first = starts[0]
  const last =
    ends.length > 0 && ends[ends.length - 1] > starts[n - 1] ? ends[ends.length - 1] : starts[n - 1]

  let most = 0
  let done = 0
  let busy = 0n
  const gaps: { startNs: bigint; lengthNs: bigint }[] = []
  for (let s = 0; s < n; s++) {
    while (done < ends.length && ends[done] < starts[s]) done++
    const before = s - done
    if (before === 0 && done > 0) gaps.push({ startNs: ends[done - 1], lengthNs: starts[s] - ends[done - 1] })
    most = Math.max(most, before + 1)
    busy -= starts[s]
  }
  for (const end of ends) busy += end
  busy += BigInt(neverEnded) * last
  const span = last - first
  gaps.sort((a, b) => (a.lengthNs > b.lengthNs ? -1 : a.lengthNs < b.lengthNs ? 1 : 0))
  return {
    firstStart: first.toString(),
    lastEnd: last.toString(),
    ...(span > 0n ? { perSecond: (n * 1e9) / Number(span) } : {}),
    inFlight: { most, mean: span > 0n ? Number((busy * 1000n) / span) / 1000 : 0 },
    neverEnded,
    gaps: gaps.slice(0, GAPS).map(({ startNs, lengthNs }) => ({
      startNs: startNs.toString(),
      lengthNs: lengthNs.toString(),
    })),
  }
}

/** Values that several unrefused writes of a key could have put there, and keys on which one of them was read. */
function surveyAmbiguity({
  count: n,
  key,
  kind,
  value,
  extra,
  saw,
  applied,
  outcome,
  initial,
  initialUnknown,
}: History): Survey['ambiguous'] {
  const writers = new Map<string, number>()
  const isWriter = (i: number): boolean =>
    kind[i] !== READ &&
    kind[i] !== INCREMENT &&
    outcome[i] !== REFUSED &&
    !(kind[i] === CAS && applied[i] === 0)
  for (let i = 0; i < n; i++) {
    if (!isWriter(i)) continue
    const name = `${key[i]} ${kind[i] === DELETE ? NULL_VALUE : value[i]}`
    if (!writers.has(name)) {
      const isInitial = (initial.get(key[i]) ?? (initialUnknown ? undefined : NULL_VALUE)) === value[i]
      writers.set(name, isInitial ? 1 : 0)
    }
    writers.set(name, writers.get(name)! + 1)
  }
  let values = 0
  for (const many of writers.values()) if (many > 1) values++
  const keys = new Set<number>()
  for (let i = 0; i < n; i++) {
    const read =
      kind[i] === READ ? value[i] : kind[i] === CAS ? (applied[i] ? extra[i] : (saw?.[i] ?? -1)) : -1
    if ((writers.get(`${key[i]} ${read}`) ?? 0) > 1) keys.add(key[i])
  }
  return { keys: keys.size, values }
}

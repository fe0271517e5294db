/**
 * Counterexamples as histories of their own: a header, then operations taken unchanged from the input.
 */
import { decideCausal } from '../deciders/causal/decide.js'
import { decideKey } from '../deciders/decide-key.js'
import { fileOf, type History } from '../history/columns.js'
import type { LinePlace } from '../history/lines.js'
import { readHistory } from '../history/read.js'
import { rewriteTimes } from '../history/rewrite-times.js'
import { textSource } from '../history/source.js'
import { gatherKey, indexByKey } from '../order/key-history.js'
import type { PromiseRequest } from '../promises/request.js'
import type { Counterexample } from './counterexample.js'

/** Where the records of operations come from. */
interface RecordSource {
  of(operation: number): { place: LinePlace; text: string }[]
}

/**
 * The history text. Lines stand in input order; where the files have different units, times are rewritten to
 * nanoseconds, exactly, and nothing else.
 */
export function counterexampleText(
  history: History,
  records: RecordSource,
  keyIds: readonly number[],
  clockErrorNs: bigint,
  { operations, initialCount }: Counterexample,
): string {
  const lines = operations.flatMap((operation) => {
    const { isDump } = history.files[fileOf(history, operation)]
    const [{ place }] = records.of(operation)
    return isDump ? [{ place, text: dumpedRecord(history, operation) }] : records.of(operation)
  })
  lines.sort((a, b) => a.place.file - b.place.file || a.place.line - b.place.line)
  const units = new Set(lines.map(({ place }) => history.files[place.file].unitNs))
  const unitNs = units.size === 1 ? [...units][0] : 1n
  const texts = lines.map(({ place, text }) =>
    units.size === 1 ? text : rewriteTimes(text, history.files[place.file].unitNs),
  )
  return `${[header(history, keyIds, clockErrorNs, initialCount, unitNs), ...texts].join('\n')}\n`
}

/** What a dump held, as the record of a read, in nanoseconds. */
function dumpedRecord(history: History, i: number): string {
  const [client, key] = [history.clients.name(history.client[i]), history.keys.name(history.key[i])].map(
    (name) => JSON.stringify(name),
  )
  const at = history.times.startNs(i)
  return `{"client":${client},"op":"read","key":${key},"value":${history.values.text(history.value[i])},"start":${at},"end":${at}}`
}

function header(
  history: History,
  keyIds: readonly number[],
  clockErrorNs: bigint,
  initialCount: bigint | undefined,
  unitNs: bigint,
): string {
  const members = ['"history":1']
  if (history.title !== undefined) members.push(`"title":${JSON.stringify(history.title)}`)
  if (unitNs !== 1n) members.push(`"unit":"${UNIT_NAMES.get(unitNs)}"`)
  if (clockErrorNs > 0n) members.push(`"clockError":${inUnit(clockErrorNs, unitNs)}`)
  const initial = keyIds.flatMap((keyId) => {
    const value = history.initial.get(keyId)
    const text = initialCount?.toString() ?? (value === undefined ? undefined : history.values.text(value))
    return text === undefined ? [] : [`${JSON.stringify(history.keys.name(keyId))}:${text}`]
  })
  if (initial.length > 0) members.push(`"initial":{${initial.join(',')}}`)
  if (history.initialUnknown && initial.length < keyIds.length) members.push('"initialUnknown":true')
  return `{${members.join(',')}}`
}

const UNIT_NAMES = new Map([
  [1n, 'ns'],
  [1_000n, 'us'],
  [1_000_000n, 'ms'],
  [1_000_000_000n, 's'],
])

/** Nanoseconds as an exact decimal number of a unit. */
function inUnit(ns: bigint, unitNs: bigint): string {
  const places = unitNs.toString().length - 1
  const whole = ns / unitNs
  const fraction = (ns % unitNs).toString().padStart(places, '0').replace(/0+$/, '')
  return places > 0 && fraction ? `${whole}.${fraction}` : `${whole}`
}

/** Reads the text as anybody would and decides it: the last word before it is shown. */
export async function isBrokenAgain(text: string, { rule, causal }: PromiseRequest): Promise<boolean> {
  const history = await readHistory([textSource('counterexample', text)])
  const index = indexByKey(history)
  if (causal) return decideCausal(history, index, causal, () => true).verdict === 'broken'
  return (
    decideKey(gatherKey(history, index, 0, history.clockErrorNs), history.values, rule).verdict === 'broken'
  )
}

/** The file of a finding's counterexample, below the output folder. */
export function counterexamplePath(id: number, kind: string, key: string): string {
  const name = key.slice(0, 60).replace(/[^A-Za-z0-9._-]/g, '~')
  return `counterexamples/${id.toString().padStart(4, '0')}-${kind}-${name}.ndjson`
}

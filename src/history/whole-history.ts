/**
 * What can be said of a history only once all of it is read.
 */
import { fileOf, type History, INCREMENT, NO_VALUE, READ } from './columns.js'
import type { InitialValue } from './headers.js'
import type { InputProblem } from './problems.js'

/** Takes a problem, made only if it is kept: there may be one for every operation. */
type Report = (make: () => InputProblem) => void

/**
 * One client is one sequential requester: its operations must not overlap in time, and one without an end must
 * be its last. O(n log n) in a client's operations.
 */
export function checkSessions(history: History, report: Report): void {
  const { count, client, hasEnd, times } = history
  const { startOffset, endOffset } = times
  const offset = new Int32Array(history.clients.size + 1)
  for (let i = 0; i < count; i++) offset[client[i] + 1]++
  for (let c = 0; c < history.clients.size; c++) offset[c + 1] += offset[c]
  const next = offset.slice()
  const byClient = new Int32Array(count)
  for (let i = 0; i < count; i++) byClient[next[client[i]]++] = i

  const start = (i: number): number | bigint => (startOffset ? startOffset[i] : times.startNs(i))
  const end = (i: number): number | bigint => (endOffset ? endOffset[i] : times.endNs(i))
  const before = (a: number, b: number): number => {
    const [sa, sb] = [start(a), start(b)]
    if (sa !== sb) return sa < sb ? -1 : 1
    if (hasEnd[a] !== hasEnd[b]) return hasEnd[b] - hasEnd[a]
    const [ea, eb] = [end(a), end(b)]
    return ea !== eb ? (ea < eb ? -1 : 1) : a - b
  }
  for (let c = 0; c < history.clients.size; c++) {
    const session = byClient.subarray(offset[c], offset[c + 1])
    for (let i = 1; i < session.length; i++) {
      if (before(session[i - 1], session[i]) > 0) {
        session.sort(before)
        break
      }
    }
    for (let i = 1; i < session.length; i++) {
      const [a, b] = [session[i - 1], session[i]]
      if (hasEnd[a] === 0) report(() => unendedBefore(history, a, b))
      else if (end(a) > start(b)) report(() => overlap(history, a, b))
    }
  }
}

function overlap(history: History, a: number, b: number): InputProblem {
  const name = JSON.stringify(history.clients.name(history.client[a]))
  const late = history.times.endNs(a) - history.times.startNs(b)
  return {
    code: 'overlapping-operations',
    ...placeOf(history, b),
    found: `an operation of client ${name} that starts ${late} ns before its operation at ${where(history, a)} ends`,
    expected: 'one request at a time a client',
    advice: 'give each concurrent requester a client name of its own',
  }
}

function unendedBefore(history: History, a: number, b: number): InputProblem {
  const name = JSON.stringify(history.clients.name(history.client[a]))
  return {
    code: 'operation-after-open-end',
    ...placeOf(history, b),
    found: `an operation of client ${name} after the one at ${where(history, a)}, which never ended`,
    expected: 'an operation without an end to be the last of its client',
    advice: 'record when the client gave up, or let it go on under a new name',
  }
}

/**
 * On a counter key a string that spells a number is a recording mistake, not a finding: clients of some stores
 * return strings.
 */
export function checkCounterValues(
  history: History,
  initial: ReadonlyMap<string, InitialValue>,
  report: Report,
): void {
  const { count, key, kind, value, keys, values } = history
  const increments = new Uint8Array(keys.size)
  const others = new Uint8Array(keys.size)
  for (let i = 0; i < count; i++) {
    if (kind[i] === INCREMENT) increments[key[i]] = 1
    else if (kind[i] !== READ) others[key[i]] = 1
  }
  // value id → 1 it spells a number, 2 it does not, 0 not looked at yet
  const known = new Uint8Array(values.size)
  const spells = (id: number): boolean => {
    if (known[id] === 0) known[id] = SPELLED_NUMBER.test(values.text(id)) ? 1 : 2
    return known[id] === 1
  }
  for (let i = 0; i < count; i++) {
    if (increments[key[i]] === 0 || others[key[i]] === 1 || value[i] === NO_VALUE || !spells(value[i]))
      continue
    report(() => ({
      code: 'number-as-string',
      ...placeOf(history, i),
      found: `the string ${values.text(value[i])} on the counter ${JSON.stringify(keys.name(key[i]))}`,
      expected: 'a number',
      advice: 'record the number that the string spells',
    }))
  }
  if (initial.size === 0) return
  for (let k = 0; k < keys.size; k++) {
    if (increments[k] === 0 || others[k] === 1) continue
    const stated = initial.get(keys.name(k))
    if (!stated || !spells(stated.value)) continue
    report(() => ({
      code: 'number-as-string',
      ...stated.place,
      found: `the string ${values.text(stated.value)} as initial value of the counter ${JSON.stringify(keys.name(k))}`,
      expected: 'a number',
      advice: 'record the number that the string spells',
    }))
  }
}

/** Canonical text of a string that spells a number. */
const SPELLED_NUMBER = /^"\s*[-+]?[0-9]+(\.[0-9]+)?([eE][-+]?[0-9]+)?\s*"$/

function placeOf(history: History, i: number): { file: string; line: number } {
  return { file: history.files[fileOf(history, i)].name, line: history.line[i] }
}

function where(history: History, i: number): string {
  const { file, line } = placeOf(history, i)
  return `${file}:${line}`
}

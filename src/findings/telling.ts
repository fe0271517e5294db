/**
 * How clients, values and spans of time are put into sentences.
 */
import type { History } from '../history/columns.js'
import type { KeyHistory } from '../order/key-history.js'

const VALUE_LENGTH = 48

/** A span of nanoseconds in the unit that people would say, three significant digits: "11.2 ms". */
export function duration(ns: bigint): string {
  const negative = ns < 0n
  const size = negative ? -ns : ns
  const sign = negative ? '-' : ''
  for (const [unit, name] of UNITS) {
    if (size < unit) continue
    // Thousandths, rounded half up, in whole numbers throughout.
    const thousandths = (size * 1000n + unit / 2n) / unit
    const whole = thousandths / 1000n
    if (whole >= 1000n && unit !== UNITS[0][0]) return duration(sign ? -roundUp(unit) : roundUp(unit))
    const digits = whole >= 100n ? 0 : whole >= 10n ? 1 : 2
    const scale = 10n ** BigInt(3 - digits)
    const rounded = (thousandths + scale / 2n) / scale
    const text = rounded.toString().padStart(digits + 1, '0')
    const point = text.length - digits
    const fraction = digits > 0 ? text.slice(point).replace(/0+$/, '') : ''
    return `${sign}${text.slice(0, point)}${fraction ? `.${fraction}` : ''} ${name}`
  }
  return '0 ns'
}

const UNITS: readonly (readonly [bigint, string])[] = [
  [1_000_000_000n, 's'],
  [1_000_000n, 'ms'],
  [1_000n, 'us'],
  [1n, 'ns'],
]

function roundUp(unit: bigint): bigint {
  return unit * 1000n
}

/** A value as it is quoted in a sentence: its JSON text, cut with its size said; absence in words. */
export function quoted(text: string): string {
  if (text === 'null') return 'nothing (absent)'
  if (text.length <= VALUE_LENGTH) return text
  return `${text.slice(0, VALUE_LENGTH)}… (${text.length} characters)`
}

/** Says things about one key's operations, given by local index. */
export class Teller {
  readonly key: KeyHistory
  readonly #history: History

  constructor(key: KeyHistory) {
    this.key = key
    this.#history = key.history
  }

  get keyName(): string {
    return this.#history.keys.name(this.key.keyId)
  }

  client(p: number): string {
    return this.#history.clients.name(this.key.client[p])
  }

  value(id: number): string {
    return quoted(this.#history.values.text(id))
  }

  startNs(p: number): bigint {
    return this.#history.times.startNs(this.key.operation[p])
  }

  endNs(p: number): bigint {
    return this.#history.times.endNs(this.key.operation[p])
  }

  /** From a's end to b's start, "11.2 ms". */
  gap(a: number, b: number): string {
    return duration(this.startNs(b) - this.endNs(a))
  }
}

/** "1 read", "2 reads". */
export function plural(n: number, one: string, many = `${one}s`): string {
  return `${n} ${n === 1 ? one : many}`
}

/** Every promise that pairs decide, with some of its parameters: as the program and as the oracles take it. */
import { parsePromise } from '../../src/promises/parse-request.js'
import type { PairRule } from '../../src/promises/promise.js'
import type { PlainRule } from './brute-force.js'

export const PLAIN_RULES: readonly PlainRule[] = [
  { promise: 'written-values' },
  { promise: 'read-your-writes' },
  { promise: 'monotonic-reads' },
  { promise: 'monotonic-writes' },
  { promise: 'writes-follow-reads' },
  { promise: 'coherent' },
  { promise: 'bounded-staleness', within: 0 },
  { promise: 'bounded-staleness', within: 3 },
  { promise: 'bounded-staleness', versions: 0 },
  { promise: 'bounded-staleness', versions: 1 },
  { promise: 'bounded-staleness', within: 2, versions: 1 },
  { promise: 'durable' },
  { promise: 'durable', settle: 3 },
  { promise: 'regular' },
  { promise: 'linearizable' },
]

/** The program's own rule for a plain one; durations times `scale` nanoseconds. */
export function programRule({ promise, within, versions, settle }: PlainRule, scale = 1n): PairRule {
  const duration = (name: string, ns: number | undefined): string =>
    ns === undefined ? '' : ` ${name}=${BigInt(ns) * scale}ns`
  const typed = [
    promise,
    duration('within', within),
    versions === undefined ? '' : ` versions=${versions}`,
    duration('settle', settle),
  ].join('')
  return parsePromise(typed).rule!
}

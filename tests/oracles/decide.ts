/** The program's answer on a tiny key, through the reader. */
import { decideKey } from '../../src/deciders/decide-key.js'
import type { Decision } from '../../src/deciders/decision.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { gatherKey, indexByKey } from '../../src/order/key-history.js'
import type { PairRule } from '../../src/promises/promise.js'
import { keyText } from './arbitraries.js'
import type { PlainKey } from './brute-force.js'

export async function decide(key: PlainKey, rule: PairRule): Promise<Decision> {
  const history = await readHistory([textSource('tiny', keyText(key))])
  return decideKey(gatherKey(history, indexByKey(history), 0, history.clockErrorNs), history.values, rule)
}

/** The program's answers under several promises. */
export async function decideAll(key: PlainKey, rules: readonly PairRule[]): Promise<Decision[]> {
  const history = await readHistory([textSource('tiny', keyText(key))])
  const gathered = gatherKey(history, indexByKey(history), 0, history.clockErrorNs)
  return rules.map((rule) => decideKey(gathered, history.values, rule, { steps: 50_000 }))
}

/** How many random keys a property tries; MISREAD_RUNS multiplies it. */
export function runs(n: number): number {
  return n * Number(process.env.MISREAD_RUNS ?? 1)
}

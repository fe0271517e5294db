/** The parts of the verifier that judge one claim, on tiny keys, beside the definitions that they are held to. */
import { boundsTrouble } from '../../src/certificates/verify/bounds.js'
import { type Judgement, judgeCounterexample } from '../../src/certificates/verify/counterexample.js'
import { orderTrouble } from '../../src/certificates/verify/order.js'
import { Recorded } from '../../src/certificates/verify/recorded.js'
import { type Claimed, Rules, rowOf } from '../../src/certificates/verify/rules.js'
import { losesUpdates } from '../../src/certificates/verify/updates.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { keyText } from '../oracles/arbitraries.js'
import type { PlainKey, PlainRule } from '../oracles/brute-force.js'

export interface KeyJudge {
  order(rule: PlainRule, sequence: readonly number[]): string | undefined
  counterexample(rule: PlainRule, operations: readonly number[]): Judgement
  bounds(rule: PlainRule, from: number, to: number): string | undefined
  losesUpdates(): boolean
}

/** Reads a key and judges claims about it. Operations by their places in the key. */
export async function judgeOf(key: PlainKey): Promise<KeyJudge> {
  const history = await readHistory([textSource('tiny', keyText(key))])
  const recorded = new Recorded(history, history.clockErrorNs)
  const all = key.operations.map((_, i) => i)
  const own = all.filter((i) => recorded.counts(i))
  const isCounter = key.operations.every(({ op }) => op === 'increment' || op === 'read')
  const hasIncrements = key.operations.some(({ op }) => op === 'increment')
  const rulesOf = (rule: PlainRule): Rules => {
    const claimed = claimedAs(rule)
    return new Rules(recorded, claimed, rowOf(claimed)!, own, isCounter && hasIncrements)
  }
  return {
    order: (rule, sequence) => orderTrouble(recorded, rulesOf(rule), 0, all, sequence),
    counterexample: (rule, operations) => judgeCounterexample(recorded, rulesOf(rule), 0, all, operations),
    bounds: (rule, from, to) => boundsTrouble(recorded, rulesOf(rule), 0, all, from, to),
    losesUpdates: () => losesUpdates(recorded, 0, all),
  }
}

function claimedAs({ promise, within, versions, settle }: PlainRule): Claimed {
  return {
    name: promise,
    promise,
    keys: '**',
    ...(within === undefined ? {} : { withinNs: within.toString() }),
    ...(versions === undefined ? {} : { versions }),
    ...(settle === undefined ? {} : { settleNs: settle.toString() }),
  }
}

/** Plays a rehearsal in memory, and checks what it recorded. */

import { createHash } from 'node:crypto'
import { stringify } from 'yaml'
import { check } from '../../src/findings/check.js'
import type { Result } from '../../src/findings/result.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { parsePromise } from '../../src/promises/parse-request.js'
import { rehearse } from '../../src/rehearsal/rehearse.js'
import { parseScenario } from '../../src/rehearsal/scenario-file.js'
import { type Scenario, type ScenarioText, scenarioSchema } from '../../src/rehearsal/scenario-schema.js'
import { SCENARIOS } from '../../src/rehearsal/scenarios.js'
import type { Account, TruthHit } from '../../src/rehearsal/truth-schema.js'

export interface Played {
  readonly history: string
  readonly truth: string
  readonly account: Account
  /** lines about operations */
  readonly hits: readonly TruthHit[]
}

/** As a file of it would be read. */
export function scenario(text: Omit<ScenarioText, 'rehearsal'>): Scenario {
  return parseScenario(stringify({ rehearsal: 1, ...text }), 'scenario.yaml')
}

export function named(name: string): Scenario {
  return scenarioSchema.parse(SCENARIOS.find((each) => each.name === name)!.text)
}

export function play(what: Scenario, seed: number): Played {
  const run = rehearse(what, seed)
  let history = ''
  let truth = ''
  for (;;) {
    const step = run.next()
    if (step.done) {
      const lines = truth.trimEnd().split('\n')
      const hits = lines.map((line) => JSON.parse(line)).filter(({ effect }) => effect !== undefined)
      return { history, truth, account: step.value, hits }
    }
    history += step.value.history
    truth += step.value.truth
  }
}

export async function checked(
  history: string,
  promise = 'linearizable',
  clockErrorNs?: bigint,
  name = 'history.ndjson',
): Promise<Result> {
  const source = textSource(name, history)
  const { result } = await check(await readHistory([source]), [source], {
    promises: [parsePromise(promise)],
    everyKey: true,
    ...(clockErrorNs === undefined ? {} : { clockErrorNs }),
  })
  return result
}

/** What is wrong with an answer or a change, as opposed to one that nobody knows of. */
export function isHarm({ effect }: TruthHit): boolean {
  return effect !== 'unsure' && effect !== 'late'
}

/** SHA-256 of history and truth of a named scenario with seed 1. */
export function digest(name: string): string {
  const { history, truth } = play(named(name), 1)
  return createHash('sha256').update(history).update(truth).digest('hex')
}

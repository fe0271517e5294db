/**
 * Checks a history against promises and tells what it finds: the main job, from columns to result.
 */
import type { History } from '../history/columns.js'
import type { ByteSource } from '../history/source.js'
import { countPairs } from '../order/counting.js'
import { gatherKey, indexByKey } from '../order/key-history.js'
import { findCausalCounterexample } from './causal-counterexample.js'
import { findCounterexample } from './counterexample.js'
import { counterexamplePath, counterexampleText, isBrokenAgain } from './counterexample-text.js'
import { Records } from './records.js'
import type { Finding, Result } from './result.js'
import { type CheckRequest, Run } from './run.js'
import { sortFindings } from './sorting.js'
import { tell } from './tell.js'
import { groupFindings } from './telling-order.js'

export type { CheckRequest } from './run.js'

/** A counterexample as a file. */
export interface CounterexampleFile {
  /** below the output folder, with `/` */
  readonly path: string
  /** the history, NDJSON */
  readonly text: string
}

export interface Checked {
  readonly result: Result
  readonly counterexamples: readonly CounterexampleFile[]
}

/**
 * Checks every key under every promise whose glob matches it. `sources` are those that the history was read
 * from: the records of evidence are fetched from them again. Throws what reading them throws.
 */
export async function check(
  history: History,
  sources: readonly ByteSource[],
  request: CheckRequest,
): Promise<Checked> {
  const clockErrorNs = request.clockErrorNs ?? history.clockErrorNs
  const index = indexByKey(history)
  const run = new Run(history, index, clockErrorNs, request)
  await run.decideAll()
  const named = sortFindings(history, run.findings)

  const records = new Records(history, sources)
  for (const { finding } of named) for (const { operation } of finding.exhibits) records.want(operation)
  await records.fetch()
  const findings = named.map((each, i) => tell(history, records, each, i + 1))

  const counterexamples: CounterexampleFile[] = []
  for (const id of toldFirst(findings, request.counterexamples ?? 0)) {
    const { promise, finding } = named[id - 1]
    const asked = request.promises.find(({ name }) => name === promise)!
    const example = asked.causal
      ? findCausalCounterexample(history, asked.causal, finding)
      : findCounterexample(
          countPairs(gatherKey(history, index, finding.keyId, clockErrorNs), asked.rule),
          history.values,
          finding,
        )
    if (!example) continue
    for (const operation of example.operations) records.want(operation)
    await records.fetch()
    const text = counterexampleText(
      history,
      records,
      finding.keyIds ?? [finding.keyId],
      clockErrorNs,
      example,
    )
    if (!(await isBrokenAgain(text, asked))) continue
    const path = counterexamplePath(
      id,
      finding.kind,
      (finding.keyIds ?? [finding.keyId]).map((keyId) => history.keys.name(keyId)).join(' '),
    )
    counterexamples.push({ path, text })
    findings[id - 1] = { ...findings[id - 1], counterexample: path }
  }
  return { result: run.result(findings), counterexamples }
}

/** Ids of the findings in the first `limit` paragraphs of a report, in rising order: those that people are shown. */
function toldFirst(findings: readonly Finding[], limit: number): number[] {
  const paragraphs = groupFindings(findings).flat().slice(0, limit)
  return paragraphs.flatMap((paragraph) => paragraph.map(({ id }) => id)).sort((a, b) => a - b)
}

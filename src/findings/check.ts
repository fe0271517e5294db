/**
 * Checks a history against promises and tells what it finds: the main job, from columns to result.
 */

import { decideCausal } from '../deciders/causal/decide.js'
import { decideKey, type KeyKind, kindOfKey } from '../deciders/decide-key.js'
import type { Decision } from '../deciders/decision.js'
import {
  ACKED,
  CAS,
  fileOf,
  type History,
  INCREMENT,
  KIND_NAMES,
  NO_VALUE,
  OUTCOME_NAMES,
  WRITE,
} from '../history/columns.js'
import { fetchLines, type LinePlace } from '../history/lines.js'
import type { ByteSource } from '../history/source.js'
import { type Counting, countPairs } from '../order/counting.js'
import { gatherKey, indexByKey, type KeyHistory, type KeyIndex } from '../order/key-history.js'
import { keyGlob } from '../promises/glob.js'
import type { CausalPromiseRequest, KeyPromiseRequest, PromiseRequest } from '../promises/request.js'
import { VERSION } from '../version.js'
import { findCausal } from './causal.js'
import { findCausalCounterexample } from './causal-counterexample.js'
import { findCounter } from './counter/find.js'
import { findCounterexample } from './counterexample.js'
import { counterexamplePath, counterexampleText, isBrokenAgain } from './counterexample-text.js'
import { findLostUpdateFindings } from './lost-updates.js'
import { findingMargin, greater, keyMargin, type Margin, ORDINARY_CLOCK_ERROR_NS } from './margin.js'
import { marksOf } from './marks.js'
import type { RawFinding } from './raw-finding.js'
import { reasonOf } from './reasons.js'
import { findRegister } from './register/find.js'
import type { ChainStep, Finding, FindingOperation, KeyResult, PromiseResult, Result } from './result.js'
import { type NamedFinding, sortFindings } from './sorting.js'
import { summarizeHistory } from './summary.js'
import { duration } from './telling.js'
import { groupFindings } from './telling-order.js'
import { upheld } from './upholds.js'

export interface CheckRequest {
  readonly promises: readonly PromiseRequest[]
  /** replaces what the headers say, in nanoseconds */
  readonly clockErrorNs?: bigint
  /** globs; only keys that match one are checked */
  readonly keys?: readonly string[]
  /** list all keys in the result, not only those broken or undecided */
  readonly everyKey?: boolean
  /** make counterexamples for the findings in so many paragraphs of a report, the worst first; default none */
  readonly counterexamples?: number
  /** told now and then how many of the keys are decided */
  onProgress?(done: number, total: number): void
  /** stops the check: what is not decided by then is undecided, and the result says so */
  readonly signal?: AbortSignal
}

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

/** How long to decide before other things may happen, in operations. */
const BREATHE = 200_000

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

/** The records of operations, as they stand in the input. */
export class Records {
  readonly #history: History
  readonly #sources: readonly ByteSource[]
  readonly #wanted = new Map<string, LinePlace>()
  readonly #texts = new Map<string, string>()

  constructor(history: History, sources: readonly ByteSource[]) {
    this.#history = history
    this.#sources = sources
  }

  want(operation: number): void {
    for (const place of this.#places(operation)) this.#wanted.set(`${place.file}:${place.line}`, place)
  }

  async fetch(): Promise<void> {
    const places = [...this.#wanted.values()].filter(({ file, line }) => !this.#texts.has(`${file}:${line}`))
    if (places.length === 0) return
    const texts = await fetchLines(this.#sources, places)
    for (const [i, { file, line }] of places.entries()) this.#texts.set(`${file}:${line}`, texts[i])
  }

  /** The opening (or only) record, and the closing half where there is one, with their places. */
  of(operation: number): { place: LinePlace; text: string }[] {
    return this.#places(operation).map((place) => ({
      place,
      text: this.#texts.get(`${place.file}:${place.line}`)!,
    }))
  }

  #places(i: number): LinePlace[] {
    const { line, closeLine, closeFile } = this.#history
    const file = fileOf(this.#history, i)
    const places = [{ file, line: line[i] }]
    if (closeLine && closeLine[i] > 0) {
      places.push({ file: closeFile && closeFile[i] >= 0 ? closeFile[i] : file, line: closeLine[i] })
    }
    return places
  }
}

interface Tally {
  holds: number
  broken: number
  undecided: number
  leftOut: number
  untested: number
}

class Run {
  readonly findings: NamedFinding[] = []
  readonly #history: History
  readonly #index: KeyIndex
  readonly #clockErrorNs: bigint
  readonly #request: CheckRequest
  readonly #tallies = new Map<string, Tally>()
  readonly #keys: KeyResult[] = []
  readonly #undecided: Result['undecided'] = []
  readonly #causal = new Map<string, { verdict: PromiseResult['verdict']; leftOut: number }>()
  #interrupted = false

  constructor(history: History, index: KeyIndex, clockErrorNs: bigint, request: CheckRequest) {
    this.#history = history
    this.#index = index
    this.#clockErrorNs = clockErrorNs
    this.#request = request
    for (const { name } of request.promises) {
      this.#tallies.set(name, { holds: 0, broken: 0, undecided: 0, leftOut: 0, untested: 0 })
    }
  }

  async decideAll(): Promise<void> {
    const { promises, keys, onProgress, signal } = this.#request
    const isWanted = keys ? keys.map(keyGlob) : undefined
    const claims = promises
      .filter((promise): promise is KeyPromiseRequest => promise.rule !== undefined)
      .map((promise) => ({ promise, matches: keyGlob(promise.keys) }))
    const { offset } = this.#index
    const total = offset.length - 1
    let since = 0
    for (let keyId = 0; keyId < total; keyId++) {
      const name = this.#history.keys.name(keyId)
      if (offset[keyId] === offset[keyId + 1]) continue
      if (isWanted && !isWanted.some((matches) => matches(name))) continue
      const asked = claims.filter(({ matches }) => matches(name)).map(({ promise }) => promise)
      if (asked.length === 0) continue
      if (signal?.aborted) this.#interrupted = true
      this.#decide(keyId, name, asked)
      since += offset[keyId + 1] - offset[keyId]
      if (since < BREATHE) continue
      since = 0
      onProgress?.(keyId + 1, total)
      await breathe()
    }
    for (const promise of promises) if (promise.causal) this.#decideCausal(promise, isWanted)
  }

  /** One verdict over all the keys that are in. */
  #decideCausal(promise: CausalPromiseRequest, isWanted: ((name: string) => boolean)[] | undefined): void {
    const { name, causal, keys } = promise
    const matches = keyGlob(keys)
    const outcome = this.#interrupted
      ? undefined
      : decideCausal(this.#history, this.#index, causal, (keyId) => {
          const key = this.#history.keys.name(keyId)
          return matches(key) && (!isWanted || isWanted.some((wanted) => wanted(key)))
        })
    if (!outcome || outcome.verdict === 'undecided') {
      const reason = outcome
        ? 'every key is left out: none is a register whose values are written once'
        : 'the check was interrupted before it'
      this.#undecided.push({ promise: name, reason })
    }
    this.#causal.set(name, {
      verdict: outcome?.verdict ?? 'undecided',
      leftOut: outcome?.causal.keysLeftOut ?? 0,
    })
    if (outcome?.verdict !== 'broken') return
    for (const finding of findCausal(this.#history, this.#index, outcome))
      this.findings.push({ promise: name, finding })
  }

  #decide(keyId: number, name: string, asked: readonly KeyPromiseRequest[]): void {
    const key = gatherKey(this.#history, this.#index, keyId, this.#clockErrorNs)
    const verdicts: KeyResult['verdicts'] = {}
    const untested: string[] = []
    const margins: Record<string, string> = {}
    for (const promise of asked) {
      const decision: Decision = this.#interrupted
        ? { verdict: 'undecided', reason: 'the check was interrupted before this key' }
        : decideKey(key, this.#history.values, promise.rule)
      const tally = this.#tallies.get(promise.name)!
      if (decision.verdict === 'left-out') {
        tally.leftOut++
        continue
      }
      verdicts[promise.name] = decision.verdict
      tally[decision.verdict]++
      if (decision.verdict === 'holds' && decision.untested) {
        tally.untested++
        untested.push(promise.name)
      }
      if (decision.verdict === 'undecided') {
        const { reason, progress } = decision
        this.#undecided.push({ key: name, promise: promise.name, reason, ...(progress ? { progress } : {}) })
      }
      if (decision.verdict === 'broken') {
        const found = this.#find(key, promise)
        const margin = this.#margin(key, promise, found)
        margins[promise.name] = margin.toString()
        for (const finding of found) {
          this.findings.push({
            promise: promise.name,
            finding: { ...finding, margin: finding.margin ?? margin },
          })
        }
      }
    }
    if (this.#request.everyKey || Object.values(verdicts).some((verdict) => verdict !== 'holds')) {
      const operations = this.#index.offset[keyId + 1] - this.#index.offset[keyId]
      this.#keys.push({
        key: name,
        kind: kindOfKey(key),
        operations,
        verdicts,
        ...(untested.length > 0 ? { untested } : {}),
        ...(Object.keys(margins).length > 0
          ? { marginNs: margins, upholds: upheld(key, this.#history.values) }
          : {}),
      })
    }
  }

  /** The key's margin under a promise, from those of its findings. */
  #margin(key: KeyHistory, { rule }: KeyPromiseRequest, found: readonly RawFinding[]): Margin {
    const best = found.reduce<Margin>(
      (margin, finding) => greater(margin, finding.margin ?? key.clockErrorNs),
      key.clockErrorNs,
    )
    return keyMargin(this.#history, this.#index, key.keyId, rule, key.clockErrorNs, best)
  }

  #find(key: KeyHistory, { rule }: KeyPromiseRequest): RawFinding[] {
    const counting = countPairs(key, rule)
    return this.#findOn(counting).map((finding) => {
      const margin = findingMargin(counting, this.#index, finding)
      return margin === undefined ? finding : { ...finding, margin }
    })
  }

  #findOn(counting: Counting): RawFinding[] {
    const { key, rule } = counting
    const { offset, operations } = this.#index
    if (rule.name === 'no-lost-updates') return findLostUpdateFindings(counting)
    const kind: KeyKind = kindOfKey(key)
    if (kind === 'register') {
      return findRegister(
        counting,
        this.#history.values,
        operations.subarray(offset[key.keyId], offset[key.keyId + 1]),
      )
    }
    return findCounter(counting, this.#history.values)
  }

  result(findings: Finding[]): Result {
    const promises = this.#request.promises.map(({ name, rule, causal, parameters, keys }): PromiseResult => {
      if (causal) return { name, promise: causal, parameters, keys, ...this.#causal.get(name)! }
      const tally = this.#tallies.get(name)!
      const verdict =
        tally.broken > 0 ? 'broken' : tally.undecided > 0 || tally.holds === 0 ? 'undecided' : 'holds'
      return { name, promise: rule.name, parameters, keys, verdict, ...tally }
    })
    const findingCounts: Result['findingCounts'] = {}
    for (const { kind } of findings) findingCounts[kind] = (findingCounts[kind] ?? 0) + 1
    const isBroken = promises.some(({ verdict }) => verdict === 'broken')
    const isUndecided = promises.some(({ verdict }) => verdict === 'undecided')
    return {
      result: 1,
      misread: VERSION,
      inputs: this.#history.files.map(({ name, bytes }) => ({ file: name, bytes })),
      history: {
        ...summarizeHistory(this.#history, this.#index),
        clockErrorNs: this.#clockErrorNs.toString(),
        clockErrorFrom:
          this.#request.clockErrorNs !== undefined
            ? 'option'
            : this.#history.clockErrorNs > 0n
              ? 'headers'
              : 'default',
      },
      ...(this.#request.keys ? { onlyKeys: [...this.#request.keys] } : {}),
      promises,
      keys: this.#keys,
      findings,
      findingCounts,
      undecided: this.#undecided,
      warnings: [...this.#history.warnings.map((warning) => ({ ...warning })), ...marginWarning(findings)],
      ...(this.#interrupted ? { interrupted: true as const } : {}),
      exit: this.#interrupted ? 130 : isBroken ? 1 : isUndecided ? 3 : 0,
    }
  }
}

/** Findings that an ordinary fleet's clocks could explain need a word. */
function marginWarning(findings: readonly Finding[]): Result['warnings'] {
  const few = findings.filter(
    ({ marginNs }) =>
      marginNs !== undefined && marginNs !== 'unbounded' && BigInt(marginNs) < ORDINARY_CLOCK_ERROR_NS,
  ).length
  if (few === 0) return []
  const which = few === 1 ? '1 finding survives' : `${few} findings survive`
  return [
    {
      code: 'small-margin',
      text: `${which} less than ${duration(ORDINARY_CLOCK_ERROR_NS)} of clock error, which is common practice to reckon with between hosts on NTP: state what bounds your clocks (clockError, --clock-error), and the host where clients share a clock`,
    },
  ]
}

/** Lets timers, signals and the terminal have their turn. */
function breathe(): Promise<void> {
  return new Promise((resolve) => setImmediate(resolve))
}

/** A finding with its records and reasons. */
function tell(history: History, records: Records, { promise, finding }: NamedFinding, id: number): Finding {
  const place = new Map(finding.exhibits.map(({ operation }, at) => [operation, at]))
  const chain = finding.links
    .filter(({ before, after }) => (before < 0 || place.has(before)) && place.has(after))
    .map((link): ChainStep => {
      const before = place.get(link.before)
      return {
        type: link.type,
        ...(before === undefined ? {} : { before }),
        after: place.get(link.after)!,
        why: reasonOf(history, link),
      }
    })
  const { bounds, also } = finding
  const marks = marksOf(history, finding.blamed).map(({ mark, relation, afterNs }) => ({
    mark,
    relation,
    ...(afterNs === undefined ? {} : { afterNs: afterNs.toString() }),
  }))
  const cause = place.get(finding.cause)
  return {
    id,
    kind: finding.kind,
    ...(also.length > 0 ? { also: [...also] } : {}),
    promise,
    ...(finding.keyIds
      ? { keys: finding.keyIds.map((keyId) => history.keys.name(keyId)) }
      : { key: history.keys.name(finding.keyId) }),
    summary: finding.summary,
    blamed: place.get(finding.blamed)!,
    ...(cause === undefined ? {} : { cause }),
    operations: finding.exhibits.map(({ operation, role }) =>
      tellOperation(history, records, operation, role),
    ),
    ...(chain.length > 0 ? { chain } : {}),
    ...(bounds
      ? {
          bounds: {
            ...(bounds.from === undefined ? {} : { from: place.get(bounds.from)! }),
            fromCount: bounds.fromCount.toString(),
            toCount: bounds.toCount.toString(),
            least: bounds.least.toString(),
            most: bounds.most.toString(),
          },
        }
      : {}),
    ...(finding.margin === undefined ? {} : { marginNs: finding.margin.toString() }),
    ...(marks.length > 0 ? { marks } : {}),
  }
}

function tellOperation(history: History, records: Records, i: number, role: string): FindingOperation {
  const [own, close] = records.of(i)
  const fileName = (file: number): string => history.files[file].name
  const kind = history.kind[i]
  const value = (name: string, id: number): Record<string, string> =>
    id === NO_VALUE ? {} : { [name]: history.values.text(id) }
  const isAckedCas = kind === CAS && history.outcome[i] === ACKED
  return {
    file: fileName(own.place.file),
    line: own.place.line,
    ...(close && close.place.file !== own.place.file ? { closeFile: fileName(close.place.file) } : {}),
    ...(close ? { closeLine: close.place.line } : {}),
    role,
    client: history.clients.name(history.client[i]),
    ...(history.host[i] >= 0 ? { host: history.hosts.name(history.host[i]) } : {}),
    key: history.keys.name(history.key[i]),
    op: KIND_NAMES[kind],
    outcome: OUTCOME_NAMES[history.outcome[i]],
    ...value('value', history.value[i]),
    ...(kind === INCREMENT ? value('by', history.extra[i]) : {}),
    ...(kind === CAS ? value('expect', history.extra[i]) : {}),
    ...(kind === WRITE ? value('basis', history.extra[i]) : {}),
    ...(isAckedCas ? { applied: history.applied[i] === 1 } : {}),
    ...(isAckedCas && history.saw ? value('saw', history.saw[i]) : {}),
    startNs: history.times.startNs(i).toString(),
    ...(history.hasEnd[i] ? { endNs: history.times.endNs(i).toString() } : {}),
    record: own.text,
    ...(close ? { closeRecord: close.text } : {}),
  }
}

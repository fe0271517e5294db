/**
 * Decides every key under every promise that is asked for it, and finds what broke; then makes the result.
 */
import { decideCausal } from '../deciders/causal/decide.js'
import {
  decideKeyInSteps,
  isSearched,
  kindOfKey,
  resolvedAsBroken,
  writesAbsence,
} from '../deciders/decide-key.js'
import type { Decision } from '../deciders/decision.js'
import { type Budget, DEFAULT_BUDGET, Purse } from '../deciders/search/budget.js'
import { CAS, type History, NO_VALUE, NULL_VALUE } from '../history/columns.js'
import { type Counting, countPairs } from '../order/counting.js'
import { findCounts } from '../order/counts.js'
import { gatherKey, type KeyHistory, type KeyIndex } from '../order/key-history.js'
import { keyGlob } from '../promises/glob.js'
import type { CausalPromiseRequest, KeyPromiseRequest, PromiseRequest } from '../promises/request.js'
import { VERSION } from '../version.js'
import { findCausal } from './causal.js'
import { findConflicts } from './conflict.js'
import { findCounter } from './counter/find.js'
import { findLostUpdateFindings } from './lost-updates.js'
import { findingMargin, greater, keyMargin, type Margin, ORDINARY_CLOCK_ERROR_NS } from './margin.js'
import type { RawFinding } from './raw-finding.js'
import { findRegister } from './register/find.js'
import type { Finding, KeyResult, PromiseResult, Result } from './result.js'
import type { NamedFinding } from './sorting.js'
import { summarizeHistory } from './summary.js'
import { duration } from './telling.js'
import { upheld } from './upholds.js'

/** What was decided about one key under one promise, and what was found where it is broken. */
export interface DecidedPromise {
  readonly promise: KeyPromiseRequest
  readonly decision: Decision
  readonly found: readonly RawFinding[]
}

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
  /** makes the budget of one key's searches; default: some seconds' worth of steps, the same on every machine */
  newBudget?(): Budget
  /** told of each key when all that is asked of it is decided */
  onKey?(key: KeyHistory, decided: readonly DecidedPromise[]): Promise<void>
  /** told of each promise over all keys */
  onCausal?(promise: CausalPromiseRequest, index: KeyIndex, found: readonly RawFinding[]): Promise<void>
  /** told now and then how many of the keys are decided, and which one is being searched */
  onProgress?(done: number, total: number, searched?: string): void
  /** stops the check: what is not decided by then is undecided, and the result says so */
  readonly signal?: AbortSignal
}

/** How long to decide before other things may happen, in operations. */
const BREATHE = 200_000

interface DecidedKey {
  readonly key: KeyHistory
  readonly decided: readonly DecidedPromise[]
}

interface Tally {
  holds: number
  broken: number
  undecided: number
  leftOut: number
  untested: number
}

export class Run {
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
      const steps = this.#decide(keyId, name, asked)
      let next = steps.next()
      for (; !next.done; next = steps.next()) {
        onProgress?.(keyId, total, name)
        await breathe()
        if (signal?.aborted) this.#interrupted = true
      }
      if (this.#request.onKey) await this.#request.onKey(next.value.key, next.value.decided)
      since += offset[keyId + 1] - offset[keyId]
      if (since < BREATHE) continue
      since = 0
      onProgress?.(keyId + 1, total)
      await breathe()
    }
    for (const promise of promises) if (promise.causal) await this.#decideCausal(promise, isWanted)
  }

  /** One verdict over all the keys that are in. */
  async #decideCausal(
    promise: CausalPromiseRequest,
    isWanted: ((name: string) => boolean)[] | undefined,
  ): Promise<void> {
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
    const found = outcome?.verdict === 'broken' ? findCausal(this.#history, this.#index, outcome) : []
    for (const finding of found) this.findings.push({ promise: name, finding })
    if (outcome) await this.#request.onCausal?.(promise, this.#index, found)
  }

  /** Decides one key under all that is asked of it; yields while it searches. */
  *#decide(keyId: number, name: string, asked: readonly KeyPromiseRequest[]): Generator<void, DecidedKey> {
    const purse = new Purse(this.#request.newBudget?.() ?? DEFAULT_BUDGET)
    const key = gatherKey(this.#history, this.#index, keyId, this.#clockErrorNs)
    const verdicts: KeyResult['verdicts'] = {}
    const untested: string[] = []
    const margins: Record<string, string> = {}
    const decided: DecidedPromise[] = []
    for (const promise of asked) {
      const decision = yield* this.#decidePromise(key, promise, purse)
      const found = decision.verdict === 'broken' ? this.#find(key, promise) : []
      decided.push({ promise, decision, found })
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
    return { key, decided }
  }

  *#decidePromise(key: KeyHistory, { rule }: KeyPromiseRequest, purse: Purse): Generator<void, Decision> {
    const steps = decideKeyInSteps(key, this.#history.values, rule, purse)
    while (!this.#interrupted) {
      const next = steps.next()
      if (next.done) return next.value
      yield
    }
    return { verdict: 'undecided', reason: 'the check was interrupted before this key was decided' }
  }

  /** The key's margin under a promise, from those of its findings. */
  #margin(key: KeyHistory, { rule }: KeyPromiseRequest, found: readonly RawFinding[]): Margin {
    const best = found.reduce<Margin>(
      (margin, finding) => greater(margin, finding.margin ?? key.clockErrorNs),
      key.clockErrorNs,
    )
    // Asking a search again and again costs too much: there a finding's own margin stands for the key's.
    if (rule.name !== 'no-lost-updates' && isSearched(key, this.#history.values)) return best
    return keyMargin(this.#history, this.#index, key.keyId, rule, key.clockErrorNs, best)
  }

  #find(key: KeyHistory, { rule }: KeyPromiseRequest): RawFinding[] {
    const counting = countPairs(key, rule)
    return this.#findOn(counting).map((finding) => {
      if (finding.margin !== undefined) return finding
      const margin = findingMargin(counting, this.#index, finding)
      return margin === undefined ? finding : { ...finding, margin }
    })
  }

  #findOn(counting: Counting): RawFinding[] {
    const { key, rule } = counting
    const { offset, operations } = this.#index
    const { values } = this.#history
    const all = operations.subarray(offset[key.keyId], offset[key.keyId + 1])
    if (rule.name === 'no-lost-updates') return findLostUpdateFindings(counting)
    switch (kindOfKey(key)) {
      case 'register': {
        const told = resolvedAsBroken(counting)
        const found = told ? findRegister(told, values, all) : []
        const sure =
          key.initial === NO_VALUE && writesAbsence(key) ? found.filter(isNotOfAbsence(key)) : found
        return sure.length > 0 ? sure : findConflicts(counting, values, all)
      }
      case 'counter': {
        const found = findCounter(counting, values)
        const isTold = found.some(({ kind }) => kind !== 'order-conflict')
        return isTold || findCounts(key, values).trouble !== 'several-sizes'
          ? found
          : findConflicts(counting, values, all)
      }
      case 'mixed':
        return findConflicts(counting, values, all)
    }
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

/** A key may have begun absent: a read of absence is not to blame by itself. */
function isNotOfAbsence({ history }: KeyHistory): (finding: RawFinding) => boolean {
  return ({ blamed }) => history.kind[blamed] === CAS || history.value[blamed] !== NULL_VALUE
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

/**
 * Confirms a certificate against the recording that it speaks of. Shares the reader, and the globs that name keys,
 * with the rest of the program, and nothing else: what is claimed is worked out again from the definitions.
 */
import type { z } from 'zod'
import { type History, INCREMENT, READ } from '../../history/columns.js'
import { keyGlob } from '../../promises/glob.js'
import {
  type ClaimLine,
  claimLineSchema,
  endLineSchema,
  type HeaderLine,
  headerLineSchema,
} from '../schema.js'
import { boundsTrouble } from './bounds.js'
import { causalOrderTrouble, hasBadPattern, PATHS_LIMIT } from './causal.js'
import { CausalKeys } from './causal-keys.js'
import { judgeCounterexample } from './counterexample.js'
import { orderTrouble } from './order.js'
import { Recorded } from './recorded.js'
import { type Claimed, Rules, rowOf } from './rules.js'
import { losesUpdates } from './updates.js'

type About = Pick<HeaderLine, 'promises' | 'clockErrorNs' | 'onlyKeys'>

export interface Refusal {
  /** line of the certificate, 1-based; missing where something is missing in it */
  readonly line?: number
  readonly key?: string
  readonly promise?: string
  readonly why: string
}

export interface Verification {
  /** what the header says that the certificate is about; missing where there is none */
  readonly about?: About
  readonly refusals: readonly Refusal[]
  /** claims proved, by what they say */
  readonly proved: { readonly holds: number; readonly broken: number }
  /** broken by operations too many to try every order of: believed, not proved */
  readonly unproved: number
  /** keys and promises that the certificate claims nothing about */
  readonly undecided: number
  readonly leftOut: number
}

/** What an input is, to be compared with the certificate's header. */
export interface ActualInput {
  readonly sha256: string
}

/** Takes the lines of a certificate one by one. */
export class Verifier {
  readonly #history: History
  readonly #inputs: readonly ActualInput[]
  readonly #operationsOf: readonly number[][]
  readonly #refusals: Refusal[] = []
  readonly #tally = { holds: 0, broken: 0, unproved: 0, undecided: 0, leftOut: 0 }
  /** promise → keys that are spoken of */
  readonly #spokenOf = new Map<string, Set<string>>()
  readonly #keyIds = new Map<string, number>()
  readonly #globs = new Map<string, (name: string) => boolean>()
  #header: HeaderLine | undefined
  #recorded: Recorded | undefined
  #line = 0
  #claims = 0
  #isOver = false

  constructor(history: History, inputs: readonly ActualInput[]) {
    this.#history = history
    this.#inputs = inputs
    const operations: number[][] = Array.from({ length: history.keys.size }, () => [])
    for (let i = 0; i < history.count; i++) operations[history.key[i]].push(i)
    this.#operationsOf = operations
    operations.forEach((all, keyId) => {
      if (all.length > 0) this.#keyIds.set(history.keys.name(keyId), keyId)
    })
  }

  take(text: string): void {
    this.#line++
    const why = this.#read(text)
    if (why !== undefined) this.#refusals.push({ line: this.#line, why })
  }

  /** Why the line is none that can stand there, or undefined. */
  #read(text: string): string | undefined {
    let record: unknown
    try {
      record = JSON.parse(text)
    } catch {
      return 'is not JSON'
    }
    if (this.#isOver) return 'stands behind the last line'
    if (this.#line === 1) {
      const header = headerLineSchema.safeParse(record)
      if (!header.success) return `is no header: ${whatIsWrong(header.error)}`
      this.#begin(header.data)
      return undefined
    }
    const end = endLineSchema.safeParse(record)
    if (end.success) {
      this.#isOver = true
      if (end.data.claims === this.#claims) return undefined
      return `says that there are ${end.data.claims} claims, and there are ${this.#claims}`
    }
    const claim = claimLineSchema.safeParse(record)
    if (!claim.success) return `is no claim: ${whatIsWrong(claim.error)}`
    this.#claims++
    if (this.#header) this.#judge(claim.data)
    return undefined
  }

  finish(): Verification {
    if (!this.#header) this.#refusals.push({ why: 'the certificate has no header' })
    if (!this.#isOver) this.#refusals.push({ why: 'the certificate has no last line: it was cut short' })
    if (this.#header) this.#lookForGaps(this.#header)
    const { holds, broken, unproved, undecided, leftOut } = this.#tally
    const about = this.#header ? { about: aboutOf(this.#header) } : {}
    return { ...about, refusals: this.#refusals, proved: { holds, broken }, unproved, undecided, leftOut }
  }

  #begin(header: HeaderLine): void {
    const refuse = (why: string): void => {
      this.#refusals.push({ line: 1, why })
    }
    if (header.inputs.length !== this.#inputs.length)
      refuse(`speaks of ${header.inputs.length} inputs, and ${this.#inputs.length} were given`)
    header.inputs.forEach(({ file, sha256 }, i) => {
      if (this.#inputs[i] && this.#inputs[i].sha256 !== sha256)
        refuse(`speaks of other input: ${file} has another SHA-256`)
    })
    if (header.operations !== this.#history.count)
      refuse(`speaks of ${header.operations} operations, and the inputs hold ${this.#history.count}`)
    const names = header.promises.map(({ name }) => name)
    if (new Set(names).size !== names.length) refuse('names a promise twice')
    this.#header = header
    this.#recorded = new Recorded(this.#history, BigInt(header.clockErrorNs))
    for (const name of names) this.#spokenOf.set(name, new Set())
  }

  #judge(claim: ClaimLine): void {
    for (const name of claim.promises) {
      const promise = this.#header!.promises.find((each) => each.name === name)
      const why = promise
        ? this.#troubleOf(claim, promise)
        : 'is about a promise that the header does not name'
      if (why === undefined) continue
      this.#refusals.push({
        line: this.#line,
        ...(claim.key === undefined ? {} : { key: claim.key }),
        promise: name,
        why,
      })
    }
  }

  #troubleOf(claim: ClaimLine, promise: Claimed): string | undefined {
    const spokenOf = this.#spokenOf.get(promise.name)!
    const name = claim.key ?? EVERY_KEY
    if (spokenOf.has(name)) return 'is about what an earlier line spoke of'
    spokenOf.add(name)
    const isOverKeys = promise.promise === 'causal' || promise.promise === 'causal-convergence'
    if (isOverKeys) {
      if (claim.key !== undefined) return 'names a key, and the promise is one over all keys'
      return this.#causalTrouble(claim, promise)
    }
    if (claim.key === undefined) return 'names no key'
    const keyId = this.#keyIds.get(claim.key)
    if (keyId === undefined || !this.#isWanted(claim.key, promise))
      return 'is about a key that the promise is not claimed for'
    return this.#keyTrouble(claim, promise, keyId)
  }

  #keyTrouble(claim: ClaimLine, promise: Claimed, keyId: number): string | undefined {
    const recorded = this.#recorded!
    const all = this.#operationsOf[keyId]
    const { kind } = this.#history
    const hasIncrements = all.some((i) => kind[i] === INCREMENT)
    const means = !hasIncrements || (promise.versions === undefined && promise.promise !== 'no-lost-updates')
    if (claim.claim === 'left-out') {
      if (means) return 'leaves out a key on which the promise means something'
      this.#tally.leftOut++
      return undefined
    }
    if (!means) return 'decides a key on which the promise means nothing'
    if (claim.claim === 'undecided') {
      this.#tally.undecided++
      return undefined
    }
    const row = rowOf(promise)
    if (!row) {
      const isBroken = losesUpdates(recorded, keyId, all)
      if (isBroken !== (claim.claim === 'broken'))
        return `is false: ${isBroken ? 'an update was lost' : 'no update was lost'}`
      this.#tally[claim.claim]++
      return undefined
    }
    const isCounter = hasIncrements && all.every((i) => kind[i] === INCREMENT || kind[i] === READ)
    const own = all.filter((i) => recorded.counts(i))
    const rules = new Rules(recorded, promise, row, own, isCounter)
    if (claim.claim === 'holds') {
      if (!claim.order) return 'has no order'
      const trouble = orderTrouble(recorded, rules, keyId, all, claim.order)
      if (trouble === undefined) this.#tally.holds++
      return trouble
    }
    if (claim.bounds) {
      const trouble = boundsTrouble(recorded, rules, keyId, all, claim.bounds.from ?? -1, claim.bounds.to)
      if (trouble === undefined) this.#tally.broken++
      return trouble
    }
    if (!claim.counterexample) return 'has no counterexample'
    return this.#tallied(judgeCounterexample(recorded, rules, keyId, all, claim.counterexample))
  }

  #tallied(judgement: ReturnType<typeof judgeCounterexample>): string | undefined {
    if (judgement === 'proved') this.#tally.broken++
    else if (judgement === 'too-large') this.#tally.unproved++
    else return judgement.trouble
    return undefined
  }

  #causalTrouble(claim: ClaimLine, promise: Claimed): string | undefined {
    if (claim.claim === 'left-out') return 'leaves out a promise over all keys'
    if (claim.claim === 'undecided') {
      this.#tally.undecided++
      return undefined
    }
    const keys = new CausalKeys(this.#recorded!)
    const leftOut = new Set(claim.leftOut ?? [])
    for (let keyId = 0; keyId < this.#operationsOf.length; keyId++) {
      const name = this.#history.keys.name(keyId)
      if (this.#operationsOf[keyId].length === 0 || !this.#isWanted(name, promise)) continue
      const isCovered = keys.add(keyId, this.#operationsOf[keyId])
      if (isCovered === leftOut.has(name))
        return `is wrong about whether key ${JSON.stringify(name)} is left out`
    }
    const converges = promise.promise === 'causal-convergence'
    if (claim.claim === 'holds') {
      if (!claim.order) return 'has no order'
      const trouble = causalOrderTrouble(keys, claim.order, converges)
      if (trouble === undefined) this.#tally.holds++
      return trouble
    }
    if (!claim.counterexample) return 'has no counterexample'
    // What nobody wrote needs no path.
    if (keys.unwritten.some((r) => claim.counterexample!.includes(r))) return this.#tallied('proved')
    if (claim.counterexample.length > PATHS_LIMIT) return this.#tallied('too-large')
    const isBroken = hasBadPattern(keys, claim.counterexample, converges)
    return this.#tallied(
      isBroken ? 'proved' : { trouble: 'its operations show none of the patterns that break the promise' },
    )
  }

  #isWanted(name: string, promise: Claimed): boolean {
    const only = this.#header!.onlyKeys
    return (
      this.#matches(promise.keys, name) &&
      (only === undefined || only.some((glob) => this.#matches(glob, name)))
    )
  }

  #matches(glob: string, name: string): boolean {
    const matches = this.#globs.get(glob) ?? keyGlob(glob)
    this.#globs.set(glob, matches)
    return matches(name)
  }

  /** Every key under every promise that is claimed for it must be spoken of. */
  #lookForGaps(header: HeaderLine): void {
    for (const promise of header.promises) {
      const spokenOf = this.#spokenOf.get(promise.name)!
      if (promise.promise === 'causal' || promise.promise === 'causal-convergence') {
        if (!spokenOf.has(EVERY_KEY))
          this.#refusals.push({ promise: promise.name, why: 'nothing is claimed about it' })
        continue
      }
      for (let keyId = 0; keyId < this.#operationsOf.length; keyId++) {
        const key = this.#history.keys.name(keyId)
        if (this.#operationsOf[keyId].length === 0 || spokenOf.has(key) || !this.#isWanted(key, promise))
          continue
        this.#refusals.push({ key, promise: promise.name, why: 'nothing is claimed about it' })
      }
    }
  }
}

function aboutOf({ promises, clockErrorNs, onlyKeys }: HeaderLine): About {
  return { promises, clockErrorNs, ...(onlyKeys ? { onlyKeys } : {}) }
}

function whatIsWrong({ issues }: z.ZodError): string {
  const [{ message, path }] = issues
  return path.length > 0 ? `${message}, at ${path.join('.')}` : message
}

/** Stands for the key in what is claimed over all of them. */
const EVERY_KEY = '**'

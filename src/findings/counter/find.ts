/**
 * The findings of a broken counter key, by the decision list of findings.md.
 */
import { INCREMENT, type Values } from '../../history/columns.js'
import { type Counting, counts } from '../../order/counting.js'
import { findCounts } from '../../order/counts.js'
import { precedes } from '../../order/precedence.js'
import { inOrder } from '../in-order.js'
import type { FindingKind } from '../kinds.js'
import type { CounterBounds, Exhibit, Link, RawFinding } from '../raw-finding.js'
import { Teller } from '../telling.js'
import { counterSentence, notANumberSentence } from './sentences.js'
import { Suspects } from './suspects.js'
import { START, Tallies } from './tallies.js'

/** How many earlier reads one read is held against, nearest first; on keys of one size more are sifted before. */
const HELD_AGAINST = 2000

/** All findings of a counter key that is broken under the promise; at least one. */
export function findCounter(counting: Counting, values: Values): RawFinding[] {
  const tallies = new Tallies(counting, values)
  const { key } = counting
  const tell = new Teller(key)
  const counted = findCounts(key, values)
  const suspects =
    counted.trouble === 'none' ? new Suspects(key, counted.level, counted.startKnown) : undefined
  const found: RawFinding[] = []
  const blamed: number[] = []
  const reads: number[] = []
  const returned = new Map<bigint, number>()

  for (const r of tallies.reads()) {
    if (tallies.count(r) === undefined) {
      found.push({
        kind: 'unwritten-value',
        also: [],
        keyId: key.keyId,
        blamed: key.operation[r],
        cause: -1,
        exhibits: [{ operation: key.operation[r], role: 'the blamed read' }],
        links: [],
        summary: notANumberSentence(tell, r),
      })
      continue
    }
    const from = blamed.findLast((b) => precedes(key, b, r)) ?? START
    const twin = key.kind[r] === INCREMENT ? returned.get(tallies.count(r)!) : undefined
    if (!suspects || suspects.mayBeBlamed(r, from)) {
      const finding = blame(tallies, tell, r, from, reads, twin)
      if (finding) {
        found.push(finding)
        blamed.push(r)
      }
    }
    if (key.kind[r] === INCREMENT && twin === undefined) returned.set(tallies.count(r)!, r)
    reads.push(r)
  }
  return found.length > 0 ? found : [slotConflict(tallies, tell)]
}

interface Fit {
  readonly q: number
  readonly least: bigint
  readonly most: bigint
}

/** The finding of read `r` counted from `from` or a read after it, or undefined when it fits them all. */
function blame(
  tallies: Tallies,
  tell: Teller,
  r: number,
  from: number,
  reads: readonly number[],
  twin: number | undefined,
): RawFinding | undefined {
  const { counting, key } = tallies
  if (twin !== undefined && !tallies.hasDecreases && tallies.size(r) > 0n)
    return twinFinding(tallies, tell, twin, r)

  const value = tallies.count(r)!
  const fits = new Map<FindingKind, Fit>()
  const offer = (kind: FindingKind, fit: Fit): void => {
    if (!fits.has(kind)) fits.set(kind, fit)
  }
  const hold = (q: number): void => {
    const start = tallies.count(q)
    if (start === undefined) return
    const { least, most, anySure } = tallies.bounds(q, r)
    if (value < start + least && (anySure || (tallies.hasDecreases && tallies.isBefore(q, r)))) {
      offer('lost-increment', { q, least, most })
    }
    if (value > start + most && tallies.isBefore(q, r)) offer('repeated-increment', { q, least, most })
    if (q !== START && value < start && !tallies.hasDecreases && counts(counting, q, 'read', r, 'read')) {
      offer('backward-counter', { q, least, most })
    }
  }
  let held = 0
  for (let i = reads.length - 1; i >= 0 && held < HELD_AGAINST && !fits.has('lost-increment'); i--) {
    const q = reads[i]
    if (from !== START && (q === from || !precedes(key, from, q))) continue
    hold(q)
    held++
  }
  if (!fits.has('lost-increment')) hold(from)
  const order: FindingKind[] = ['lost-increment', 'repeated-increment', 'backward-counter']
  const kinds = order.filter((kind) => fits.has(kind))
  if (kinds.length === 0) return undefined
  const [kind, ...also] = kinds
  return boundsFinding(tallies, tell, kind, also, r, fits.get(kind)!)
}

function boundsFinding(
  tallies: Tallies,
  tell: Teller,
  kind: FindingKind,
  also: FindingKind[],
  r: number,
  { q, least, most }: Fit,
): RawFinding {
  const { key } = tallies
  const bounds: CounterBounds = {
    ...(q === START ? {} : { from: key.operation[q] }),
    fromCount: tallies.count(q)!,
    toCount: tallies.count(r)!,
    least,
    most,
  }
  const between = kind === 'backward-counter' ? [] : incrementsOf(tallies, kind, q, r)
  const exhibits: Exhibit[] = between.map((i) => ({
    operation: key.operation[i],
    role:
      kind === 'lost-increment' ? 'an increment between them' : 'an increment that could lie between them',
  }))
  if (q !== START) exhibits.push({ operation: key.operation[q], role: 'the read it is counted from' })
  if (!between.includes(r)) exhibits.push({ operation: key.operation[r], role: 'the blamed read' })
  const links: Link[] = []
  const pair = (before: number, after: number): void => {
    links.push({ type: 'pair', before: key.operation[before], after: key.operation[after] })
  }
  for (const i of between) {
    if (kind !== 'lost-increment') continue
    if (q !== START) pair(q, i)
    if (i !== r) pair(i, r)
  }
  if (kind === 'backward-counter') pair(q, r)
  return {
    kind,
    also,
    keyId: key.keyId,
    blamed: key.operation[r],
    cause: -1,
    exhibits: inOrder(key, exhibits),
    links,
    bounds,
    summary: counterSentence(tallies, tell, kind, q, r, least, most),
  }
}

/**
 * The increments of the evidence: for a count too low just enough that surely lie between, for one too high all
 * that could.
 */
function incrementsOf(tallies: Tallies, kind: FindingKind, q: number, r: number): number[] {
  if (kind === 'repeated-increment') return tallies.increments.filter((i) => tallies.maybeBetween(q, i, r))
  const sure = tallies.increments.filter((i) => tallies.size(i) > 0n && tallies.surelyBetween(q, i, r))
  if (tallies.hasDecreases) {
    return tallies.increments.filter(
      (i) => sure.includes(i) || (tallies.size(i) < 0n && tallies.maybeBetween(q, i, r)),
    )
  }
  // The largest first, its own always: fewest operations that prove it.
  const needed = tallies.count(r)! - tallies.count(q)!
  const chosen: number[] = []
  let sum = 0n
  const bySize = [...sure].sort((a, b) => {
    if (a === r || b === r) return a === r ? -1 : 1
    return tallies.size(a) > tallies.size(b) ? -1 : tallies.size(a) < tallies.size(b) ? 1 : a - b
  })
  for (const i of bySize) {
    // At least one: it is what puts the one read before the other.
    if (chosen.length > 0 && sum > needed) break
    chosen.push(i)
    sum += tallies.size(i)
  }
  return chosen.sort((a, b) => a - b)
}

function twinFinding(tallies: Tallies, tell: Teller, q: number, r: number): RawFinding {
  const { key } = tallies
  const count = tallies.count(r)!
  return {
    kind: 'lost-increment',
    also: [],
    keyId: key.keyId,
    blamed: key.operation[r],
    cause: -1,
    exhibits: [
      { operation: key.operation[q], role: 'an increment that returned this count' },
      { operation: key.operation[r], role: 'another that returned the same' },
    ],
    links: [],
    bounds: {
      from: key.operation[q],
      fromCount: count,
      toCount: count,
      least: tallies.size(r),
      most: tallies.size(r),
    },
    summary: `Two acknowledged increments of ${tell.keyName}, by ${tell.client(q)} and by ${tell.client(r)}, both returned ${count}: one of them was lost.`,
  }
}

/** Broken, and yet every read fits the bounds from every other: the slots between the counts cannot be filled. */
function slotConflict(tallies: Tallies, tell: Teller): RawFinding {
  const { key } = tallies
  const everything = Array.from(key.operation)
  return {
    kind: 'order-conflict',
    also: [],
    keyId: key.keyId,
    blamed: everything[everything.length - 1],
    cause: -1,
    exhibits: everything.map((operation) => ({ operation, role: 'part of the conflict' })),
    links: [],
    summary: `The counts read from ${tell.keyName} cannot all be right: no order of the increments fills the steps between them exactly, though no two reads contradict each other by themselves.`,
  }
}

/**
 * The versions of a register key: each write with the reads that returned its value (semantics.md, "Versions").
 *
 * Version 0 is the initial value; the others are the writes that took effect, in local order. An unsure write
 * that no read depends on is left out. A cas is a read of one version and the write of another.
 */
import { CAS, NO_VALUE } from '../history/columns.js'
import { IndexMap } from './index-map.js'
import type { KeyHistory } from './key-history.js'
import { precedes } from './precedence.js'
import { isRead, isWrite, readValue } from './roles.js'

/** In `Versions.readOf`: the operation does not read. */
export const NO_READ = -1
/** In `Versions.readOf`: nobody in the recording wrote the value that it returned. */
export const UNWRITTEN = -2
/** In `Versions.readOf`: only refused writes or failed cas offered the value. */
export const OFFERED_ONLY = -3
/** In `Versions.readOf`: more than one write could be the one it saw, or what it saw is unknown. */
export const AMBIGUOUS = -4

export interface Versions {
  /** number of versions, the initial one included */
  readonly count: number
  /** version → local index of its write; -1 for the initial version */
  readonly writer: Int32Array
  /** local index → version that it wrote, or -1 (it does not write, or is left out) */
  readonly writeOf: Int32Array
  /** local index → version whose value it returned, or one of the negative codes above */
  readonly readOf: Int32Array
  /** version → version that its cas found, or -1 (a plain write) */
  readonly found: Int32Array
  /** value id of the initial version, NO_VALUE while nothing tells */
  readonly initialValue: number
  /** whether a read returned the initial value or a cas found it */
  readonly isInitialSeen: boolean
  /** reads that are wrong by themselves, in local order: unwritten, offered only, or before their write */
  readonly wrongReads: readonly number[]
  /** the first reading operation whose version is ambiguous, or -1 */
  readonly ambiguous: number
  /** an unsure cas that was seen although what it expected was never there, or -1 */
  readonly impossibleCas: number
}

/**
 * Finds the versions of a register key. `resolved`, where given, names for each local index the write (local
 * index, -1 the initial value) that an ambiguous read saw. O(n) expected.
 */
export function findVersions(key: KeyHistory, resolved?: Int32Array): Versions {
  const { n } = key
  let initialValue = key.initial === NO_VALUE ? unknownInitial(key) : key.initial
  const writers = findWriters(key)

  // What each reader saw, as a local write index, -1 for the initial value, or a negative code below -1.
  const saw = new Int32Array(n).fill(NOTHING)
  let ambiguous = -1
  const look = (p: number, value: number): number => {
    if (resolved && isKnown(resolved[p])) return resolved[p]
    if (value === NO_VALUE) return AMBIGUOUS
    const writer = writers.get(value)
    if (writer < 0) {
      if (value === initialValue) return INITIAL
      return key.offered.has(value) ? OFFERED_ONLY : UNWRITTEN
    }
    return writer === SEVERAL || value === initialValue ? AMBIGUOUS : writer - 1
  }
  for (let p = 0; p < n; p++) {
    if (!isRead(key, p)) continue
    saw[p] = look(p, readValue(key, p))
    if (saw[p] === AMBIGUOUS && ambiguous < 0) ambiguous = p
  }

  // Which unsure writes took effect: those that a read depends on, through the cas that they are as well.
  const tookEffect = new Uint8Array(n)
  let impossibleCas = -1
  const depend = (first: number): void => {
    let w = first
    while (w >= 0 && tookEffect[w] === 0) {
      tookEffect[w] = 1
      if (key.kind[w] !== CAS || key.acked[w] === 1) return
      saw[w] = look(w, key.extra[w])
      if (saw[w] === UNWRITTEN && initialValue === NO_VALUE) {
        // No read tells the unknown initial value, but a cas that took effect must have found it.
        initialValue = key.extra[w]
        saw[w] = INITIAL
      }
      if (saw[w] === AMBIGUOUS && ambiguous < 0) ambiguous = w
      if ((saw[w] === UNWRITTEN || saw[w] === OFFERED_ONLY) && impossibleCas < 0) impossibleCas = w
      w = saw[w]
    }
  }
  for (let p = 0; p < n; p++) {
    if (key.acked[p] === 1 && isWrite(key, p)) tookEffect[p] = 1
  }
  for (let p = 0; p < n; p++) {
    if (saw[p] >= 0 && isRead(key, p)) depend(saw[p])
  }

  const writeOf = new Int32Array(n).fill(-1)
  const writer = new Int32Array(n + 1)
  writer[0] = -1
  let count = 1
  for (let p = 0; p < n; p++) {
    if (tookEffect[p] === 0) continue
    writeOf[p] = count
    writer[count++] = p
  }
  const readOf = new Int32Array(n).fill(NO_READ)
  const found = new Int32Array(count).fill(-1)
  const wrongReads: number[] = []
  let isInitialSeen = false
  for (let p = 0; p < n; p++) {
    const w = saw[p]
    if (w === NOTHING) continue
    const version = w === INITIAL ? 0 : w >= 0 ? writeOf[w] : w
    if (version === 0) isInitialSeen = true
    if (key.kind[p] === CAS && writeOf[p] >= 0 && version >= 0) found[writeOf[p]] = version
    if (!isRead(key, p)) continue
    readOf[p] = version
    if (version === UNWRITTEN || version === OFFERED_ONLY) wrongReads.push(p)
    else if (version > 0 && precedes(key, p, writer[version])) wrongReads.push(p)
  }
  return {
    count,
    writer: writer.slice(0, count),
    writeOf,
    readOf,
    found,
    initialValue,
    isInitialSeen,
    wrongReads,
    ambiguous,
    impossibleCas,
  }
}

const INITIAL = -1
const NOTHING = -9

function isKnown(resolved: number): boolean {
  return resolved >= INITIAL
}

/** In the answers of `findWriters`: several writes could have put the value there. */
const SEVERAL = 0

/** Value id → 1 + the one local write of it, SEVERAL, or -1 where nobody wrote it. */
function findWriters(key: KeyHistory): IndexMap {
  const writers = new IndexMap(key.history.values.size, key.n)
  for (let p = 0; p < key.n; p++) {
    if (isWrite(key, p)) writers.set(key.value[p], writers.get(key.value[p]) < 0 ? p + 1 : SEVERAL)
  }
  return writers
}

/** Under `initialUnknown`: the first value read that nobody wrote or offered. */
function unknownInitial(key: KeyHistory): number {
  const written = new Set<number>()
  for (let p = 0; p < key.n; p++) if (isWrite(key, p)) written.add(key.value[p])
  for (let p = 0; p < key.n; p++) {
    if (!isRead(key, p)) continue
    const value = readValue(key, p)
    if (value !== NO_VALUE && !written.has(value) && !key.offered.has(value)) return value
  }
  return NO_VALUE
}

/**
 * `no-lost-updates` on register keys: no two applied writes were computed from one version. Versions go by value
 * alone, clocks play no part.
 */
import { CAS, NO_VALUE, WRITE } from '../history/columns.js'
import type { KeyHistory } from '../order/key-history.js'
import { isWrite } from '../order/roles.js'
import { findVersions } from '../order/versions.js'

export interface UpdatesOfOneValue {
  /** value id that the updates were computed from */
  readonly base: number
  /** local indices of the applied writes computed from it, in local order */
  readonly updates: readonly number[]
  /** local indices of the writes of the value; the initial value and unknown writers are not listed */
  readonly writers: readonly number[]
}

export interface LostUpdates {
  /** values that more updates were computed from than there are versions of them */
  readonly lost: readonly UpdatesOfOneValue[]
  /** how many updates say what they were computed from */
  readonly updates: number
}

/** Finds the lost updates of a register key. O(n) expected. */
export function findLostUpdates(key: KeyHistory): LostUpdates {
  const versions = findVersions(key)
  const byBase = new Map<number, number[]>()
  const writersOf = new Map<number, number[]>()
  let updates = 0
  for (let p = 0; p < key.n; p++) {
    if (!isWrite(key, p)) continue
    push(writersOf, key.value[p], p)
    // An unsure write is accused only when it was seen, and then it is among the versions.
    if (versions.writeOf[p] < 0) continue
    const base = key.kind[p] === CAS || key.kind[p] === WRITE ? key.extra[p] : NO_VALUE
    if (base === NO_VALUE) continue
    updates++
    push(byBase, base, p)
  }
  const lost: UpdatesOfOneValue[] = []
  for (const [base, computed] of byBase) {
    const writers = writersOf.get(base) ?? []
    let known = writers.length + (key.initial === base ? 1 : 0)
    // A value that nobody wrote stands for one version, and so does the base of a write that only it wrote itself.
    if (known === 0 || (known === 1 && computed.includes(writers[0]))) known++
    if (computed.length > known) lost.push({ base, updates: computed, writers })
  }
  return { lost, updates }
}

function push(groups: Map<number, number[]>, group: number, p: number): void {
  const members = groups.get(group)
  if (members) members.push(p)
  else groups.set(group, [p])
}

/**
 * `no-lost-updates` by its definition: no two applied writes were computed from one version. Versions go by value.
 */
import { CAS, NO_VALUE, WRITE } from '../../history/columns.js'
import type { Recorded } from './recorded.js'

/** Whether more writes were computed from some value than there are versions of it. `all`: refused ones too. */
export function losesUpdates(recorded: Recorded, keyId: number, all: readonly number[]): boolean {
  const { kind, extra, initial, initialUnknown } = recorded.history
  const known = initial.get(keyId) ?? (initialUnknown ? NO_VALUE : 0)
  const writers = new Map<number, number[]>()
  for (const i of all) {
    if (!recorded.counts(i) || !recorded.writes(i)) continue
    const value = recorded.written(i)
    writers.set(value, [...(writers.get(value) ?? []), i])
  }
  const onlyWriter = (value: number): number => {
    const some = writers.get(value) ?? []
    return some.length === 1 && value !== known ? some[0] : -1
  }
  // An unsure write counts when it was seen: by a read, or by an unsure cas that was seen itself.
  const applied = new Set<number>()
  const see = (value: number): void => {
    for (let w = onlyWriter(value); w >= 0 && !applied.has(w); ) {
      applied.add(w)
      if (recorded.isAcked(w) || kind[w] !== CAS) return
      w = onlyWriter(extra[w])
    }
  }
  for (const i of all) if (recorded.counts(i) && recorded.writes(i) && recorded.isAcked(i)) applied.add(i)
  for (const i of all) {
    if (!recorded.counts(i) || !recorded.reads(i) || recorded.found(i) === NO_VALUE) continue
    const w = onlyWriter(recorded.found(i))
    if (w >= 0 && !recorded.isAcked(w)) see(recorded.found(i))
  }
  const computed = new Map<number, number[]>()
  for (const i of applied) {
    const base = kind[i] === CAS || kind[i] === WRITE ? extra[i] : NO_VALUE
    if (base !== NO_VALUE) computed.set(base, [...(computed.get(base) ?? []), i])
  }
  for (const [base, updates] of computed) {
    const some = writers.get(base) ?? []
    let versions = some.length + (known === base ? 1 : 0)
    // A value that nobody wrote stands for one version, and so does the base of a write that only it wrote itself.
    if (versions === 0 || (versions === 1 && updates.includes(some[0]))) versions++
    if (updates.length > versions) return true
  }
  return false
}

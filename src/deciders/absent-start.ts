/**
 * Under `initialUnknown` a key may have begun absent, also where a delete in the recording writes absence: nobody
 * chooses that value, so one writing of it does not show that it was not there before.
 */
import { CAS, DELETE, NO_VALUE, NULL_VALUE, WRITE } from '../history/columns.js'
import { gatherOperations, type KeyHistory } from '../order/key-history.js'
import { isRead, readValue } from '../order/roles.js'
import type { Versions } from '../order/versions.js'

/** Whether a read of absence could have seen the unknown start as well as what a delete left. O(n). */
export function mayHaveBegunAbsent(key: KeyHistory, versions: Versions): boolean {
  if (key.initial !== NO_VALUE || versions.initialValue !== NO_VALUE) return false
  let isWritten = false
  let isSeen = false
  for (let p = 0; p < key.n; p++) {
    const writes = key.kind[p] === DELETE || key.kind[p] === WRITE || key.kind[p] === CAS
    if (writes && key.value[p] === NULL_VALUE) isWritten = true
    if (key.kind[p] === CAS && key.applied[p] === 1 && key.extra[p] === NULL_VALUE) isSeen = true
    if (isRead(key, p) && readValue(key, p) === NULL_VALUE) isSeen = true
  }
  return isWritten && isSeen
}

/**
 * Whether the key is broken even when nobody says to have seen absence: then no start explains it. `isBroken` decides
 * what is left of it.
 */
export function isBrokenWithoutAbsence(key: KeyHistory, isBroken: (rest: KeyHistory) => boolean): boolean {
  const rest: number[] = []
  for (let p = 0; p < key.n; p++) {
    const isUpdate = key.kind[p] === CAS && key.applied[p] === 1
    // A cas that found absence cannot be left out without its write.
    if (isUpdate && key.extra[p] === NULL_VALUE) return false
    if (!isUpdate && isRead(key, p) && readValue(key, p) === NULL_VALUE) continue
    rest.push(key.operation[p])
  }
  const operations = Int32Array.from(rest).sort()
  const alone = gatherOperations(key.history, operations, key.keyId, key.clockErrorNs)
  return isBroken({ ...alone, offered: key.offered })
}

/**
 * The one plain sentence of each kind of register finding, with the numbers in it.
 */
import type { Versions } from '../../order/versions.js'
import type { FindingKind } from '../kinds.js'
import { plural, type Teller } from '../telling.js'

/** What a sentence about a blamed read needs. Local indices. */
export interface ReadStory {
  readonly read: number
  /** value id that was returned */
  readonly returned: number
  /** the overwriting write */
  readonly write: number
  /** the operation that shows it: the write itself, or a read of it */
  readonly via: number
  /** how many newer writes were certainly done before the read */
  readonly behind: number
}

export function readSentence(kind: FindingKind, tell: Teller, story: ReadStory): string {
  const { key } = tell
  const { read, write, via, behind } = story
  const returned = tell.value(story.returned)
  const newer = tell.value(key.value[write])
  const who = tell.client(read)
  const where = tell.keyName
  const lag = behind > 1 ? `, ${plural(behind, 'acknowledged write')} behind` : ''
  switch (kind) {
    case 'own-write-missed':
      return `${who} wrote ${newer} to ${where} and, ${tell.gap(write, read)} after that was acknowledged, read the older ${returned}${lag}.`
    case 'backward-read':
      return `${who} read ${newer} from ${where} and, ${tell.gap(via, read)} later, the older ${returned}.`
    case 'stale-read':
      return `${who} read ${returned} from ${where} ${tell.gap(write, read)} after ${tell.client(write)}'s write of ${newer} over it was acknowledged${lag}.`
    default: {
      const state = key.acked[write] === 1 ? 'was still in flight' : 'had no known outcome'
      return `${who} read the older ${returned} from ${where} ${tell.gap(via, read)} after ${tell.client(via)} had read ${newer}, whose write ${state}.`
    }
  }
}

export function lostWriteSentence(
  tell: Teller,
  write: number,
  reads: readonly number[],
  older: number,
): string {
  const { key } = tell
  const others = older > 0 ? ` (and ${plural(older, 'older acknowledged write')} with it)` : ''
  return `The acknowledged write of ${tell.value(key.value[write])} to ${tell.keyName} by ${tell.client(write)} was lost${others}: ${plural(reads.length, 'read')} after it returned older values, through to the end of the recording, and none after them returned it or anything newer.`
}

export function revertedSentence(tell: Teller, versions: Versions, read: number, from: number): string {
  const newer = tell.value(tell.key.value[versions.writer[from]])
  const old = tell.value(valueReturned(versions, tell, read))
  return `${tell.keyName} went back from ${newer} to the older ${old}: both had been read in turn before ${tell.client(read)} read ${old} again, and ${newer} was not seen any more.`
}

/** Value id that a read returned, by its version. */
export function valueReturned(versions: Versions, { key }: Teller, read: number): number {
  const version = versions.readOf[read]
  return version === 0 ? versions.initialValue : key.value[versions.writer[version]]
}

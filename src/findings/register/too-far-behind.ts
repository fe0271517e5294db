/**
 * Reads beyond the `versions` bound of bounded-staleness.
 */
import { readsTooFarBehind, writesBetween } from '../../deciders/version-bound.js'
import type { Counting } from '../../order/counting.js'
import type { Versions } from '../../order/versions.js'
import type { Link, RawFinding } from '../raw-finding.js'
import { plural, Teller } from '../telling.js'
import { valueReturned } from './sentences.js'

/** One finding for each read that is more than `bound` acked writes behind. */
export function findTooFarBehind(counting: Counting, versions: Versions, bound: number): RawFinding[] {
  const { key } = counting
  const tell = new Teller(key)
  return readsTooFarBehind(counting, versions, bound).map((read) => {
    const write = versions.writer[versions.readOf[read]]
    const between = writesBetween(counting, write, read, bound + 1).sort((a, b) => a - b)
    const at = (p: number): number => key.operation[p]
    const links: Link[] = between.flatMap((w): Link[] => [
      write < 0
        ? { type: 'initial', before: -1, after: at(w) }
        : { type: 'pair', before: at(write), after: at(w) },
      { type: 'pair', before: at(w), after: at(read) },
    ])
    if (write >= 0) links.push({ type: 'returned', before: at(write), after: at(read) })
    const own = between.some((w) => key.client[w] === key.client[read])
    const returned = tell.value(valueReturned(versions, tell, read))
    return {
      kind: own ? 'own-write-missed' : 'stale-read',
      also: own ? ['stale-read'] : [],
      keyId: key.keyId,
      blamed: at(read),
      cause: at(between[between.length - 1]),
      exhibits: [
        ...(write < 0 ? [] : [{ operation: at(write), role: 'the write of what it returned' }]),
        ...between.map((w) => ({ operation: at(w), role: 'an acknowledged write in between' })),
        { operation: at(read), role: 'the blamed read' },
      ],
      links,
      summary: `${tell.client(read)} read ${returned} from ${tell.keyName} after at least ${plural(between.length, 'later write')} had been acknowledged; at most ${bound} may lie between.`,
    }
  })
}

import type { KeyHistory } from '../order/key-history.js'
import type { Exhibit } from './raw-finding.js'

/** Exhibits of a key in order of start, then of input. */
export function inOrder(key: KeyHistory, exhibits: Exhibit[]): Exhibit[] {
  const { times } = key.history
  return exhibits.sort((a, b) => {
    const [s, t] = [times.startNs(a.operation), times.startNs(b.operation)]
    return s < t ? -1 : s > t ? 1 : a.operation - b.operation
  })
}

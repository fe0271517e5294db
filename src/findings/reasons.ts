/**
 * Why one operation of a chain must come before the next, in plain words.
 */
import { type History, UNSURE } from '../history/columns.js'
import type { Link } from './raw-finding.js'
import { duration, quoted } from './telling.js'

export function reasonOf(history: History, link: Link): string {
  const { before, after } = link
  switch (link.type) {
    case 'pair': {
      const gap = history.times.startNs(after) - history.times.endNs(before)
      const clock =
        history.client[before] === history.client[after]
          ? 'the same client, one request at a time'
          : history.host[before] === history.host[after]
            ? 'one clock'
            : 'two clocks'
      return `it ended ${duration(gap)} before the other began (${clock})`
    }
    case 'initial':
      return 'the initial value comes before every write'
    case 'returned':
      return `it wrote the ${quoted(history.values.text(history.value[before]))} that the other returned${history.outcome[before] === UNSURE ? ', so it took effect' : ''}`
    case 'found':
      return 'the other, a cas, found the version that it wrote, so it comes directly after it'
    case 'session':
      return 'the same client did it first'
    case 'conflict':
      return 'a read of what the other wrote already depended on it, so the other came later'
    case 'overwritten':
      return 'it returned an older version than the other wrote, so it should have come before it'
  }
}

/**
 * The read-after-write curves as CSV (RFC 4180): one row a bin, times in nanoseconds.
 */
import type { Freshness } from '../freshness/figures.js'

const COLUMNS = ['group', 'from_ns', 'to_ns', 'reads', 'fresh', 'share', 'low', 'high']

export function freshnessCsv({ groups }: Freshness): string {
  const rows = groups.flatMap(({ name, curve }) =>
    curve.map(({ fromNs, toNs, reads, fresh, share, low, high }) =>
      [quoted(name), fromNs, toNs ?? '', reads, fresh, share, low, high].join(','),
    ),
  )
  return `${[COLUMNS.join(','), ...rows].join('\r\n')}\r\n`
}

/** A leading sign that a spreadsheet would take for a formula gets an apostrophe before it. */
function quoted(text: string): string {
  const safe = /^[=+\-@\t\r]/.test(text) ? `'${text}` : text
  return `"${safe.replaceAll('"', '""')}"`
}

/**
 * Times of a record, by the unit that the mapping names.
 */
import { type Nanoseconds, parseCount, parseTimestamp, TimeTrouble } from './instants.js'
import { jsonText, scalarText } from './json-node.js'
import type { TimeSpec } from './mapping-schema.js'
import type { Row } from './rows.js'
import { type Compilation, compileSource, type Source } from './sources.js'
import { quoted, RowTrouble } from './trouble.js'

export interface Time {
  /** undefined where nothing (or null) is there; throws RowTrouble for what is no time */
  get(row: Row): Nanoseconds | undefined
  /** what stands there instead, for a message */
  missing(row: Row): string
}

export type TimeUnit = 'ns' | 'us' | 'ms' | 's' | 'iso'

/** The time at a path of the mapping. */
export function compileTime(
  compilation: Compilation,
  spec: TimeSpec,
  path: readonly PropertyKey[],
  isDuration: boolean,
): Time {
  const own = typeof spec === 'string' ? undefined : spec.unit
  const unit = own ?? compilation.mapping.spec.unit
  if (unit === undefined)
    compilation.refuse(path, 'a time without unit', 'unit: ns, us, ms, s or iso, here or for the whole file')
  if (unit === 'iso' && isDuration)
    compilation.refuse(path, 'iso as the unit of a duration', 'unit: ns, us, ms or s')
  const isRounded = typeof spec !== 'string' && spec.round === true
  return timeOf(compileSource(compilation, spec, path), unit ?? 'ns', isRounded)
}

/** Reads a source as a time. `isRounded`: finer than a nanosecond is allowed. */
export function timeOf(source: Source, unit: TimeUnit, isRounded: boolean): Time {
  return {
    get(row) {
      const node = source.get(row)
      if (node === undefined || node.kind === 'null') return undefined
      const text = scalarText(node) ?? jsonText(node)
      let ns: Nanoseconds
      try {
        ns = unit === 'iso' ? parseTimestamp(text) : parseCount(text, unit)
      } catch (error) {
        if (!(error instanceof TimeTrouble)) throw error
        throw new RowTrouble('bad-time', quoted(text), error.expected, error.advice)
      }
      if (ns.floor !== ns.ceil && !isRounded)
        throw new RowTrouble(
          'time-too-fine',
          quoted(text),
          'a time in whole nanoseconds',
          'round: true rounds so that the request lasts no shorter',
        )
      return ns
    },
    missing: source.missing,
  }
}

/**
 * Rewrites the times of a record to whole nanoseconds and nothing else.
 */
import { F, NUMBER, RecordScanner, STRING } from './record-scanner.js'
import { timeNs, UNITS, unitNs } from './time-text.js'

/** The record's text with `start` and `end`, given in a unit of `fromUnitNs` nanoseconds, in nanoseconds. */
export function rewriteTimes(record: string, fromUnitNs: bigint): string {
  const unit = UNITS.find((each) => unitNs(each) === fromUnitNs)!
  const bytes = new TextEncoder().encode(record)
  const scanner = new RecordScanner()
  if (!scanner.scan(bytes, 0, bytes.length)) throw new Error(`not a record: ${record}`)
  const fields = [F.start, F.end]
    .filter((field) => scanner.type[field] === NUMBER || scanner.type[field] === STRING)
    .sort((a, b) => scanner.from[b] - scanner.from[a])
  const decoder = new TextDecoder()
  let text = ''
  let rest = bytes.length
  for (const field of fields) {
    const quote = scanner.type[field] === STRING ? 1 : 0
    text =
      timeNs(scanner.text(field), unit).toString() +
      decoder.decode(bytes.subarray(scanner.to[field] + quote, rest)) +
      text
    rest = scanner.from[field] - quote
  }
  return decoder.decode(bytes.subarray(0, rest)) + text
}

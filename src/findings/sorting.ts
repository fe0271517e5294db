import { fileOf, type History } from '../history/columns.js'
import { FINDING_KINDS } from './kinds.js'
import type { RawFinding } from './raw-finding.js'

/** A finding with the name of the promise that it breaks. */
export interface NamedFinding {
  readonly promise: string
  readonly finding: RawFinding
}

/** Sorts by file and line of the blamed operation, then kind, then promise. */
export function sortFindings(history: History, findings: NamedFinding[]): NamedFinding[] {
  return findings.sort((a, b) => {
    const [p, q] = [a.finding.blamed, b.finding.blamed]
    return (
      fileOf(history, p) - fileOf(history, q) ||
      history.line[p] - history.line[q] ||
      FINDING_KINDS.indexOf(a.finding.kind) - FINDING_KINDS.indexOf(b.finding.kind) ||
      (a.promise < b.promise ? -1 : a.promise > b.promise ? 1 : p - q)
    )
  })
}

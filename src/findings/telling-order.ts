/**
 * In which order findings are told to people: what breaks on one operation together, what has one cause together,
 * the worst kind first.
 */
import { FINDING_KINDS } from './kinds.js'
import type { Finding, FindingOperation } from './result.js'

/** Findings on one blamed operation, one a promise (or kind), worst kind first. */
export type Paragraph = readonly [Finding, ...Finding[]]

/** Paragraphs of one cause (one overwriting write of one key), worst kind first. */
export type CauseGroup = readonly [Paragraph, ...Paragraph[]]

/** Groups findings for telling. Groups stand by their worst kind, then by their first id. */
export function groupFindings(findings: readonly Finding[]): CauseGroup[] {
  const paragraphs = gather([...findings].sort(worstFirst), ({ operations, blamed, key, id }) =>
    key === undefined ? `${id}` : `${place(operations[blamed])} ${key}`,
  )
  return gather(paragraphs, ([{ operations, cause, key, id }]) =>
    cause === undefined ? `${id}` : `${place(operations[cause])} ${key}`,
  )
}

function worstFirst(a: Finding, b: Finding): number {
  return FINDING_KINDS.indexOf(a.kind) - FINDING_KINDS.indexOf(b.kind) || a.id - b.id
}

/** Puts together what has one name, in order of first appearance. */
function gather<T>(items: readonly T[], nameOf: (item: T) => string): [T, ...T[]][] {
  const groups = new Map<string, [T, ...T[]]>()
  for (const item of items) {
    const name = nameOf(item)
    const group = groups.get(name)
    if (group) group.push(item)
    else groups.set(name, [item])
  }
  return [...groups.values()]
}

function place({ file, line }: FindingOperation): string {
  return `${line} ${file}`
}

/**
 * Two results of the same drill: which findings are new, gone, or still there. Findings are matched by what they are,
 * not by lines and times, which change from run to run.
 */
import { z } from 'zod'
import { type Finding, findingKindSchema, type Result } from './result.js'

const count = z.int().min(0)
const groupSchema = z.object({
  kind: findingKindSchema,
  promise: z.string(),
  key: z.string().describe('the key, runs of digits as #'),
  shape: z.string().describe('what the evidence is made of'),
  old: count,
  new: count,
  oldIds: z.array(z.int()).describe('findings of the old result'),
  newIds: z.array(z.int()).describe('findings of the new result'),
  example: z.string().describe('the sentence of one of them'),
})

/** The comparison, version 1. */
export const comparisonSchema = z.object({
  compare: z.literal(1),
  misread: z.string(),
  new: z.array(groupSchema).describe('only in the new result'),
  still: z.array(groupSchema).describe('in both; more of a known finding is not new'),
  gone: z.array(groupSchema).describe('only in the old result'),
  exit: z.union([z.literal(0), z.literal(1)]),
})
export type Comparison = z.infer<typeof comparisonSchema>
export type ComparedGroup = z.infer<typeof groupSchema>

/** Compares two results. O(findings). */
export function compareResults(old: Result, now: Result): Omit<Comparison, 'misread'> {
  const groups = new Map<string, ComparedGroup>()
  const add = (finding: Finding, isNew: boolean): void => {
    const { kind, promise } = finding
    const key = keyPattern(finding)
    const shape = shapeOf(finding)
    const name = JSON.stringify([kind, promise, key, shape])
    let group = groups.get(name)
    if (!group) {
      group = { kind, promise, key, shape, old: 0, new: 0, oldIds: [], newIds: [], example: finding.summary }
      groups.set(name, group)
    }
    if (isNew) {
      group.new++
      group.newIds.push(finding.id)
    } else {
      group.old++
      group.oldIds.push(finding.id)
    }
  }
  for (const finding of now.findings) add(finding, true)
  for (const finding of old.findings) add(finding, false)
  const all = [...groups.values()]
  const added = all.filter((group) => group.old === 0)
  return {
    compare: 1,
    new: added,
    still: all.filter((group) => group.old > 0 && group.new > 0),
    gone: all.filter((group) => group.new === 0),
    exit: added.length > 0 ? 1 : 0,
  }
}

/** The key or keys with runs of digits as `#`: berth/12 and berth/7 are one pattern. */
function keyPattern({ key, keys }: Finding): string {
  return (keys ?? [key ?? '']).map((each) => each.replace(/[0-9]+/g, '#')).join(' ')
}

/** What the evidence is made of: operations with their roles in order, the same ones in a row once. */
function shapeOf({ operations }: Finding): string {
  const parts = operations.map(
    ({ op, role, outcome }) => `${outcome === 'acked' ? '' : `${outcome} `}${op} (${role})`,
  )
  return parts.filter((part, i) => part !== parts[i - 1]).join(', ')
}

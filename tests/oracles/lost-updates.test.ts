import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { noLostUpdates } from '../../src/promises/no-lost-updates.js'
import { keyText } from './arbitraries.js'
import type { PlainOperation } from './brute-force.js'
import { decide, runs } from './decide.js'

/** Updates over few values, so that bases repeat and some stand alone. */
const operation = fc.record({
  kind: fc.constantFrom('write', 'write', 'based', 'based', 'cas', 'cas', 'failed', 'read'),
  value: fc.integer({ min: 0, max: 4 }),
  base: fc.integer({ min: 0, max: 4 }),
  outcome: fc.constantFrom('acked', 'acked', 'acked', 'unsure', 'refused'),
})

/** By definition: give every applied update a version of its own, the value that it was computed from. */
function someUpdateIsLost(
  operations: (PlainOperation & { basis?: unknown })[],
  initial: number | undefined,
): boolean {
  const isWriter = (op: PlainOperation): boolean =>
    op.outcome !== 'refused' && op.op !== 'read' && !(op.outcome === 'acked' && op.applied === false)
  const writers = operations.filter(isWriter)
  const readValues = operations
    .filter((op) => op.outcome === 'acked' && op.op !== 'write')
    .map((op) => (op.op === 'read' ? op.value : op.applied === false ? op.saw : op.expect))
  const seen = new Set<PlainOperation>()
  const look = (value: unknown): void => {
    const all = writers.filter((w) => w.value === value)
    if (all.length !== 1 || value === initial || seen.has(all[0])) return
    seen.add(all[0])
    if (all[0].outcome === 'unsure' && all[0].op === 'cas') look(all[0].expect)
  }
  for (const value of readValues) if (value !== undefined) look(value)
  const applied = writers.filter((op) => op.outcome === 'acked' || seen.has(op))
  const updates = applied
    .map((op) => ({ op, base: op.op === 'cas' ? op.expect : op.basis }))
    .filter(({ base }) => base !== undefined)

  const assign = (at: number, taken: Set<unknown>): boolean => {
    if (at === updates.length) return true
    const { op, base } = updates[at]
    const versions: unknown[] = writers.filter((w) => w.value === base && w !== op)
    if (base === initial) versions.push('initial')
    const isSomebodys = writers.some((w) => w.value === base) || base === initial
    const onlyItsOwn = versions.length === 0 && isSomebodys
    if (!isSomebodys || onlyItsOwn) versions.push(`unknown ${base}`)
    for (const version of versions) {
      if (taken.has(version)) continue
      if (assign(at + 1, new Set([...taken, version]))) return true
    }
    return false
  }
  return !assign(0, new Set())
}

describe('no-lost-updates', () => {
  it('agrees with giving every update a version of its own', async () => {
    const tally = { holds: 0, broken: 0 }
    await fc.assert(
      fc.asyncProperty(
        fc.array(operation, { minLength: 1, maxLength: 6 }),
        fc.boolean(),
        async (drafts, hasInitial) => {
          const operations = drafts.map((d, i) => {
            const record: PlainOperation & { basis?: unknown } = {
              client: `c${i}`,
              op: d.kind === 'read' ? 'read' : d.kind === 'cas' || d.kind === 'failed' ? 'cas' : 'write',
              key: 'k',
              value: d.value,
              start: i,
              end: i + 1,
              outcome: d.outcome as 'acked',
            }
            if (d.kind === 'based') record.basis = d.base
            if (record.op === 'cas') record.expect = d.base
            if (d.kind === 'failed')
              Object.assign(record, { applied: false, saw: d.base === d.value ? 9 : d.base })
            return record
          })
          const initial = hasInitial ? 0 : undefined
          const key = { operations, clockError: 0, ...(hasInitial ? { initial } : {}) }
          const expected = someUpdateIsLost(operations, initial) ? 'broken' : 'holds'
          tally[expected]++
          const { verdict } = await decide(key, noLostUpdates)
          expect(verdict, keyText(key)).toBe(expected)
        },
      ),
      { numRuns: runs(2000) },
    )
    expect(Math.min(tally.holds, tally.broken)).toBeGreaterThan(100)
  })
})

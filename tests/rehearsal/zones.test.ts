/** The zones that are kept say the same as all of them would. */
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { newVersion, type Operation, type Version } from '../../src/rehearsal/operation.js'
import { Zones } from '../../src/rehearsal/zones.js'

const LONGEST = 20

/** Two versions contradict each other when each had an operation that ended before one of the other began. */
class AllZones {
  readonly #used = new Map<Version, { firstEnd: number; lastStart: number }>()

  constructor(initial: Version) {
    this.#used.set(initial, { firstEnd: Number.NEGATIVE_INFINITY, lastStart: Number.NEGATIVE_INFINITY })
  }

  ended(version: Version, start: number, end: number): boolean {
    const zone = this.#used.get(version) ?? { firstEnd: end, lastStart: start }
    zone.lastStart = Math.max(zone.lastStart, start)
    this.#used.set(version, zone)
    return [...this.#used].some(
      ([other, { firstEnd, lastStart }]) =>
        other !== version && firstEnd < zone.lastStart && zone.firstEnd < lastStart,
    )
  }
}

const step = fc.record({
  /** from the end of the last operation to the end of this one */
  gap: fc.integer({ min: 1, max: 8 }),
  lasts: fc.integer({ min: 1, max: LONGEST }),
  isWrite: fc.boolean(),
  /** how many versions back a read looks */
  back: fc.oneof({ weight: 6, arbitrary: fc.nat(1) }, { weight: 1, arbitrary: fc.nat(300) }),
})

describe('zones', () => {
  it('decide each answer as if nothing was dropped', () => {
    let wrong = 0
    let right = 0
    fc.assert(
      fc.property(
        fc.array(step, { minLength: 100, maxLength: 400, size: 'max' }),
        fc.constantFrom(0.1, 0.5, 0.9),
        (steps, writes) => {
          const initial = newVersion('null')
          const zones = new Zones(initial, LONGEST)
          const all = new AllZones(initial)
          const versions = [initial]
          let now = 0
          steps.forEach(({ gap, lasts, isWrite, back }, i) => {
            now += gap
            // At first mostly writes, then a quiet time in which some of them are read.
            const writing = i < steps.length * writes ? isWrite || back === 0 : false
            if (writing) versions.push(newVersion(String(i)))
            const version = writing ? versions.at(-1)! : versions[Math.max(0, versions.length - 1 - back)]
            const operation = { kind: writing ? 'write' : 'read', start: now - lasts, version } as Operation
            const expected = all.ended(version, now - lasts, now)
            expect(zones.ended(operation, version, true, now)).toBe(expected)
            if (expected) wrong++
            else right++
          })
        },
      ),
      { numRuns: 300 },
    )
    expect(Math.min(wrong, right)).toBeGreaterThan(1000)
  })

  it('do not forget what an old version contradicts, wherever the dropping falls', () => {
    for (let count = 1; count < 300; count++) {
      const zones = new Zones(newVersion('null'), LONGEST)
      const versions = Array.from({ length: count + 1 }, (_, i) => newVersion(String(i)))
      const use = (kind: string, version: Version, end: number): boolean =>
        zones.ended({ kind, start: end - 1, version } as Operation, version, true, end)
      const written = versions.map((version, i) => use('write', version, 10 * i))
      expect(written).not.toContain(true)
      const later = 10 * count + 100
      expect([1, 2, 3].map((i) => use('read', versions[0], later + 10 * i))).toEqual([true, true, true])
    }
  })

  it('know that two compare-and-sets cannot both replace one version', () => {
    const initial = newVersion('null')
    const zones = new Zones(initial, LONGEST)
    const cas = (start: number): Operation =>
      ({ kind: 'cas', start, version: newVersion('"x"') }) as Operation
    expect(zones.ended(cas(1), initial, true, 5)).toBe(false)
    expect(zones.ended(cas(2), initial, true, 6)).toBe(true)
    expect(zones.ended(cas(2), initial, false, 7)).toBe(false)
  })
})

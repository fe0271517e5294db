/**
 * The truth as the judge of the checker, and the other way round: each fault makes the findings it should and no
 * others.
 */
import { describe, expect, it } from 'vitest'
import type { FindingKind } from '../../src/findings/kinds.js'
import { checked, isHarm, named, play } from './play.js'

interface Expected {
  /** kinds that some of the seeds show */
  readonly shown: readonly FindingKind[]
  /** kinds that such a fault may show as well */
  readonly also?: readonly FindingKind[]
  readonly causes: readonly string[]
}

const EXPECTED: Record<string, Expected> = {
  'follower-reads': {
    shown: [
      ...(['own-write-missed', 'stale-read', 'backward-read', 'reverted-value'] as const),
      ...(['lost-increment', 'repeated-increment', 'backward-counter'] as const),
    ],
    also: ['read-inversion'],
    causes: ['follower-read'],
  },
  cache: {
    shown: ['stale-read', 'own-write-missed'],
    also: ['backward-read', 'reverted-value', 'read-inversion', 'lost-write'],
    causes: ['cache', 'lost-invalidations'],
  },
  failover: {
    shown: ['lost-write', 'lost-increment', 'reverted-value', 'stale-read'],
    also: ['own-write-missed', 'backward-read', 'lost-update', 'backward-counter', 'read-inversion'],
    causes: ['failover'],
  },
  'two-leaders': {
    shown: [
      ...(['stale-read', 'reverted-value', 'own-write-missed', 'lost-update'] as const),
      ...(['lost-increment', 'repeated-increment', 'backward-counter'] as const),
    ],
    also: ['lost-write', 'backward-read', 'read-inversion', 'order-conflict'],
    causes: ['two-leaders'],
  },
  retries: { shown: ['repeated-increment'], causes: ['retry'] },
  handover: {
    shown: ['lost-write', 'stale-read', 'reverted-value', 'own-write-missed'],
    also: ['backward-read', 'read-inversion', 'order-conflict'],
    causes: ['handover'],
  },
  'small-quorums': {
    shown: ['stale-read', 'own-write-missed', 'reverted-value'],
    also: ['backward-read', 'read-inversion', 'lost-write'],
    causes: ['small-quorum'],
  },
  'meeting-quorums': {
    shown: ['read-inversion', 'backward-read', 'reverted-value'],
    also: ['stale-read'],
    causes: ['small-quorum'],
  },
}
/** Fewer where each shows hundreds of findings. */
const seedsOf = (name: string): number => (name === 'follower-reads' ? 10 : 25)

describe.each(Object.entries(EXPECTED))('%s', (name, { shown, also = [], causes }) => {
  it('makes its findings and no others, and the truth explains each', async () => {
    const kinds = new Set<string>()
    const seenCauses = new Set<string>()
    for (let seed = 1; seed <= seedsOf(name); seed++) {
      const { history, hits } = play(named(name), seed)
      const harm = hits.filter(isHarm)
      for (const { cause } of harm) seenCauses.add(cause)
      const { findings, keys } = await checked(history)
      for (const { kind } of findings) kinds.add(kind)

      // Each finding shows an operation that the fault hit.
      const lines = new Set(harm.map(({ line }) => line))
      const strange = findings.filter(({ operations }) => !operations.some(({ line }) => lines.has(line)))
      expect(
        strange.map(({ summary }) => summary),
        `seed ${seed}`,
      ).toEqual([])

      // A register is broken where the truth can be proven from the answers, and only there: the truth watches
      // zones as answers come (Gibbons and Korach 1997), the checker sorts versions when all is over.
      const provable = new Set(hits.filter((hit) => hit.provable).map(({ key }) => key))
      for (const { key, kind, verdicts } of keys) {
        if (kind === 'register') {
          expect([key, verdicts.linearizable], `seed ${seed}`).toEqual([
            key,
            provable.has(key) ? 'broken' : 'holds',
          ])
        } else if (provable.has(key)) expect(verdicts.linearizable, `${key}, seed ${seed}`).toBe('broken')
        if (verdicts.linearizable === 'broken')
          expect(
            harm.map((hit) => hit.key),
            `seed ${seed}`,
          ).toContain(key)
      }
    }
    expect([...kinds].sort()).toEqual(expect.arrayContaining([...shown].sort()))
    expect([...shown, ...also]).toEqual(expect.arrayContaining([...kinds]))
    expect([...seenCauses].sort()).toEqual([...causes].sort())
  })
})

describe('a lost change', () => {
  it('was acknowledged, or seen, or nobody knows; its line names it', () => {
    for (let seed = 1; seed <= 20; seed++) {
      const { history, hits } = play(named('failover'), seed)
      const lines = history.split('\n')
      const lost = hits.filter(({ effect }) => effect === 'lost')
      expect(lost.length).toBeGreaterThan(0)
      for (const { line, client, op, key, fault } of lost) {
        expect(JSON.parse(lines[line - 1])).toMatchObject({ client, op, key })
        expect(op).not.toBe('read')
        expect(fault).toBe(1)
      }
    }
  })

  it('is returned by no closing read', () => {
    for (let seed = 1; seed <= 20; seed++) {
      const { history, hits } = play(named('failover'), seed)
      const records = history
        .trimEnd()
        .split('\n')
        .map((line) => JSON.parse(line))
      const lost = hits.filter(({ effect, op }) => effect === 'lost' && op === 'write')
      const values = new Set(lost.map(({ line }) => records[line - 1].value))
      const closing = records.slice(-2 * 28).filter(({ op }) => op === 'read')
      expect(closing.length).toBeGreaterThan(50)
      expect(closing.filter(({ value }) => value !== null && values.has(value))).toEqual([])
    }
  })
})

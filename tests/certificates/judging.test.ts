/**
 * Each judgement of the verifier against the definition read out literally, on keys so small that every claim that
 * could be made about them is made: what is accepted is true, and an order is accepted exactly when it is a witness.
 */
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { type Family, keyText, tinyKey } from '../oracles/arbitraries.js'
import { bruteForce, type PlainKey, type PlainRule } from '../oracles/brute-force.js'
import { isWitnessByDefinition } from '../oracles/by-definition.js'
import { runs } from '../oracles/decide.js'
import { PLAIN_RULES } from '../oracles/rules.js'
import { judgeOf } from './judging.js'

const FAMILIES: Family[] = ['register', 'cas', 'ambiguous', 'counter', 'sizes', 'mixed']

/** Every sequence of some of the operations 0 … n - 1, each at most once. */
function sequences(n: number): number[][] {
  const all: number[][] = []
  const extend = (sequence: number[]): void => {
    all.push(sequence)
    for (let i = 0; i < n; i++) if (!sequence.includes(i)) extend([...sequence, i])
  }
  extend([])
  return all
}

function subsets(n: number): number[][] {
  return Array.from({ length: 2 ** n }, (_, set) =>
    Array.from({ length: n }, (_, i) => i).filter((i) => (set >> i) & 1),
  )
}

const meansSomething = (key: PlainKey, rule: PlainRule): boolean =>
  rule.versions === undefined || !key.operations.some(({ op }) => op === 'increment')

describe.each(FAMILIES)('claims about %s keys', (family) => {
  it('hold by an order exactly when it is a witness by definition', async () => {
    const tally = { accepted: 0, refused: 0 }
    await fc.assert(
      fc.asyncProperty(tinyKey(family, 4), async (key) => {
        const judge = await judgeOf(key)
        for (const rule of PLAIN_RULES.filter((each) => meansSomething(key, each))) {
          for (const sequence of sequences(key.operations.length)) {
            const isWitness = isWitnessByDefinition(key, rule, sequence)
            tally[isWitness ? 'accepted' : 'refused']++
            expect(
              judge.order(rule, sequence) === undefined,
              `${JSON.stringify(rule)} ${sequence}\n${keyText(key)}`,
            ).toBe(isWitness)
          }
        }
      }),
      { numRuns: runs(60) },
    )
    expect(tally.accepted).toBeGreaterThan(300)
    expect(tally.refused).toBeGreaterThan(300)
  })

  it('are broken by operations only where they are by definition, and then by all of them', async () => {
    const tally = { proved: 0, parts: 0, not: 0 }
    await fc.assert(
      fc.asyncProperty(tinyKey(family, 5), async (key) => {
        const judge = await judgeOf(key)
        const n = key.operations.length
        const counting = Array.from({ length: n }, (_, i) => i).filter((i) => {
          const { op, outcome, end } = key.operations[i]
          return outcome !== 'refused' && !(op === 'read' && (outcome === 'unsure' || end === undefined))
        })
        for (const rule of PLAIN_RULES.filter((each) => meansSomething(key, each))) {
          const isBroken = !bruteForce(key, rule)
          const where = `${JSON.stringify(rule)}\n${keyText(key)}`
          expect(judge.counterexample(rule, counting) === 'proved', where).toBe(isBroken)
          tally[isBroken ? 'proved' : 'not']++
          for (const operations of subsets(n)) {
            if (judge.counterexample(rule, operations) !== 'proved') continue
            expect(isBroken, `${operations} ${where}`).toBe(true)
            if (operations.length < counting.length) tally.parts++
          }
        }
      }),
      { numRuns: runs(60) },
    )
    expect(Math.min(...Object.values(tally))).toBeGreaterThan(20)
  })
})

describe.each<Family>(['counter', 'sizes'])('two counts of %s keys', (family) => {
  it('prove it broken only where it is by definition', async () => {
    const tally = { proved: 0, not: 0 }
    await fc.assert(
      fc.asyncProperty(tinyKey(family, 6), async (key) => {
        const judge = await judgeOf(key)
        const n = key.operations.length
        for (const rule of PLAIN_RULES.filter((each) => each.versions === undefined)) {
          const isBroken = !bruteForce(key, rule)
          for (let from = -1; from < n; from++) {
            for (let to = 0; to < n; to++) {
              const isProved = judge.bounds(rule, from, to) === undefined
              tally[isProved ? 'proved' : 'not']++
              if (isProved)
                expect(isBroken, `${JSON.stringify(rule)} ${from} ${to}\n${keyText(key)}`).toBe(true)
            }
          }
        }
      }),
      { numRuns: runs(150) },
    )
    expect(Math.min(...Object.values(tally))).toBeGreaterThan(100)
  })
})

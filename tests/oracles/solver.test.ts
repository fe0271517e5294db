/**
 * The deciders held to a general-purpose solver: the same keys, put to Z3 as "is there a sequence?" (tests/oracles/smt.ts).
 */
import fc from 'fast-check'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { type Family, keyText, tinyKey } from './arbitraries.js'
import { bruteForce, type PlainKey } from './brute-force.js'
import { decide, runs } from './decide.js'
import { lifelikeKey } from './lifelike.js'
import { PLAIN_RULES, programRule } from './rules.js'
import { smtProblem } from './smt.js'
import { Solver } from './z3.js'

const FAMILIES: Family[] = ['register', 'cas', 'ambiguous', 'counter', 'sizes', 'mixed']
let solver: Solver

beforeAll(async () => {
  solver = await Solver.start()
})
afterAll(() => solver.end())

const meansNothing = (key: PlainKey, versions: number | undefined): boolean =>
  versions !== undefined && key.operations.some(({ op }) => op === 'increment')

describe('the problem put to the solver', () => {
  it.each(FAMILIES)(
    'says what the definition says: short %s keys',
    async (family) => {
      await fc.assert(
        fc.asyncProperty(tinyKey(family, 6), fc.nat(PLAIN_RULES.length - 1), async (key, which) => {
          const plain = PLAIN_RULES[which]
          if (meansNothing(key, plain.versions)) return
          expect(
            await solver.isSatisfiable(smtProblem(key, plain)),
            `${JSON.stringify(plain)}\n${keyText(key)}`,
          ).toBe(bruteForce(key, plain))
        }),
        { numRuns: runs(150) },
      )
    },
    runs(120_000),
  )
})

describe('the solver and the deciders', () => {
  it.each(FAMILIES)(
    'agree on %s keys of 10 to 40 operations',
    async (family) => {
      const tally = { holds: 0, broken: 0, undecided: 0 }
      await fc.assert(
        fc.asyncProperty(
          // Two values and absence explain much: more has to be bent before about a third is broken.
          lifelikeKey(family, { least: 10, most: 40, bends: [0, family === 'ambiguous' ? 12 : 3] }),
          fc.oneof(fc.nat(PLAIN_RULES.length - 1), fc.constant(PLAIN_RULES.length - 1)),
          async ({ key }, which) => {
            const plain = PLAIN_RULES[which]
            if (meansNothing(key, plain.versions)) return
            const { verdict } = await decide(key, programRule(plain))
            const satisfiable = await solver.isSatisfiable(smtProblem(key, plain), 20_000)
            // A solver that gives up says nothing; so does a search that does. Few may.
            if (satisfiable === undefined || verdict === 'undecided') {
              tally.undecided++
              return
            }
            tally[satisfiable ? 'holds' : 'broken']++
            expect(verdict, `${JSON.stringify(plain)}\n${keyText(key)}`).toBe(
              satisfiable ? 'holds' : 'broken',
            )
          },
        ),
        { numRuns: runs(60) },
      )
      expect(tally.holds).toBeGreaterThan(5)
      expect(tally.broken).toBeGreaterThan(5)
      expect(tally.undecided).toBeLessThan(0.1 * (tally.holds + tally.broken))
    },
    runs(240_000),
  )
})

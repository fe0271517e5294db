/** Claims that random keys meet too seldom: one line each, true and accepted, or false and refused. */
import { describe, expect, it } from 'vitest'
import { causalOrderTrouble, hasBadPattern } from '../../src/certificates/verify/causal.js'
import { CausalKeys } from '../../src/certificates/verify/causal-keys.js'
import { Recorded } from '../../src/certificates/verify/recorded.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import type { PlainKey, PlainOperation, PlainRule } from '../oracles/brute-force.js'
import { bruteForce } from '../oracles/brute-force.js'
import { judgeOf } from './judging.js'

type Fields = Partial<PlainOperation> & { c?: string }

/** Operations from [start, end, fields]; each of a client of its own unless `c` says whose. */
function keyOf(
  operations: readonly (readonly [number, number, Fields])[],
  rest: Partial<PlainKey> = {},
): PlainKey {
  return {
    operations: operations.map(([start, end, { c, ...fields }], i) => ({
      client: c ?? `client-${i}`,
      key: 'k',
      op: 'read',
      start,
      end,
      ...fields,
    })),
    clockError: 0,
    ...rest,
  }
}

const increment = (fields: Fields = {}): Fields => ({ op: 'increment', ...fields })
const write = (value: unknown, fields: Fields = {}): Fields => ({ op: 'write', value, ...fields })
const read = (value: unknown, fields: Fields = {}): Fields => ({ value, ...fields })
const linearizable: PlainRule = { promise: 'linearizable' }
const writtenValues: PlainRule = { promise: 'written-values' }

describe('two counts that prove a counter broken', () => {
  it.each<[string, PlainKey, PlainRule, number, number]>([
    [
      'more between them than they differ',
      keyOf([
        [0, 1, read(0)],
        [2, 3, increment()],
        [4, 5, read(0)],
      ]),
      linearizable,
      0,
      2,
    ],
    [
      'more since the start',
      keyOf([
        [2, 3, increment()],
        [4, 5, read(0)],
      ]),
      linearizable,
      -1,
      1,
    ],
    [
      'less between them',
      keyOf([
        [0, 1, read(0)],
        [2, 3, increment()],
        [4, 5, read(2)],
      ]),
      linearizable,
      0,
      2,
    ],
    [
      'less since the start',
      keyOf([
        [2, 3, increment()],
        [4, 5, read(2)],
      ]),
      linearizable,
      -1,
      1,
    ],
    [
      'what came before the first of them does not count',
      keyOf([
        [0, 1, increment()],
        [2, 3, read(1)],
        [4, 5, read(2)],
      ]),
      linearizable,
      1,
      2,
    ],
    [
      'what came after the second does not count',
      keyOf([
        [0, 1, read(0)],
        [2, 3, read(1)],
        [4, 5, increment()],
      ]),
      linearizable,
      0,
      1,
    ],
    [
      'an unsure one that began too late does not count',
      keyOf([
        [0, 1, read(0)],
        [2, 3, read(1)],
        [4, 5, increment({ outcome: 'unsure' })],
      ]),
      writtenValues,
      0,
      1,
    ],
    [
      'they run backward, and nothing lies between',
      keyOf([
        [0, 1, read(1)],
        [2, 3, read(0)],
        [0, 9, increment()],
      ]),
      linearizable,
      0,
      1,
    ],
    [
      'at once, the greater needs more than there is',
      keyOf([
        [0, 9, read(0)],
        [0, 9, read(5)],
        [0, 9, increment()],
      ]),
      writtenValues,
      0,
      1,
    ],
    [
      'two increments made it the same number',
      keyOf([
        [0, 9, increment({ value: 1 })],
        [0, 9, increment({ value: 1 })],
      ]),
      writtenValues,
      0,
      1,
    ],
    [
      'an increment returned a count that leaves it out',
      keyOf([[0, 9, increment({ value: 0 })]]),
      writtenValues,
      -1,
      0,
    ],
    [
      'increments that go down leave too little',
      keyOf([
        [0, 9, increment({ by: -1 })],
        [0, 9, read(1)],
      ]),
      writtenValues,
      -1,
      1,
    ],
    [
      'increments that go down do not go so far',
      keyOf([
        [0, 9, increment({ by: -1 })],
        [0, 9, read(-2)],
      ]),
      writtenValues,
      -1,
      1,
    ],
    [
      'one that may go down is taken to',
      keyOf([
        [0, 1, increment({ by: 5 })],
        [0, 9, increment({ by: -1, outcome: 'unsure' })],
        [4, 5, read(3)],
      ]),
      linearizable,
      -1,
      2,
    ],
    [
      'what is no number is no count',
      keyOf([
        [0, 9, increment()],
        [0, 9, read(true)],
      ]),
      writtenValues,
      -1,
      1,
    ],
    [
      'the given start counts',
      keyOf(
        [
          [0, 1, increment()],
          [2, 3, read(3)],
        ],
        { initial: 3 },
      ),
      linearizable,
      -1,
      1,
    ],
  ])('%s', async (_, key, rule, from, to) => {
    expect(bruteForce(key, rule)).toBe(false)
    expect((await judgeOf(key)).bounds(rule, from, to)).toBeUndefined()
  })

  it.each<[string, PlainKey, PlainRule, number, number, RegExp]>([
    [
      'the start is not known',
      keyOf(
        [
          [2, 3, increment()],
          [4, 5, read(0)],
        ],
        { initialUnknown: true },
      ),
      linearizable,
      -1,
      1,
      /start is not known/,
    ],
    [
      'the first of them read nothing',
      keyOf([
        [2, 3, increment()],
        [4, 5, read(0)],
      ]),
      linearizable,
      0,
      1,
      /no count that was read/,
    ],
    [
      'the second of them read nothing',
      keyOf([
        [2, 3, increment()],
        [4, 5, read(0)],
      ]),
      linearizable,
      -1,
      0,
      /no count that was read/,
    ],
    [
      'nothing tells which came first',
      keyOf([
        [0, 9, read(1)],
        [0, 9, read(0)],
        [0, 9, increment()],
      ]),
      linearizable,
      0,
      1,
      /allow both counts/,
    ],
    [
      'two increments by nothing may return the same',
      keyOf([
        [0, 9, increment({ by: 0, value: 0 })],
        [0, 9, increment({ by: 0, value: 0 })],
      ]),
      linearizable,
      0,
      1,
      /allow both counts/,
    ],
    [
      'two increments may return the same where another goes down',
      keyOf([
        [0, 9, increment({ value: 1 })],
        [0, 9, increment({ value: 1 })],
        [0, 9, increment({ by: -1 })],
      ]),
      linearizable,
      0,
      1,
      /allow both counts/,
    ],
    [
      'one count is held against itself',
      keyOf([[0, 9, increment({ value: 1 })]]),
      linearizable,
      0,
      0,
      /allow both counts/,
    ],
  ])('not where %s', async (_, key, rule, from, to, why) => {
    expect((await judgeOf(key)).bounds(rule, from, to)).toMatch(why)
  })
})

describe('orders', () => {
  const unsure = { outcome: 'unsure' } as const
  it.each<[string, PlainKey, PlainRule, number[], RegExp]>([
    [
      'a read of what was written later',
      keyOf([
        [50, 60, write('v')],
        [0, 9, read('v')],
      ]),
      writtenValues,
      [0, 1],
      /operation 1 read what 0 wrote later/,
    ],
    [
      'a cas that found what was written later',
      keyOf([
        [50, 60, write('v')],
        [0, 9, { op: 'cas', expect: 'v', value: 'w' }],
      ]),
      { promise: 'read-your-writes' },
      [0, 1],
      /must come before|read what 0 wrote later/,
    ],
    [
      'a count of an increment that began later',
      keyOf([
        [0, 1, write(5)],
        [50, 60, increment()],
        [10, 20, read(6)],
      ]),
      writtenValues,
      [0, 1, 2],
      /operation 2 read an increment that began later/,
    ],
    [
      'a failed cas that saw an increment that began later',
      keyOf([
        [0, 1, write(5)],
        [50, 60, increment()],
        [10, 20, { op: 'cas', expect: 1, value: 2, applied: false, saw: 6 }],
      ]),
      writtenValues,
      [0, 1, 2],
      /operation 2 read an increment that began later/,
    ],
    [
      'what a failed cas did not find, found at an unknown start',
      keyOf(
        [
          [0, 9, { op: 'cas', expect: 'x', value: 'y', applied: false }],
          [10, 19, read('x')],
        ],
        { initialUnknown: true },
      ),
      writtenValues,
      [0, 1],
      /operation 1 could not/,
    ],
    [
      'two values at an unknown start',
      keyOf(
        [
          [0, 9, read('x')],
          [10, 19, read('z')],
        ],
        { initialUnknown: true },
      ),
      writtenValues,
      [0, 1],
      /operation 1 could not/,
    ],
    [
      'a written value at an unknown start',
      keyOf(
        [
          [0, 9, read('x')],
          [10, 19, write('x')],
        ],
        { initialUnknown: true },
      ),
      writtenValues,
      [0, 1],
      /operation 0 could not/,
    ],
    [
      'a refused value at an unknown start',
      keyOf(
        [
          [0, 9, read('x')],
          [10, 19, write('x', { outcome: 'refused' })],
        ],
        { initialUnknown: true },
      ),
      writtenValues,
      [0],
      /operation 0 could not/,
    ],
    [
      'a refused write',
      keyOf([
        [0, 9, write('x', { outcome: 'refused' })],
        [10, 19, read('x')],
      ]),
      writtenValues,
      [0, 1],
      /operation 0 is none of/,
    ],
    [
      'an unsure cas on what was not there',
      keyOf([
        [0, 9, { op: 'cas', expect: 'x', value: 'y', ...unsure }],
        [10, 19, read('y')],
      ]),
      writtenValues,
      [0, 1],
      /operation 0 could not/,
    ],
    [
      'an increment of what is no number',
      keyOf([
        [0, 1, write('x')],
        [2, 3, increment()],
      ]),
      writtenValues,
      [0, 1],
      /operation 1 could not/,
    ],
    [
      'a read behind on versions by one too many',
      keyOf([
        [0, 1, write(1)],
        [2, 3, write(2)],
        [4, 5, write(3)],
        [6, 7, read(1)],
      ]),
      { promise: 'bounded-staleness', versions: 1 },
      [0, 3, 1, 2],
      /more than 1 versions behind/,
    ],
    [
      'a late read that is stale',
      keyOf([
        [0, 1, write(1)],
        [2, 3, write(2)],
        [9, 10, read(1)],
      ]),
      { promise: 'bounded-staleness', within: 5 },
      [0, 2, 1],
      /operation 1 must come before/,
    ],
    [
      'a closing read that is stale',
      keyOf([
        [0, 1, write(1)],
        [2, 3, write(2)],
        [9, 10, read(1)],
      ]),
      { promise: 'durable', settle: 6 },
      [0, 2, 1],
      /operation 1 must come before/,
    ],
    [
      'instants of one client by their lines',
      keyOf([
        [5, 5, write(1, { c: 'a' })],
        [5, 5, write(2, { c: 'a' })],
      ]),
      writtenValues,
      [1, 0],
      /operation 0 must come before/,
    ],
    [
      'clients of one host',
      keyOf(
        [
          [0, 1, write(1, { host: 'h' })],
          [2, 3, write(2, { host: 'h' })],
        ],
        { clockError: 9 },
      ),
      writtenValues,
      [1, 0],
      /operation 0 must come before/,
    ],
    [
      'clocks that are sure',
      keyOf(
        [
          [0, 1, write(1)],
          [20, 21, write(2)],
        ],
        { clockError: 9 },
      ),
      writtenValues,
      [1, 0],
      /operation 0 must come before/,
    ],
  ])('with %s are refused', async (_, key, rule, order, why) => {
    expect((await judgeOf(key)).order(rule, order)).toMatch(why)
  })

  it.each<[string, PlainKey, PlainRule, number[]]>([
    [
      'as many versions behind as allowed',
      keyOf([
        [0, 1, write(1)],
        [2, 3, write(2)],
        [4, 5, write(3)],
        [6, 7, read(1)],
      ]),
      { promise: 'bounded-staleness', versions: 2 },
      [0, 3, 1, 2],
    ],
    [
      'a read that is no later than allowed',
      keyOf([
        [0, 1, write(1)],
        [2, 3, write(2)],
        [8, 10, read(1)],
      ]),
      { promise: 'bounded-staleness', within: 5 },
      [0, 2, 1],
    ],
    [
      'a read before everything settled',
      keyOf([
        [0, 1, write(1)],
        [2, 3, write(2)],
        [9, 10, read(1)],
      ]),
      { promise: 'durable', settle: 7 },
      [0, 2, 1],
    ],
    [
      'clocks that are just not sure',
      keyOf(
        [
          [0, 1, write(1)],
          [19, 21, write(2)],
        ],
        { clockError: 9 },
      ),
      writtenValues,
      [1, 0],
    ],
    [
      'two clients at one instant',
      keyOf([
        [0, 5, write(1)],
        [5, 9, write(2)],
      ]),
      linearizable,
      [1, 0],
    ],
    [
      'an unsure write that took effect late',
      keyOf([
        [0, 1, write(1, unsure)],
        [5, 6, write(2)],
        [7, 8, read(1)],
      ]),
      linearizable,
      [1, 0, 2],
    ],
    [
      'absence at an unknown start that a delete also wrote',
      keyOf(
        [
          [0, 9, read(null)],
          [10, 19, { op: 'delete' }],
        ],
        { initialUnknown: true },
      ),
      linearizable,
      [0, 1],
    ],
    [
      'absence that counts as nothing',
      keyOf([
        [0, 1, { op: 'delete' }],
        [2, 3, increment()],
        [4, 5, read(1)],
      ]),
      linearizable,
      [0, 1, 2],
    ],
    [
      'a failed cas on something else',
      keyOf([
        [0, 1, write('x')],
        [2, 3, { op: 'cas', expect: 'y', value: 'z', applied: false }],
      ]),
      linearizable,
      [0, 1],
    ],
  ])('with %s are accepted', async (_, key, rule, order) => {
    expect((await judgeOf(key)).order(rule, order)).toBeUndefined()
  })
})

describe('counterexamples', () => {
  it.each<[string, PlainKey, PlainRule, number[]]>([
    [
      'a count of an increment that began later',
      keyOf([
        [0, 1, write(5)],
        [50, 60, increment()],
        [10, 20, read(6)],
      ]),
      writtenValues,
      [0, 1, 2],
    ],
    [
      'a stale read, other writes left out',
      keyOf([
        [0, 1, write('a')],
        [2, 3, write('b')],
        [4, 5, read('a')],
        [0, 9, write('c')],
        [20, 30, write('d')],
      ]),
      linearizable,
      [0, 1, 2],
    ],
    [
      'a stale read, what it saw left out as overwritten',
      keyOf([
        [0, 1, write('a')],
        [2, 3, write('b')],
        [4, 5, read('a')],
      ]),
      linearizable,
      [2],
    ],
    [
      'a read of what was written later, its write left out',
      keyOf([
        [0, 1, read('a')],
        [2, 3, write('a')],
      ]),
      writtenValues,
      [0],
    ],
    [
      'a count, an increment that came later left out',
      keyOf([
        [0, 1, read(1)],
        [2, 3, increment()],
      ]),
      writtenValues,
      [0],
    ],
    [
      'an unwritten count, a write left out that only an increment may have seen',
      keyOf([
        [0, 1, read(9)],
        [5, 6, write(2)],
        [4, 9, increment()],
      ]),
      writtenValues,
      [0, 2],
    ],
    [
      'increments of a register of numbers need no number',
      keyOf([
        [0, 1, write(1)],
        [2, 3, increment()],
        [4, 5, increment()],
        [6, 7, read(9)],
      ]),
      writtenValues,
      [0, 1, 2, 3],
    ],
  ])('of %s are proved', async (_, key, rule, operations) => {
    expect(bruteForce(key, rule)).toBe(false)
    expect((await judgeOf(key)).counterexample(rule, operations)).toBe('proved')
  })

  it.each<[string, PlainKey, PlainRule, number[], RegExp]>([
    [
      'the write that was read',
      keyOf([
        [0, 1, write('a')],
        [4, 5, read('a')],
      ]),
      linearizable,
      [1],
      /operation 0 was left out, and it may be what operation 1 saw/,
    ],
    [
      'an overwritten write that may still be read',
      keyOf([
        [0, 1, write('a')],
        [2, 3, write('b')],
        [4, 5, read('a')],
      ]),
      writtenValues,
      [2],
      /operation 0 was left out/,
    ],
    [
      'a write that was overwritten by an unsure one',
      keyOf([
        [0, 1, write('a')],
        [2, 3, write('b', { outcome: 'unsure' })],
        [4, 5, read('a')],
      ]),
      linearizable,
      [2],
      /operation 0 was left out/,
    ],
    [
      'a write over what a failed cas expected',
      keyOf([
        [0, 1, write('a')],
        [4, 5, { op: 'cas', expect: null, value: 'z', applied: false }],
      ]),
      linearizable,
      [1],
      /operation 0 was left out/,
    ],
    [
      'an increment',
      keyOf([
        [0, 1, increment()],
        [4, 5, read(1)],
      ]),
      linearizable,
      [1],
      /operation 0 was left out/,
    ],
    [
      'the write that an unsure cas needs',
      keyOf([
        [0, 1, write('a')],
        [2, 9, { op: 'cas', expect: 'a', value: 'b', outcome: 'unsure' }],
        [4, 5, read('b')],
      ]),
      linearizable,
      [1, 2],
      /operation 0 was left out, and it may be what operation 1 saw/,
    ],
    [
      'the number that an increment needs',
      keyOf([
        [0, 1, write('x')],
        [2, 3, write(1)],
        [4, 5, increment()],
      ]),
      writtenValues,
      [0, 2],
      /operation 1 was left out, and it may be what operation 2 saw/,
    ],
  ])('that leave out %s are refused', async (_, key, rule, operations, why) => {
    expect((await judgeOf(key)).counterexample(rule, operations)).toEqual({
      trouble: expect.stringMatching(why),
    })
  })

  it('that name an operation twice or a refused one are refused', async () => {
    const judge = await judgeOf(
      keyOf([
        [0, 1, read('a')],
        [2, 3, write('b', { outcome: 'refused' })],
      ]),
    )
    expect(judge.counterexample(linearizable, [0])).toBe('proved')
    expect(judge.counterexample(linearizable, [0, 0])).toEqual({
      trouble: expect.stringMatching(/0 stands .* twice/),
    })
    expect(judge.counterexample(linearizable, [0, 1])).toEqual({
      trouble: expect.stringMatching(/1 is none of/),
    })
  })
})

describe('promises over several keys, where the start is not known', () => {
  async function causalKeys(operations: readonly (readonly [number, number, Fields])[]): Promise<CausalKeys> {
    const { operations: records } = keyOf(operations)
    const lines = [{ history: 1, initialUnknown: true }, ...records].map((line) => JSON.stringify(line))
    const history = await readHistory([textSource('causal', `${lines.join('\n')}\n`)])
    const keys = new CausalKeys(new Recorded(history, 0n))
    expect(
      keys.add(
        0,
        records.map((_, i) => i),
      ),
    ).toBe(true)
    return keys
  }

  it('the one value that nobody wrote is the start', async () => {
    const keys = await causalKeys([
      [0, 1, read('x')],
      [2, 3, write('y')],
      [4, 5, read('x')],
      [6, 7, read('y')],
    ])
    expect(keys.unwritten).toEqual([])
    expect(causalOrderTrouble(keys, [0, 1, 2, 3], true)).toBeUndefined()
  })

  it('a second one is not', async () => {
    const keys = await causalKeys([
      [0, 1, read('x')],
      [2, 3, write('y')],
      [4, 5, read('z')],
    ])
    expect(keys.unwritten).toEqual([2])
    expect(causalOrderTrouble(keys, [0, 1, 2], false)).toMatch(/operation 2 returned what nobody wrote/)
  })

  it('what was refused is not', async () => {
    const keys = await causalKeys([
      [0, 1, read('x')],
      [2, 3, write('x', { outcome: 'refused' })],
      [4, 5, read('z')],
    ])
    expect(keys.unwritten).toEqual([0])
  })

  it('it is overwritten like any other version', async () => {
    const keys = await causalKeys([
      [0, 1, read('x')],
      [2, 3, write('y', { c: 'a' })],
      [4, 5, read('x', { c: 'a' })],
    ])
    expect(causalOrderTrouble(keys, [0, 1, 2], false)).toMatch(/operation 2 returned the initial value/)
    expect(hasBadPattern(keys, [1, 2], false)).toBe(true)
  })
})

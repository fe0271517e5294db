/**
 * What may stand on each line of a certificate: one true certificate, and everything that could be wrong with it, each
 * refused with its place.
 */
import { describe, expect, it } from 'vitest'
import type { Refusal, Verification } from '../../src/certificates/verify/verify.js'
import { certify, verify } from './certifying.js'

/** berth/1 is sound, berth/2 has a stale read, the count misses an increment. */
const HISTORY = [
  '{"client":"gate-1","op":"write","key":"berth/1","value":"v1","start":0,"end":10}',
  '{"client":"gate-1","op":"write","key":"berth/1","value":"v2","start":20,"end":30}',
  '{"client":"gate-2","op":"read","key":"berth/1","value":"v2","start":40,"end":50}',
  '{"client":"gate-3","op":"write","key":"berth/1","value":"v3","start":40,"end":50,"outcome":"unsure"}',
  '{"client":"gate-1","op":"write","key":"berth/2","value":"w1","start":100,"end":110}',
  '{"client":"gate-1","op":"write","key":"berth/2","value":"w2","start":120,"end":130}',
  '{"client":"gate-2","op":"read","key":"berth/2","value":"w1","start":140,"end":150}',
  '{"client":"gate-1","op":"increment","key":"boarded","start":200,"end":210}',
  '{"client":"gate-2","op":"read","key":"boarded","value":0,"start":220,"end":230}',
  '{"client":"gate-1","op":"write","key":"gate/1","value":"open","start":300,"end":310}',
  '{"client":"gate-1","op":"write","key":"gate/1","value":"open","start":320,"end":330}',
  '{"client":"gate-2","op":"read","key":"gate/1","value":"open","start":340,"end":350}',
].join('\n')

const PROMISES = ['linearizable', 'no-lost-updates', 'bounded-staleness versions=1', 'causal']

type Line = Record<string, unknown>

/** The certificate, changed line by line: a function answers what stands there instead, undefined for nothing. */
async function judged(
  change: (line: Line, at: number) => unknown | undefined = (line) => line,
  after: readonly string[] = [],
): Promise<Verification> {
  const { lines } = await certify(HISTORY, PROMISES)
  const changed = lines.flatMap((line, at) => {
    const now = change(JSON.parse(line), at)
    return now === undefined ? [] : [typeof now === 'string' ? now : JSON.stringify(now)]
  })
  return verify([...changed, ...after], HISTORY)
}

/** Changes the one line about this key (undefined: over all keys) and promise. */
const ofClaim =
  (key: string | undefined, promise: string, how: (claim: Line) => unknown | undefined) =>
  (line: Line): unknown =>
    line.key === key && (line.promises as string[] | undefined)?.includes(promise) ? how(line) : line

const ofHeader =
  (how: (header: Line) => unknown) =>
  (line: Line, at: number): unknown =>
    at === 0 ? how(line) : line

const told = ({ refusals }: Verification): string =>
  refusals.map(({ line, key, promise, why }: Refusal) => [line, key, promise, why].join('|')).join('\n')

describe('a certificate', () => {
  it('that is true is accepted, each claim counted as what it is', async () => {
    const verification = await judged()
    expect(verification).toMatchObject({
      refusals: [],
      proved: { holds: 7 + 2, broken: 2 },
      unproved: 0,
      undecided: 0,
      leftOut: 2,
    })
  })

  it.each<[string, (line: Line, at: number) => unknown, RegExp]>([
    ['no JSON at all', (line, at) => (at === 2 ? '{"claim":' : line), /^3\|\|\|is not JSON$/m],
    [
      'JSON nested without end',
      (line, at) => (at === 2 ? '['.repeat(200_000) : line),
      /^3\|\|\|is not JSON$/m,
    ],
    ['a list', (line, at) => (at === 2 ? '[]' : line), /^3\|\|\|is no claim/m],
    ['null', (line, at) => (at === 2 ? 'null' : line), /^3\|\|\|is no claim/m],
    [
      'an unknown claim',
      (line, at) => (at === 2 ? { ...line, claim: 'proved' } : line),
      /^3\|\|\|is no claim/m,
    ],
    [
      'a field too many',
      (line, at) => (at === 2 ? { ...line, trust: true } : line),
      /^3\|\|\|is no claim.*trust/m,
    ],
    [
      'no header',
      (line, at) => (at === 0 ? undefined : line),
      /^1\|\|\|is no header[\s\S]*the certificate has no header/,
    ],
    ['another format', ofHeader((header) => ({ ...header, certificate: 2 })), /^1\|\|\|is no header/],
    [
      'an input too many',
      ofHeader((header) => ({ ...header, inputs: [header.inputs, header.inputs].flat() })),
      /^1\|\|\|speaks of 2 inputs, and 1 were given/,
    ],
    [
      'other input',
      ofHeader((header) => ({ ...header, inputs: [{ file: 'history', sha256: 'a'.repeat(64) }] })),
      /^1\|\|\|speaks of other input: history/,
    ],
    [
      'operations too many',
      ofHeader((header) => ({ ...header, operations: 13 })),
      /^1\|\|\|speaks of 13 operations, and the inputs hold 12/,
    ],
    [
      'a promise twice',
      ofHeader((header) => ({
        ...header,
        promises: [header.promises, (header.promises as unknown[])[0]].flat(),
      })),
      /^1\|\|\|names a promise twice/,
    ],
    [
      'a promise more than is claimed',
      ofHeader((header) => ({
        ...header,
        promises: [header.promises, { name: 'r', promise: 'regular', keys: 'berth/*' }].flat(),
      })),
      /^\|berth\/1\|r\|nothing is claimed about it\n\|berth\/2\|r\|nothing is claimed about it$/,
    ],
    [
      'a promise over all keys more than is claimed',
      ofHeader((header) => ({
        ...header,
        promises: [header.promises, { name: 'c', promise: 'causal-convergence', keys: '**' }].flat(),
      })),
      /^\|\|c\|nothing is claimed about it$/,
    ],
    [
      'fewer keys',
      ofHeader((header) => ({ ...header, onlyKeys: ['berth/*', 'gate'] })),
      /\|boarded\|linearizable\|is about a key that the promise is not claimed for/,
    ],
    [
      'a promise of fewer keys',
      ofHeader((header) => ({
        ...header,
        promises: (header.promises as Line[]).map((promise) => ({ ...promise, keys: 'berth/*' })),
      })),
      /\|boarded\|linearizable\|is about a key that the promise is not claimed for/,
    ],
    [
      'a clock error under which nothing is stale',
      ofHeader((header) => ({ ...header, clockErrorNs: '1000' })),
      /\|berth\/2\|linearizable\|its operations can be put in an order/,
    ],
    [
      'a claim gone, the count mended',
      (line) =>
        line.key === 'berth/2' && (line.promises as string[]).includes('linearizable')
          ? undefined
          : 'end' in line
            ? { ...line, claims: (line.claims as number) - 1 }
            : line,
      /^\|berth\/2\|linearizable\|nothing is claimed about it$/,
    ],
    [
      'a claim gone, the count not',
      (line, at) => (at === 2 ? undefined : line),
      /says that there are \d+ claims, and there are \d+/,
    ],
    [
      'no last line',
      (line) => ('end' in line ? undefined : line),
      /^\|\|\|the certificate has no last line: it was cut short$/,
    ],
    [
      'another key',
      ofClaim('berth/2', 'linearizable', (claim) => ({ ...claim, key: 'berth/3' })),
      /\|berth\/3\|linearizable\|is about a key that the promise is not claimed for\n.*berth\/2\|linearizable\|nothing/,
    ],
    [
      'another promise',
      ofClaim('berth/2', 'linearizable', (claim) => ({ ...claim, promises: ['regular'] })),
      /\|berth\/2\|regular\|is about a promise that the header does not name/,
    ],
    [
      'a promise claimed twice',
      ofClaim('berth/2', 'linearizable', (claim) => ({
        ...claim,
        promises: ['linearizable', 'linearizable'],
      })),
      /\|berth\/2\|linearizable\|is about what an earlier line spoke of$/,
    ],
    [
      'no key',
      ofClaim('berth/2', 'linearizable', ({ key, ...claim }) => claim),
      /\|\|linearizable\|names no key/,
    ],
    [
      'a key where all are meant',
      ofClaim(undefined, 'causal', (claim) => ({ ...claim, key: 'berth/1' })),
      /\|berth\/1\|causal\|names a key, and the promise is one over all keys/,
    ],
    [
      'a key left out that is none to leave out',
      ofClaim('berth/1', 'linearizable', ({ order, ...claim }) => ({ ...claim, claim: 'left-out' })),
      /\|berth\/1\|linearizable\|leaves out a key on which the promise means something/,
    ],
    [
      'a key decided that is to be left out',
      ofClaim('boarded', 'no-lost-updates', (claim) => ({ ...claim, claim: 'holds' })),
      /\|boarded\|no-lost-updates\|decides a key on which the promise means nothing/,
    ],
    [
      'a bound on versions of a counter',
      ofClaim('boarded', 'bounded-staleness versions=1', (claim) => ({ ...claim, claim: 'undecided' })),
      /\|boarded\|bounded-staleness versions=1\|decides a key on which the promise means nothing/,
    ],
    [
      'an update lost that is not',
      ofClaim('berth/1', 'no-lost-updates', (claim) => ({ ...claim, claim: 'broken' })),
      /\|berth\/1\|no-lost-updates\|is false: no update was lost/,
    ],
    [
      'a verdict turned round',
      ofClaim('berth/2', 'linearizable', ({ counterexample, ...claim }) => ({
        ...claim,
        claim: 'holds',
        order: [4, 6, 5],
      })),
      /\|berth\/2\|linearizable\|operation 5 must come before one that stands before it/,
    ],
    [
      'a verdict turned round the other way',
      ofClaim('berth/1', 'linearizable', ({ order, ...claim }) => ({
        ...claim,
        claim: 'broken',
        counterexample: order,
      })),
      /\|berth\/1\|linearizable\|its operations can be put in an order/,
    ],
    [
      'no order',
      ofClaim('berth/1', 'linearizable', ({ order, ...claim }) => claim),
      /\|berth\/1\|linearizable\|has no order/,
    ],
    [
      'no counterexample',
      ofClaim('berth/2', 'linearizable', ({ counterexample, ...claim }) => claim),
      /\|berth\/2\|linearizable\|has no counterexample/,
    ],
    [
      'no order over all keys',
      ofClaim(undefined, 'causal', ({ order, ...claim }) => claim),
      /\|\|causal\|has no order/,
    ],
    [
      'no counterexample over all keys',
      ofClaim(undefined, 'causal', ({ order, ...claim }) => ({ ...claim, claim: 'broken' })),
      /\|\|causal\|has no counterexample/,
    ],
    [
      'a counterexample that shows no pattern',
      ofClaim(undefined, 'causal', ({ order, ...claim }) => ({
        ...claim,
        claim: 'broken',
        counterexample: order,
      })),
      /\|\|causal\|its operations show none of the patterns/,
    ],
    [
      'all keys left out',
      ofClaim(undefined, 'causal', () => ({ claim: 'left-out', key: '**', promises: ['causal'] })),
      /\|\*\*\|causal\|names a key/,
    ],
    [
      'a key left out in silence',
      ofClaim(undefined, 'causal', ({ leftOut, ...claim }) => claim),
      /\|\|causal\|is wrong about whether key "boarded" is left out/,
    ],
    [
      'a key in on which a read could have seen two writes',
      ofClaim(undefined, 'causal', (claim) => ({ ...claim, leftOut: ['boarded'] })),
      /\|\|causal\|is wrong about whether key "gate\/1" is left out/,
    ],
    [
      'a clock error of too many digits',
      ofHeader((header) => ({ ...header, clockErrorNs: '9'.repeat(100_000) })),
      /^1\|\|\|is no header: .*clockErrorNs/,
    ],
    [
      'a key left out too many',
      ofClaim(undefined, 'causal', (claim) => ({ ...claim, leftOut: ['boarded', 'gate/1', 'berth/1'] })),
      /\|\|causal\|is wrong about whether key "berth\/1" is left out/,
    ],
    [
      'an operation of another key',
      ofClaim('berth/1', 'linearizable', (claim) => ({ ...claim, order: [0, 1, 2, 4] })),
      /\|berth\/1\|linearizable\|operation 4 is none of the key's/,
    ],
    [
      'an operation that does not exist',
      ofClaim('berth/1', 'linearizable', (claim) => ({ ...claim, order: [0, 1, 2, 99] })),
      /\|berth\/1\|linearizable\|operation 99 is none of the key's/,
    ],
    [
      'an operation twice',
      ofClaim('berth/1', 'linearizable', (claim) => ({ ...claim, order: [0, 1, 2, 2] })),
      /\|berth\/1\|linearizable\|operation 2 stands in the order twice/,
    ],
    [
      'an acked operation missing',
      ofClaim('berth/1', 'linearizable', (claim) => ({ ...claim, order: [0, 1] })),
      /\|berth\/1\|linearizable\|acked operation 2 is missing in the order/,
    ],
    [
      'an answer that no copy gives',
      ofClaim('berth/1', 'linearizable', (claim) => ({ ...claim, order: [0, 1, 3, 2] })),
      /\|berth\/1\|linearizable\|operation 2 could not have been answered so/,
    ],
    [
      'operations that leave out what a read saw',
      ofClaim('berth/1', 'linearizable', ({ order, ...claim }) => ({
        ...claim,
        claim: 'broken',
        counterexample: [2],
      })),
      /\|berth\/1\|linearizable\|operation 1 was left out, and it may be what operation 2 saw/,
    ],
    [
      'no operation',
      ofClaim('berth/2', 'linearizable', (claim) => ({ ...claim, counterexample: [] })),
      /\|berth\/2\|linearizable\|its operations can be put in an order/,
    ],
    [
      'counts that are none',
      ofClaim('boarded', 'linearizable', ({ counterexample, ...claim }) => ({
        ...claim,
        bounds: { from: 6, to: 8 },
      })),
      /\|boarded\|linearizable\|one of them is no count that was read/,
    ],
    [
      'counts of a key that is no counter',
      ofClaim('berth/2', 'linearizable', ({ counterexample, ...claim }) => ({ ...claim, bounds: { to: 6 } })),
      /\|berth\/2\|linearizable\|the key is no counter/,
    ],
  ])('with %s is refused', async (_, change, where) => {
    const verification = await judged(change)
    expect(told(verification)).toMatch(where)
  })

  it('that goes on after its last line is refused', async () => {
    const { lines } = await certify(HISTORY, PROMISES)
    expect(told(await judged(undefined, [lines[1]]))).toMatch(/^\d+\|\|\|stands behind the last line$/)
    expect(told(await judged(undefined, ['']))).toMatch(/^\d+\|\|\|is not JSON$/)
  })

  it('of another history is refused by what it says, whatever its digest', async () => {
    const { lines } = await certify(HISTORY, PROMISES)
    const fresh = HISTORY.replace('"value":"w1","start":140', '"value":"w2","start":140')
    const header = JSON.parse((await certify(fresh, PROMISES)).lines[0])
    expect(told(await verify([JSON.stringify(header), ...lines.slice(1)], fresh))).toMatch(
      /\|berth\/2\|linearizable\|/,
    )
  })

  it('that leaves things undecided is accepted, and says how many', async () => {
    const verification = await judged((line) => {
      const { order, counterexample, bounds, leftOut, ...claim } = line
      if (line.claim === 'holds' || line.claim === 'broken') return { ...claim, claim: 'undecided' }
      return line
    })
    expect(verification).toMatchObject({
      refusals: [],
      proved: { holds: 0, broken: 0 },
      unproved: 0,
      undecided: 11,
      leftOut: 2,
    })
  })
})

describe('a counterexample too large to try every order of', () => {
  const operation = (fields: object): string => JSON.stringify({ key: 'berth/1', ...fields })
  const text = Array.from({ length: 20 }, (_, i) =>
    operation({ client: 'gate-1', op: 'write', value: i, start: 10 * i, end: 10 * i + 5 }),
  )
    .concat(operation({ client: 'gate-2', op: 'read', value: 3, start: 900, end: 905 }))
    .join('\n')
  const claim = (operations: readonly number[]): string =>
    JSON.stringify({
      claim: 'broken',
      key: 'berth/1',
      promises: ['linearizable'],
      counterexample: operations,
    })

  it('is not among what was proved', async () => {
    const { lines } = await certify(text, ['linearizable'])
    const all = Array.from({ length: 21 }, (_, i) => i)
    expect(await verify([lines[0], claim(all), lines[2]], text)).toMatchObject({
      refusals: [],
      proved: { holds: 0, broken: 0 },
      unproved: 1,
    })
    // One that is small enough is tried.
    expect(await verify([lines[0], claim(all.slice(3)), lines[2]], text)).toMatchObject({
      refusals: [],
      proved: { holds: 0, broken: 1 },
      unproved: 0,
    })
  })
})

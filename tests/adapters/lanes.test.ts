import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { Lanes } from '../../src/adapters/lanes.js'

interface Request {
  readonly start: number
  /** undefined: never came back */
  readonly end: number | undefined
}

const request = fc.record({
  start: fc.integer({ min: 0, max: 40 }),
  took: fc.oneof({ weight: 9, arbitrary: fc.integer({ min: 0, max: 6 }) }, fc.constant(undefined)),
})
const requests = fc
  .array(request, { maxLength: 30 })
  .map((all) => all.map(({ start, took }) => ({ start, end: took === undefined ? undefined : start + took })))

function split(all: readonly Request[]): string[] {
  const lanes = new Lanes()
  return all.map(({ start, end }) =>
    lanes.assign('pool', 'host', BigInt(start), end === undefined ? undefined : BigInt(end)),
  )
}

/** Touching counts as overlapping. */
function overlap(a: Request, b: Request): boolean {
  return a.start <= (b.end ?? Infinity) && b.start <= (a.end ?? Infinity)
}

/** The most requests that were in flight, or touched, at one time. */
function depth(all: readonly Request[]): number {
  const at = (time: number): number =>
    all.filter(({ start, end }) => start <= time && time <= (end ?? Infinity)).length
  return Math.max(0, ...all.map(({ start }) => at(start)))
}

describe('splitting a client into lanes', () => {
  it('never puts two requests that overlap or touch into one lane, in whatever order they come', () => {
    fc.assert(
      fc.property(requests, (all) => {
        const names = split(all)
        for (let i = 0; i < all.length; i++)
          for (let j = 0; j < i; j++) if (names[i] === names[j]) expect(overlap(all[i], all[j])).toBe(false)
      }),
    )
  })

  it.each([
    ['starts', (a: Request, b: Request) => a.start - b.start],
    ['ends, backward', (a: Request, b: Request) => (b.end ?? 99) - (a.end ?? 99)],
  ])('needs no more lanes than requests were in flight at once, in the order of %s', (_, order) => {
    fc.assert(
      fc.property(requests, (all) => {
        const names = split(all.toSorted(order))
        expect(new Set(names).size).toBe(depth(all))
      }),
    )
  })

  it('lets nothing follow a request that never came back', () => {
    expect(
      split([
        { start: 1, end: undefined },
        { start: 5, end: 6 },
      ]),
    ).toEqual(['pool#1', 'pool#2'])
  })

  it('keeps a lane on one host, and names of lanes apart', () => {
    const lanes = new Lanes()
    expect(lanes.assign('pool', 'a', 1n, 2n)).toBe('pool#1')
    expect(lanes.assign('pool', 'b', 5n, 6n)).toBe('pool#2')
    expect(lanes.assign('pool', 'a', 5n, 6n)).toBe('pool#1')
    expect(lanes.assign('other', 'a', 5n, 6n)).toBe('other#1')
    expect(lanes.most).toBe(2)
  })
})

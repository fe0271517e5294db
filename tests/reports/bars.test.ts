import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { drawBars, type Span } from '../../src/reports/bars.js'

function span(startNs: bigint, endNs: bigint | undefined, unsure = false): Span {
  return { startNs, endNs, unsure }
}

describe('bars drawn to scale', () => {
  it('one operation without length is half a cell', () => {
    expect(drawBars([span(5n, 5n)], 4)).toEqual(['▌   '])
  })

  it('lie where the operations lie, on one scale', () => {
    expect(drawBars([span(0n, 50n), span(50n, 100n), span(25n, 75n)], 4)).toEqual(['██  ', '  ██', ' ██ '])
  })

  it('what is no whole cell is drawn by halves, rounded outwards', () => {
    expect(drawBars([span(0n, 8n), span(3n, 5n)], 4)).toEqual(['████', ' ▐▌ '])
    expect(drawBars([span(0n, 80n), span(35n, 45n)], 4)[1]).toBe(' ▐▌ ')
  })

  it('an unsure operation is shaded on: it may take effect late', () => {
    expect(drawBars([span(0n, 10n, true), span(0n, 40n)], 4)).toEqual(['█░░░', '████'])
    expect(drawBars([span(0n, undefined, true), span(0n, 40n)], 4)).toEqual(['▌░░░', '████'])
  })

  it('the last instant still shows', () => {
    expect(drawBars([span(0n, 10n), span(10n, 10n)], 4)).toEqual(['████', '   ▐'])
  })

  it('are as wide as asked and never empty, wherever in 64 bits the times lie', () => {
    const time = fc.bigInt(-(2n ** 63n), 2n ** 63n - 1n)
    const any = fc.record({
      startNs: time,
      length: fc.option(fc.bigInt(0n, 2n ** 62n)),
      unsure: fc.boolean(),
    })
    fc.assert(
      fc.property(
        fc.array(any, { minLength: 1, maxLength: 5 }),
        fc.integer({ min: 1, max: 64 }),
        (drawn, width) => {
          const spans = drawn.map(({ startNs, length, unsure }) =>
            span(startNs, length === null ? undefined : startNs + length, unsure),
          )
          for (const row of drawBars(spans, width)) {
            expect([...row]).toHaveLength(width)
            expect(row).toMatch(/[█▌▐]/)
          }
        },
      ),
    )
  })
})

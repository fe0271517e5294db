/**
 * Operations as bars drawn to one scale, a row of `width` cells each.
 */
export interface Span {
  readonly startNs: bigint
  /** undefined: the request never came back */
  readonly endNs: bigint | undefined
  /** it may take effect after its end, or never */
  readonly unsure: boolean
}

/**
 * Solid from start to end, rounded outwards to half cells, at least half a cell; shaded on to the right edge where
 * an unsure operation may still take effect.
 */
export function drawBars(spans: readonly Span[], width: number): string[] {
  const from = spans.reduce((a, { startNs }) => (startNs < a ? startNs : a), spans[0].startNs)
  const to = spans.reduce((a, { startNs, endNs }) => max(a, endNs ?? startNs), from)
  const length = max(to - from, 1n)
  const halves = BigInt(width * 2)
  return spans.map(({ startNs, endNs, unsure }) => {
    const first = Number(min(((startNs - from) * halves) / length, halves - 1n))
    const last = endNs === undefined ? first : Number(((endNs - from) * halves + length - 1n) / length)
    const end = Math.max(last, first + 1)
    let row = ''
    for (let cell = 0; cell < width; cell++) {
      const left = 2 * cell >= first && 2 * cell < end
      const right = 2 * cell + 1 >= first && 2 * cell + 1 < end
      row += left ? (right ? '█' : '▌') : right ? '▐' : unsure && 2 * cell >= end ? '░' : ' '
    }
    return row
  })
}

function max(a: bigint, b: bigint): bigint {
  return a > b ? a : b
}

function min(a: bigint, b: bigint): bigint {
  return a < b ? a : b
}

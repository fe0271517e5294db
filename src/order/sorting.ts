/**
 * Positions sorted by a number, ties by position. Times come nearly sorted from recordings, so insertion goes first,
 * within a bound on its work; past it a sort that takes n log n whatever comes.
 */
export function sortedPositions(values: Float64Array): Int32Array {
  const n = values.length
  const order = new Int32Array(n)
  let work = 8 * n + 64
  for (let p = 0; p < n; p++) {
    const value = values[p]
    let q = p - 1
    while (q >= 0 && values[order[q]] > value) {
      order[q + 1] = order[q]
      q--
      work--
    }
    order[q + 1] = p
    if (work < 0) {
      for (let rest = p + 1; rest < n; rest++) order[rest] = rest
      // Infinity - Infinity is NaN, so numbers are compared, not subtracted.
      return order.sort((a, b) => (values[a] < values[b] ? -1 : values[a] > values[b] ? 1 : a - b))
    }
  }
  return order
}

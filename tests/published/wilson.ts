/**
 * Wilson score intervals (Wilson 1927) to compare a share's interval with. Limits recomputed from the formula; the
 * published ones from memory, in the four digits that they are printed with.
 */
export interface WilsonCase {
  readonly successes: number
  readonly trials: number
  /** two-sided, as a share of 1 */
  readonly level: 0.9 | 0.95
  readonly lower: number
  readonly upper: number
  /** limits as printed, and where */
  readonly published?: { readonly lower: number; readonly upper: number; readonly source: string }
}

/** Standard normal quantiles for the levels. */
export const Z = { 0.9: 1.6448536269514722, 0.95: 1.959963984540054 } as const

const NEWCOMBE = 'Newcombe 1998, Statistics in Medicine 17, Table I (from memory)'
const case95 = (successes: number, trials: number, lower: number, upper: number): WilsonCase => ({
  successes,
  trials,
  level: 0.95,
  lower,
  upper,
})

export const WILSON: readonly WilsonCase[] = [
  {
    ...case95(81, 263, 0.255289, 0.36621),
    published: { lower: 0.2553, upper: 0.3662, source: NEWCOMBE },
  },
  {
    ...case95(15, 148, 0.062386, 0.160487),
    published: { lower: 0.0624, upper: 0.1605, source: NEWCOMBE },
  },
  { ...case95(0, 20, 0, 0.161125), published: { lower: 0, upper: 0.1611, source: NEWCOMBE } },
  { ...case95(1, 29, 0.006113, 0.171755), published: { lower: 0.0061, upper: 0.1718, source: NEWCOMBE } },
  case95(0, 10, 0, 0.277533),
  case95(1, 10, 0.017876, 0.40415),
  case95(5, 10, 0.236593, 0.763407),
  case95(10, 10, 0.722467, 1),
  case95(10, 100, 0.055229, 0.174366),
  case95(0, 100, 0, 0.036993),
  case95(3, 1000, 0.001021, 0.008783),
  // The same data as in NIST/SEMATECH e-Handbook §7.2.4.1, which gives the exact (Clopper-Pearson) interval instead.
  { successes: 4, trials: 20, level: 0.9, lower: 0.093118, upper: 0.378377 },
]

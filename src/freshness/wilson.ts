/** The 95% interval of a share by Wilson's score (Wilson 1927). */

/** Two-sided 95%: the standard normal quantile. */
const Z = 1.959963984540054

export interface Interval {
  readonly low: number
  readonly high: number
}

/** The interval of `successes` out of `trials`, both whole numbers; [0, 1] for no trials. */
export function wilson(successes: number, trials: number): Interval {
  if (trials === 0) return { low: 0, high: 1 }
  const share = successes / trials
  const spread = Z * Z
  const centre = share + spread / (2 * trials)
  const half = Z * Math.sqrt((share * (1 - share)) / trials + spread / (4 * trials * trials))
  const scale = 1 + spread / trials
  // At the ends the formula gives 0 and 1 but for rounding.
  return {
    low: successes === 0 ? 0 : (centre - half) / scale,
    high: successes === trials ? 1 : (centre + half) / scale,
  }
}

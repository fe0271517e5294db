/**
 * Times told relative to the first of them, in one unit, with as many decimals as it takes to tell them apart.
 */
const UNITS = [
  { name: 's', decimals: 9, ns: 1_000_000_000n },
  { name: 'ms', decimals: 6, ns: 1_000_000n },
  { name: 'us', decimals: 3, ns: 1_000n },
  { name: 'ns', decimals: 0, ns: 1n },
] as const

/** "+0", "+11.2 ms": one text a time; times in nanoseconds, the first of them the smallest. */
export function relativeTimes(times: readonly bigint[]): string[] {
  const first = times.reduce((a, b) => (b < a ? b : a), times[0] ?? 0n)
  const offsets = times.map((time) => time - first)
  const span = offsets.reduce((a, b) => (b > a ? b : a), 0n)
  const unit = UNITS.find(({ ns }) => span >= ns) ?? UNITS[3]
  const distinct = new Set(offsets).size
  for (let decimals = unit.decimals === 0 ? 0 : 1; ; decimals++) {
    const texts = offsets.map((offset) => fixed(offset, unit.decimals, decimals))
    if (decimals === unit.decimals || new Set(texts).size === distinct) {
      return texts.map((text) => `+${text} ${unit.name}`)
    }
  }
}

/** ns / 10^scale with so many decimals, rounded half up. */
function fixed(ns: bigint, scale: number, decimals: number): string {
  const drop = 10n ** BigInt(scale - decimals)
  const rounded = ((ns + drop / 2n) / drop).toString().padStart(decimals + 1, '0')
  const point = rounded.length - decimals
  return decimals === 0 ? rounded : `${rounded.slice(0, point)}.${rounded.slice(point)}`
}

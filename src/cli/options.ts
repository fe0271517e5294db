/**
 * Options as they are typed, checked one by one.
 */
import { InvalidArgumentError } from 'commander'
import { parseDuration } from '../promises/duration.js'
import { didYouMean } from '../promises/nearest.js'

/** For options that may be given several times. */
export function collect(value: string, others: string[] | undefined): string[] {
  return [...(others ?? []), value]
}

export function durationOption(value: string): bigint {
  const ns = parseDuration(value)
  if (ns === undefined) throw new InvalidArgumentError('Expected a duration such as 2ms, 150us or 1.5s.')
  return ns
}

/** A time, in nanoseconds, or a number of steps. */
export type BudgetOption = { readonly ns: bigint } | { readonly steps: number }

export function budgetOption(value: string): BudgetOption {
  const steps = /^([0-9]{1,15}) ?steps?$/.exec(value.trim())
  if (steps) return { steps: Number(steps[1]) }
  const ns = parseDuration(value)
  if (ns === undefined)
    throw new InvalidArgumentError('Expected a duration such as 10s, or steps such as 1000000steps.')
  return { ns }
}

export function countOption(value: string): number {
  if (!/^[0-9]{1,9}$/.test(value)) throw new InvalidArgumentError('Expected a whole number of 0 or more.')
  return Number(value)
}

export function oneOf<T extends string>(...names: readonly T[]): (value: string) => T {
  return (value) => {
    const found = names.find((name) => name === value)
    if (found) return found
    throw new InvalidArgumentError(`Expected ${names.join(' or ')}${didYouMean(value, names)}`)
  }
}

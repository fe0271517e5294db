/**
 * Promises as they are typed: a name and its parameters, `bounded-staleness within=2s versions=3`.
 */
import { parseDuration } from './duration.js'
import { didYouMean } from './nearest.js'
import type { SingleKeyPromiseName } from './promise.js'
import { SINGLE_KEY_PROMISES } from './promise.js'
import { CAUSAL_PROMISES, type CausalName, type PromiseRequest } from './request.js'
import { type ParameterName, type Parameters, SINGLE_KEY } from './table.js'

/** What is wrong with a promise that somebody asked for, in one sentence. */
export class PromiseTrouble extends Error {}

/** The request of a promise as typed, on all keys, named as typed. Throws PromiseTrouble. */
export function parsePromise(typed: string): PromiseRequest {
  const [name, ...words] = typed.trim().split(/\s+/)
  const given: Record<string, string> = {}
  for (const word of words) {
    const at = word.indexOf('=')
    if (at < 1)
      throw new PromiseTrouble(`found ${JSON.stringify(word)} after the promise, expected parameter=value`)
    const parameter = word.slice(0, at)
    if (parameter in given) throw new PromiseTrouble(`the parameter ${parameter} is given twice`)
    given[parameter] = word.slice(at + 1)
  }
  return buildRequest(typed.trim(), name, given, '**')
}

/** A request from its parts; parameters as text. Throws PromiseTrouble. */
export function buildRequest(
  name: string,
  promise: string,
  given: Readonly<Record<string, string>>,
  keys: string,
): PromiseRequest {
  if ((CAUSAL_PROMISES as readonly string[]).includes(promise)) {
    const [parameter] = Object.keys(given)
    if (parameter === undefined) return { name, causal: promise as CausalName, parameters: {}, keys }
    throw new PromiseTrouble(`${promise} has no parameter ${JSON.stringify(parameter)}; it takes none`)
  }
  if (!isSingleKey(promise)) {
    const names = [...SINGLE_KEY_PROMISES, ...CAUSAL_PROMISES]
    throw new PromiseTrouble(
      `there is no promise ${JSON.stringify(promise)}${didYouMean(promise, names)} (${names.join(', ')})`,
    )
  }
  const entry = SINGLE_KEY[promise]
  const parameters: { -readonly [P in keyof Parameters]: Parameters[P] } = {}
  for (const [parameter, value] of Object.entries(given)) {
    if (!(entry.parameters as readonly string[]).includes(parameter)) {
      const takes =
        entry.parameters.length > 0 ? `it takes ${entry.parameters.join(' and ')}` : 'it takes none'
      throw new PromiseTrouble(`${promise} has no parameter ${JSON.stringify(parameter)}; ${takes}`)
    }
    setParameter(parameters, parameter as ParameterName, value)
  }
  if (entry.needsOne && Object.keys(given).length === 0) {
    throw new PromiseTrouble(
      `${promise} needs ${entry.parameters.join(' or ')}: "${promise} ${entry.parameters[0]}=2s"`,
    )
  }
  return { name, rule: entry.rule(parameters), parameters: { ...given }, keys }
}

function setParameter(
  parameters: { -readonly [P in keyof Parameters]: Parameters[P] },
  parameter: ParameterName,
  value: string,
): void {
  if (parameter === 'versions') {
    if (!/^[0-9]{1,9}$/.test(value)) {
      throw new PromiseTrouble(`found versions=${value}, expected a whole number of 0 or more`)
    }
    parameters.versions = Number(value)
    return
  }
  const ns = parseDuration(value)
  if (ns === undefined)
    throw new PromiseTrouble(`found ${parameter}=${value}, expected a duration such as 2s or 150ms`)
  parameters[parameter] = ns
}

function isSingleKey(name: string): name is SingleKeyPromiseName {
  return (SINGLE_KEY_PROMISES as readonly string[]).includes(name)
}

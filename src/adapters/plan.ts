/**
 * A mapping made ready: every source, condition and time that it names, and what it leaves to the format's
 * conventions.
 */
import { InputError, type InputProblem, PROBLEM_LIMIT } from '../history/problems.js'
import { FIELDS } from '../history/record-scanner.js'
import { parseDuration } from '../promises/duration.js'
import { type Condition, compileCondition } from './conditions.js'
import { jsonText } from './json-node.js'
import type { Mapping } from './mapping-file.js'
import type { SourceSpec } from './mapping-schema.js'
import { otlpDefaults } from './otlp-conventions.js'
import { type Compilation, compileSource, exactAt, type FieldUse, type Source } from './sources.js'
import { compileTime, type Time } from './time-source.js'

export type Outcome = 'acked' | 'refused' | 'unsure'
export type ValueOp = 'read' | 'write' | 'increment' | 'cas'

/** What a record becomes; sources that the mapping does not name are undefined. */
export interface Plan {
  readonly mapping: Mapping
  /** line of the history that comes first */
  readonly header: string
  readonly client: Source
  readonly lanes: boolean
  readonly op: Source
  readonly key: Source
  readonly values: { readonly [Op in ValueOp]?: Source }
  readonly by: Source | undefined
  readonly expect: Source | undefined
  readonly applied: Source | undefined
  readonly saw: Source | undefined
  readonly basis: Source | undefined
  readonly start: Time | undefined
  readonly end: Time | undefined
  readonly duration: Time | undefined
  /** undefined: no rule fits */
  readonly outcome: (row: Parameters<Condition>[0]) => Outcome | undefined
  readonly host: Source | undefined
  readonly id: Source | undefined
  readonly keep: readonly { readonly name: string; readonly source: Source }[]
  readonly keepAll: boolean
  readonly place: string | undefined
  readonly skip: readonly Condition[]
  readonly marks: readonly MarkPlan[]
  /** every field named, so that one that a file cannot have is found at its head */
  readonly uses: readonly FieldUse[]
}

export interface MarkPlan {
  readonly when: Condition
  readonly mark: Source
  readonly start: Time
  readonly end: Time | undefined
}

/** Makes a mapping ready. Throws InputError with the place of each contradiction in it. */
export function makePlan(mapping: Mapping): Plan {
  const { spec } = mapping
  const problems: InputProblem[] = []
  const compilation: Compilation = {
    mapping,
    uses: [],
    refuse: (path, found, expected, advice) =>
      problems.push(mapping.problemAt(path, found, expected, advice)),
  }
  const defaults = spec.format === 'otlp' ? otlpDefaults : undefined
  const source = (
    name: keyof typeof spec & string,
    given: SourceSpec | undefined,
    fallback?: Source,
  ): Source | undefined =>
    given === undefined ? fallback : compileSource(compilation, given, [name], fallback)
  const required = (
    name: 'client' | 'op',
    given: SourceSpec | undefined,
    fallback: Source | undefined,
  ): Source => {
    const found = source(name, given, fallback)
    if (!found) compilation.refuse([], `no ${name}`, `${name}: and the field that tells it`)
    return found ?? { get: () => undefined, missing: () => 'nothing' }
  }
  const time = (name: 'start' | 'end' | 'duration'): Time | undefined =>
    spec[name] === undefined ? undefined : compileTime(compilation, spec[name], [name], name === 'duration')

  const { client: clientSpec } = spec
  const lanes = typeof clientSpec === 'object' ? clientSpec.lanes : undefined
  const plan: Plan = {
    mapping,
    header: headerLine(compilation),
    client: required('client', clientSpec, defaults?.client),
    lanes: lanes ?? (clientSpec === undefined && defaults !== undefined),
    op: required('op', spec.op, defaults?.op),
    key: compileSource(compilation, spec.key, ['key']),
    values: compileValues(compilation),
    by: source('by', spec.by),
    expect: source('expect', spec.expect),
    applied: source('applied', spec.applied),
    saw: source('saw', spec.saw),
    basis: source('basis', spec.basis),
    ...timesOf(compilation, time('start'), time('end'), time('duration'), defaults),
    outcome: compileOutcome(compilation, defaults?.outcome),
    host: source('host', spec.host, defaults?.host),
    id: source('id', spec.id),
    keep: compileKeep(compilation, defaults?.keep ?? []),
    keepAll: spec.keep === 'all',
    place: spec.place,
    skip: (spec.skip ?? []).map((each, i) => compileCondition(compilation, each, ['skip', i])),
    marks: (spec.marks ?? []).map((each, i) => ({
      when: compileCondition(compilation, each.when, ['marks', i, 'when']),
      mark: compileSource(compilation, each.mark, ['marks', i, 'mark']),
      start: compileTime(compilation, each.start, ['marks', i, 'start'], false),
      end:
        each.end === undefined ? undefined : compileTime(compilation, each.end, ['marks', i, 'end'], false),
    })),
    uses: compilation.uses,
  }
  for (const name of ['csv', 'otlp'] as const) {
    if (spec[name] && spec.format !== name)
      compilation.refuse([name], `${name}: in a mapping of ${spec.format}`, `no ${name}:`)
  }
  if (spec.place !== undefined) {
    refuseKnown(compilation, ['place'], spec.place)
    const names = plan.keepAll ? ['source'] : []
    if ([...names, ...plan.keep.map(({ name }) => name)].includes(spec.place))
      compilation.refuse(['place'], JSON.stringify(spec.place), 'a name that nothing else is kept by')
  }
  if (problems.length > 0) throw new InputError(problems.slice(0, PROBLEM_LIMIT))
  return plan
}

function headerLine({ mapping, refuse }: Compilation): string {
  const { title, clockError, initial, initialUnknown } = mapping.spec.header ?? {}
  const members = ['"history":1']
  if (title !== undefined) members.push(`"title":${JSON.stringify(title)}`)
  if (clockError !== undefined) {
    const ns = parseDuration(clockError)
    if (ns === undefined)
      refuse(
        ['header', 'clockError'],
        JSON.stringify(clockError),
        'a duration such as 2ms, 150us or 1.5s, in whole nanoseconds',
      )
    else members.push(`"clockError":${ns}`)
  }
  const exact = exactAt(mapping, ['header', 'initial'])
  if (initial && exact) members.push(`"initial":${jsonText(exact)}`)
  if (initialUnknown !== undefined) members.push(`"initialUnknown":${initialUnknown}`)
  return `{${members.join(',')}}\n`
}

const VALUE_OPS = ['read', 'write', 'increment', 'cas'] as const

/** A source for all kinds is that of reads, writes and cas: what an increment returned has to be named as such. */
function compileValues(compilation: Compilation): Plan['values'] {
  const { value } = compilation.mapping.spec
  if (value === undefined) return {}
  const given = typeof value === 'object' ? VALUE_OPS.filter((op) => value[op] !== undefined) : []
  if (typeof value === 'string' || given.length === 0) {
    const source = compileSource(compilation, value, ['value'])
    return { read: source, write: source, cas: source }
  }
  const other = Object.keys(value).filter((name) => !VALUE_OPS.some((op) => op === name))
  if (other.length > 0)
    compilation.refuse(
      ['value', other[0]],
      `${other[0]} beside ${given.join(', ')}`,
      'one source for all, or one each for read, write, increment and cas',
    )
  return Object.fromEntries(given.map((op) => [op, compileSource(compilation, value[op]!, ['value', op])]))
}

function timesOf(
  { refuse }: Compilation,
  start: Time | undefined,
  end: Time | undefined,
  duration: Time | undefined,
  defaults: { start: Time; end: Time } | undefined,
): Pick<Plan, 'start' | 'end' | 'duration'> {
  const given = [start, end, duration].filter((time) => time !== undefined).length
  if (given === 3) refuse(['duration'], 'start, end and duration', 'two of them')
  if (defaults) {
    if (!duration) return { start: start ?? defaults.start, end: end ?? defaults.end, duration }
    return { start: start ?? (end ? undefined : defaults.start), end, duration }
  }
  if (given < 2) refuse([], `${given === 0 ? 'no' : 'only one'} time`, 'two of start, end and duration')
  return { start, end, duration }
}

function compileOutcome(compilation: Compilation, fallback: Plan['outcome'] | undefined): Plan['outcome'] {
  const { outcome } = compilation.mapping.spec
  if (outcome === undefined) {
    if (!fallback)
      compilation.refuse(
        [],
        'no outcome',
        'outcome: and rules that tell what the store said done to',
        'outcome: acked if the log has only such requests; refused only for what proves that nothing happened',
      )
    return fallback ?? (() => undefined)
  }
  if (typeof outcome === 'string') return () => outcome
  const rules = outcome.map((rule, i) => ({
    holds: compileCondition(compilation, rule, ['outcome', i]),
    outcome: rule.outcome,
  }))
  return (row) => rules.find(({ holds }) => holds(row))?.outcome
}

function compileKeep(compilation: Compilation, defaults: Plan['keep']): Plan['keep'] {
  const { keep } = compilation.mapping.spec
  if (keep === undefined || keep === 'all') return defaults
  const own = Object.entries(keep).map(([name, spec]) => {
    refuseKnown(compilation, ['keep', name], name)
    return { name, source: compileSource(compilation, spec, ['keep', name]) }
  })
  return [...defaults.filter(({ name }) => !(name in keep)), ...own]
}

function refuseKnown({ refuse }: Compilation, path: readonly PropertyKey[], name: string): void {
  if ((FIELDS as readonly string[]).includes(name))
    refuse(path, JSON.stringify(name), 'a name that has no meaning of its own in a history')
}

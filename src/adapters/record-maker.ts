/**
 * Turns the rows of a log into lines of a history, by a plan.
 */
import { parseDecimal, toInteger } from '../history/decimal.js'
import { didYouMean } from '../promises/nearest.js'
import { isInRange, type Nanoseconds } from './instants.js'
import { jsonText, scalarText } from './json-node.js'
import { Lanes } from './lanes.js'
import type { MarkPlan, Outcome, Plan, ValueOp } from './plan.js'
import type { Row } from './rows.js'
import type { Source } from './sources.js'
import type { Time } from './time-source.js'
import { quoted, RowTrouble } from './trouble.js'

const OPS = ['read', 'write', 'increment', 'cas', 'delete'] as const
type Op = (typeof OPS)[number]

/** What became of the rows. */
export interface Tally {
  operations: Record<Op, number>
  outcomes: Record<Outcome, number>
  marks: number
  /** rows that a rule of the mapping passes over */
  skipped: number
  /** operations that no outcome rule fits: unsure */
  noRule: number
  /** operations said to be acked or refused that have no end: unsure */
  noEnd: number
}

export class RecordMaker {
  readonly tally: Tally = {
    operations: { read: 0, write: 0, increment: 0, cas: 0, delete: 0 },
    outcomes: { acked: 0, refused: 0, unsure: 0 },
    marks: 0,
    skipped: 0,
    noRule: 0,
    noEnd: 0,
  }
  readonly #plan: Plan
  readonly #lanes: Lanes | undefined

  constructor(plan: Plan) {
    this.#plan = plan
    this.#lanes = plan.lanes ? new Lanes() : undefined
  }

  /** The most lanes that a client was split into; undefined where clients are not split. */
  get mostLanes(): number | undefined {
    return this.#lanes?.most
  }

  /** The line that a row of a file becomes, '' for one that is passed over. Throws RowTrouble. */
  line(row: Row, file: string): string {
    const { skip, marks } = this.#plan
    if (skip.some((holds) => holds(row))) {
      this.tally.skipped++
      return ''
    }
    const mark = marks.find(({ when }) => when(row))
    return mark ? this.#mark(mark, row, file) : this.#operation(row, file)
  }

  #mark({ mark, start, end }: MarkPlan, row: Row, file: string): string {
    const startNs = need(start, row, 'start of a mark').floor
    const endNs = end?.get(row)?.ceil
    if (endNs !== undefined && endNs < startNs) throw endBeforeStart(startNs, endNs)
    const members = [
      `"mark":${JSON.stringify(text(mark, row, 'mark'))}`,
      `"start":${ranged(startNs)}`,
      ...(endNs === undefined ? [] : [`"end":${ranged(endNs)}`]),
      ...this.#kept(row, file),
    ]
    this.tally.marks++
    return `{${members.join(',')}}\n`
  }

  #operation(row: Row, file: string): string {
    const plan = this.#plan
    const op = opOf(plan.op, row)
    const client = text(plan.client, row, 'client')
    const key = text(plan.key, row, 'key')
    const { start, end } = this.#times(row)
    const ruled = plan.outcome(row)
    const outcome = end === undefined ? 'unsure' : (ruled ?? 'unsure')
    const details = this.#details(op, outcome, row)
    const host = optionalText(plan.host, row, 'host')
    const id = optionalText(plan.id, row, 'id')
    // Lanes of one client are stamped by one clock.
    const clock = host ?? (this.#lanes ? client : undefined)
    const requester = this.#lanes?.assign(client, clock!, start, end) ?? client
    const members = [
      `"client":${JSON.stringify(requester)}`,
      `"op":"${op}"`,
      `"key":${JSON.stringify(key)}`,
      ...details,
      `"start":${start}`,
      ...(end === undefined ? [] : [`"end":${end}`]),
      ...(outcome === 'acked' ? [] : [`"outcome":"${outcome}"`]),
      ...(clock === undefined ? [] : [`"host":${JSON.stringify(clock)}`]),
      ...(id === undefined ? [] : [`"id":${JSON.stringify(id)}`]),
      ...this.#kept(row, file),
    ]
    const { tally } = this
    tally.operations[op]++
    tally.outcomes[outcome]++
    if (ruled === undefined) tally.noRule++
    else if (end === undefined && ruled !== 'unsure') tally.noEnd++
    return `{${members.join(',')}}\n`
  }

  /** Two of start, end and duration tell the third. What is finer than a nanosecond is rounded outward. */
  #times(row: Row): { start: bigint; end: bigint | undefined } {
    const plan = this.#plan
    let start: bigint
    let end: bigint | undefined
    if (plan.start) {
      const began = need(plan.start, row, 'start')
      start = began.floor
      const took = plan.duration?.get(row)
      end = plan.duration ? took && began.ceil + spanOf(took).ceil : plan.end?.get(row)?.ceil
    } else {
      const ended = need(plan.end!, row, 'end')
      start = ended.floor - spanOf(need(plan.duration!, row, 'duration')).ceil
      end = ended.ceil
    }
    ranged(start)
    if (end !== undefined) {
      ranged(end)
      if (end < start) throw endBeforeStart(start, end)
    }
    return { start, end }
  }

  /** The members that depend on the kind of operation. */
  #details(op: Op, outcome: Outcome, row: Row): string[] {
    const { basis } = this.#plan
    switch (op) {
      case 'read':
        return outcome === 'acked' ? [`"value":${this.#value('read', row)}`] : []
      case 'write': {
        const members = [`"value":${this.#value('write', row)}`]
        const seen = basis?.get(row)
        return seen ? [...members, `"basis":${jsonText(seen)}`] : members
      }
      case 'increment': {
        const members = [`"by":${this.#by(row)}`]
        const count = outcome === 'acked' ? this.#plan.values.increment?.get(row) : undefined
        return count ? [...members, `"value":${jsonText(count)}`] : members
      }
      case 'cas':
        return this.#cas(outcome, row)
      case 'delete':
        return []
    }
  }

  #cas(outcome: Outcome, row: Row): string[] {
    const { expect, applied, saw } = this.#plan
    const members = [
      `"expect":${this.#needed(expect, 'expect', 'cas', row)}`,
      `"value":${this.#value('cas', row)}`,
    ]
    if (outcome !== 'acked') return members
    const answer = applied?.get(row)
    if (!answer)
      throw new RowTrouble(
        'missing-field',
        `a cas that was answered, and ${applied ? applied.missing(row) : 'no applied in the mapping'}`,
        'applied: whether the comparison held',
        'applied: {field: …, translate: {…: true, …: false}}, or {constant: true} if only such are logged',
      )
    const said = scalarText(answer)
    if (said === 'true') return members
    if (said !== 'false')
      throw new RowTrouble(
        'ill-typed-field',
        `${quoted(said ?? jsonText(answer))} as applied`,
        'true or false',
        'applied: translate says what others stand for',
      )
    const found = saw?.get(row)
    return [...members, '"applied":false', ...(found ? [`"saw":${jsonText(found)}`] : [])]
  }

  #value(op: ValueOp, row: Row): string {
    return this.#needed(this.#plan.values[op], 'value', op, row)
  }

  /** A value without which the operation says nothing. */
  #needed(source: Source | undefined, name: string, op: string, row: Row): string {
    const node = source?.get(row)
    if (node) return jsonText(node)
    const { format } = this.#plan.mapping.spec
    const found = source ? source.missing(row) : `no ${name} in the mapping`
    throw new RowTrouble(
      'missing-field',
      `a ${op}, and ${found}`,
      op === 'read' ? 'the value that it returned' : `${name} of the ${op}`,
      found.startsWith('an empty')
        ? 'say what an empty cell means, empty: null (absence) or empty: text'
        : format === 'otlp'
          ? 'spans carry no values unless the program adds them: let it set an attribute, and name that in the mapping'
          : `name it in the mapping; where it was absent, default: null`,
    )
  }

  #by(row: Row): string {
    const { by } = this.#plan
    const node = by?.get(row)
    if (!node)
      throw new RowTrouble(
        'missing-field',
        `an increment, and ${by ? by.missing(row) : 'no by in the mapping'}`,
        'by: how much it adds',
        'by: {constant: 1} where it is always one, default: 1 where it may be left out',
      )
    const decimal = parseDecimal(scalarText(node) ?? '')
    const whole = decimal ? toInteger(decimal) : undefined
    if (typeof whole !== 'bigint')
      throw new RowTrouble(
        'ill-typed-field',
        `${quoted(scalarText(node) ?? jsonText(node))} as by`,
        'a whole number',
      )
    return whole.toString()
  }

  #kept(row: Row, file: string): string[] {
    const { keep, keepAll, place } = this.#plan
    const members: string[] = []
    for (const { name, source } of keep) {
      const node = source.get(row)
      if (node) members.push(`${JSON.stringify(name)}:${jsonText(node)}`)
    }
    if (keepAll) members.push(`"source":${jsonText(row.all())}`)
    if (place !== undefined) members.push(`${JSON.stringify(place)}:${JSON.stringify(`${file}:${row.line}`)}`)
    return members
  }
}

function opOf(source: Source, row: Row): Op {
  const name = text(source, row, 'op')
  const op = OPS.find((op) => op === name)
  if (op) return op
  throw new RowTrouble(
    'unknown-op',
    `the op ${quoted(name)}`,
    `${OPS.join(', ')}${didYouMean(name, OPS)}`,
    'say what it stands for (op: translate), or pass such records over (skip)',
  )
}

function text(source: Source, row: Row, what: string): string {
  const found = optionalText(source, row, what)
  if (found !== undefined) return found
  throw new RowTrouble(
    'missing-field',
    source.missing(row),
    what,
    'pass such records over (skip), or name another field',
  )
}

function optionalText(source: Source | undefined, row: Row, what: string): string | undefined {
  const node = source?.get(row)
  if (node === undefined || node.kind === 'null') return undefined
  const found = scalarText(node)
  if (found === undefined)
    throw new RowTrouble('ill-typed-field', `${quoted(jsonText(node))} as ${what}`, 'text or a number')
  return found
}

function need(time: Time, row: Row, what: string): Nanoseconds {
  const found = time.get(row)
  if (found) return found
  throw new RowTrouble('missing-field', time.missing(row), `the ${what}`)
}

function spanOf(duration: Nanoseconds): Nanoseconds {
  if (duration.floor >= 0n) return duration
  throw new RowTrouble('bad-time', 'a duration below 0', 'a duration of 0 or more')
}

function ranged(ns: bigint): bigint {
  if (isInRange(ns)) return ns
  throw new RowTrouble(
    'time-out-of-range',
    `a time of ${ns} ns`,
    'times within 2^63 ns of 1970',
    'check the unit that the mapping names',
  )
}

function endBeforeStart(start: bigint, end: bigint): RowTrouble {
  return new RowTrouble(
    'end-before-start',
    `an end ${start - end} ns before the start`,
    'an end at or after the start',
    'if the clock was set back, leave such records out (skip) and say so: operations are missing then',
  )
}

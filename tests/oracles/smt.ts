/**
 * "There is a sequence that keeps the promise" as an SMT problem (SMT-LIB 2.6, linear integer arithmetic), straight
 * from the definition: a place for each operation, a choice for each unsure one, what each saw. Shares no code with
 * `brute-force.ts` or with src/.
 */
import type { PlainKey, PlainRule } from './brute-force.js'
import { countedPairs, countsAtAll, type Kind, type Operation, precedes, readKey } from './plain-pairs.js'

/** A problem that is satisfiable exactly when the promise holds on the key. */
export function smtProblem(key: PlainKey, rule: PlainRule): string {
  const { all, kind } = readKey(key)
  return new Encoding(key, rule, kind, all).text()
}

const and = (parts: string[]): string => (parts.length === 0 ? 'true' : `(and ${parts.join(' ')})`)
const or = (parts: string[]): string => (parts.length === 0 ? 'false' : `(or ${parts.join(' ')})`)
const number = (n: number): string => (n < 0 ? `(- ${-n})` : `${n}`)

/** What the start may be, where it is one of several values. */
const START = -1

class Encoding {
  readonly #key: PlainKey
  readonly #rule: PlainRule
  readonly #kind: Kind
  readonly #all: readonly Operation[]
  /** the operations that can stand in a sequence */
  readonly #ops: readonly Operation[]
  /** those that leave a value of their own */
  readonly #setters: readonly Operation[]
  readonly #increments: readonly Operation[]
  /** values by what they are, each a number of its own */
  readonly #ids = new Map<string, number>()

  constructor(key: PlainKey, rule: PlainRule, kind: Kind, all: readonly Operation[]) {
    this.#key = key
    this.#rule = rule
    this.#kind = kind
    this.#all = all
    this.#ops = all.filter(({ outcome, op, acked }) => outcome !== 'refused' && (op !== 'read' || acked))
    this.#setters = this.#ops.filter(({ writes, op }) => writes && op !== 'increment')
    this.#increments = this.#ops.filter(({ op }) => op === 'increment')
  }

  text(): string {
    const lines = ['(set-logic QF_LIA)']
    for (const { at } of this.#ops) lines.push(`(declare-const p${at} Int)`, `(declare-const in${at} Bool)`)
    lines.push('(declare-const start Int)', '(declare-const startIsNumber Bool)')
    const assert = (formula: string): void => {
      lines.push(`(assert ${formula})`)
    }
    assert(this.#startFormula())
    const counted = countedPairs(this.#key, this.#rule, this.#kind, this.#all)
    for (const b of this.#ops) {
      assert(b.acked ? `in${b.at}` : `(and (<= 0 p${b.at}) (< p${b.at} ${this.#ops.length}))`)
      assert(`(and (<= 0 p${b.at}) (< p${b.at} ${this.#ops.length}))`)
      for (const a of this.#ops)
        if (countsAtAll(counted, a, b)) assert(`(=> in${b.at} (< p${a.at} p${b.at}))`)
    }
    if (this.#ops.length > 1) assert(`(distinct ${this.#ops.map(({ at }) => `p${at}`).join(' ')})`)
    for (const op of this.#ops) {
      const formula = this.#answers(op)
      if (formula !== undefined) assert(`(=> in${op.at} ${formula})`)
    }
    return lines.join('\n')
  }

  /** Values as numbers: whole numbers themselves on keys with increments, all else an id. */
  #value(value: unknown): { isNumber: boolean; n: number } {
    if (this.#kind !== 'register') {
      const count = value ?? 0
      if (typeof count === 'number' && Number.isInteger(count)) return { isNumber: true, n: count }
    }
    const text = JSON.stringify(value ?? null)
    const id = this.#ids.get(text) ?? this.#ids.size
    this.#ids.set(text, id)
    return { isNumber: false, n: id }
  }

  #is(value: unknown): string {
    const { isNumber, n } = this.#value(value)
    return and([isNumber ? 'startIsNumber' : '(not startIsNumber)', `(= start ${number(n)})`])
  }

  #startFormula(): string {
    const { initial, initialUnknown } = this.#key
    if (initial !== undefined) return this.#is(initial)
    if (!initialUnknown) return this.#is(null)
    const nobodyKnows = and(['(not startIsNumber)', '(= start (- 1))'])
    const given = new Set(
      this.#all
        .filter(({ op }) => op !== 'read')
        .map(({ op, value }) => JSON.stringify(op === 'delete' ? null : (value ?? null))),
    )
    const met = this.#ops.flatMap((op): unknown[] => {
      if (op.op === 'read') return [op.value]
      if (op.op !== 'cas') return []
      return op.acked && op.applied === false ? (op.saw === undefined ? [] : [op.saw]) : [op.expect]
    })
    if (this.#kind === 'counter') return 'startIsNumber'
    if (this.#kind === 'mixed') {
      const others = [...met, ...this.#setters.map(({ value }) => value)].filter(
        (value) => !this.#value(value).isNumber,
      )
      return or(['startIsNumber', nobodyKnows, ...others.map((value) => this.#is(value))])
    }
    const free = met.filter((value) => !given.has(JSON.stringify(value ?? null)))
    return or([nobodyKnows, this.#is(null), ...free.map((value) => this.#is(value))])
  }

  /** The value that a setter leaves. */
  #left(w: Operation): { isNumber: boolean; n: number } {
    return this.#value(w.op === 'delete' ? null : w.value)
  }

  /** Whether setter w (or the start) is the last one before op. */
  #isLast(w: Operation | typeof START, op: Operation): string {
    const parts: string[] = []
    if (w !== START) parts.push(`in${w.at}`, `(< p${w.at} p${op.at})`)
    for (const other of this.#setters) {
      if (other === w || other === op) continue
      const isBefore = w === START ? 'false' : `(< p${other.at} p${w.at})`
      parts.push(or([`(not in${other.at})`, isBefore, `(> p${other.at} p${op.at})`]))
    }
    return and(parts)
  }

  #isBetween(i: Operation, w: Operation | typeof START, op: Operation): string {
    return and([`in${i.at}`, `(< p${i.at} p${op.at})`, ...(w === START ? [] : [`(< p${w.at} p${i.at})`])])
  }

  /** What was added since setter w. */
  #added(w: Operation | typeof START, op: Operation): string {
    const since = this.#increments.filter((i) => i !== op)
    const terms = since.map((i) => `(ite ${this.#isBetween(i, w, op)} ${number(i.by ?? 1)} 0)`)
    return terms.length === 0 ? '0' : `(+ 0 ${terms.join(' ')})`
  }

  /** That op found this value, by way of each setter that may have been the last. `tells`: it is a read that says so. */
  #found(op: Operation, value: unknown, tells: boolean): string {
    const told = this.#value(value)
    return or(
      [START as typeof START, ...this.#setters].flatMap((w) => {
        if (w === op || (tells && !this.#maySee(op, w))) return []
        const parts = [this.#isLast(w, op)]
        if (tells && this.#kind === 'mixed') {
          for (const i of this.#increments)
            if (precedes(this.#key, op, i)) parts.push(`(not ${this.#isBetween(i, w, op)})`)
        }
        if (w === START) {
          parts.push(told.isNumber ? 'startIsNumber' : '(not startIsNumber)')
          parts.push(
            told.isNumber ? `(= ${number(told.n)} (+ start ${this.#added(w, op)}))` : `(= start ${told.n})`,
          )
        } else {
          const left = this.#left(w)
          if (left.isNumber !== told.isNumber) return []
          if (told.isNumber) parts.push(`(= ${number(told.n)} (+ ${number(left.n)} ${this.#added(w, op)}))`)
          else if (left.n !== told.n) return []
        }
        return [and(parts)]
      }),
    )
  }

  #maySee(op: Operation, w: Operation | typeof START): boolean {
    if (w !== START && precedes(this.#key, op, w)) return false
    if (this.#rule.versions === undefined || this.#kind !== 'register') return true
    const between = this.#all.filter(
      (v) =>
        v.acked &&
        v.writes &&
        v !== w &&
        precedes(this.#key, v, op) &&
        (w === START || precedes(this.#key, w, v)),
    )
    return between.length <= this.#rule.versions
  }

  /** That op did not find this value. */
  #missed(op: Operation, value: unknown): string {
    const told = this.#value(value)
    return and(
      [START as typeof START, ...this.#setters].flatMap((w) => {
        if (w === op) return []
        let isIt: string
        if (w === START) {
          isIt = told.isNumber
            ? and(['startIsNumber', `(= ${number(told.n)} (+ start ${this.#added(w, op)}))`])
            : and(['(not startIsNumber)', `(= start ${told.n})`])
        } else {
          const left = this.#left(w)
          if (left.isNumber !== told.isNumber) return []
          if (!told.isNumber && left.n !== told.n) return []
          isIt = told.isNumber ? `(= ${number(told.n)} (+ ${number(left.n)} ${this.#added(w, op)}))` : 'true'
        }
        return [`(not ${and([this.#isLast(w, op), isIt])})`]
      }),
    )
  }

  /** That there is a number to add to. */
  #findsNumber(op: Operation): string {
    return or(
      [START as typeof START, ...this.#setters].flatMap((w) => {
        if (w === START) return [and([this.#isLast(w, op), 'startIsNumber'])]
        return this.#left(w).isNumber ? [this.#isLast(w, op)] : []
      }),
    )
  }

  /** That a single copy answers op as recorded; undefined where anything goes. */
  #answers(op: Operation): string | undefined {
    switch (op.op) {
      case 'read':
        return this.#found(op, op.value, true)
      case 'cas':
        if (op.acked && op.applied === false)
          return op.saw === undefined ? this.#missed(op, op.expect) : this.#found(op, op.saw, true)
        return this.#found(op, op.expect, op.acked)
      case 'increment':
        if (op.reads) return this.#found(op, (op.value as number) - (op.by ?? 1), true)
        return this.#findsNumber(op)
      default:
        return undefined
    }
  }
}

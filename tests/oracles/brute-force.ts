/**
 * The promises of a single key by their definition, by plain exhaustive search. Shares no code with src/.
 *
 * A promise holds on a key when all acked operations, and any choice of the unsure ones, can be put in one
 * sequence that a single copy of the key would produce answer for answer, with a before b for every counted pair.
 */

/** A record as it is written, parsed; times are small whole numbers. */
export interface PlainOperation {
  client: string
  op: 'read' | 'write' | 'increment' | 'cas' | 'delete'
  key: string
  value?: unknown
  by?: number
  expect?: unknown
  applied?: boolean
  saw?: unknown
  start: number
  end?: number
  outcome?: 'acked' | 'refused' | 'unsure'
  host?: string
}

export interface PlainKey {
  operations: PlainOperation[]
  clockError: number
  /** undefined: absent (counters 0) */
  initial?: unknown
  initialUnknown?: boolean
}

export interface PlainRule {
  promise: string
  /** bounded-staleness */
  within?: number
  versions?: number
  /** durable */
  settle?: number
}

interface Op extends PlainOperation {
  index: number
  acked: boolean
  isRead: boolean
  isWrite: boolean
  text: string
}

const text = (value: unknown): string => JSON.stringify(value ?? null)

/** Whether the promise holds on the key. */
export function bruteForce(key: PlainKey, rule: PlainRule): boolean {
  const all = key.operations.map((op, index): Op => {
    const outcome = op.outcome ?? (op.end === undefined ? 'unsure' : 'acked')
    const acked = outcome === 'acked'
    const failedCas = op.op === 'cas' && acked && op.applied === false
    return {
      ...op,
      outcome,
      index,
      acked,
      isWrite: op.op !== 'read' && !failedCas,
      isRead:
        acked && (op.op === 'read' || op.op === 'cas' || (op.op === 'increment' && op.value !== undefined)),
      text: text(op.op === 'delete' ? null : op.value),
    }
  })
  const ops = all.filter((op) => op.outcome !== 'refused' && !(op.op === 'read' && !op.acked))
  const isCounter = all.some((op) => op.op === 'increment')
  const isMixed = isCounter && all.some((op) => op.op === 'write' || op.op === 'cas' || op.op === 'delete')
  const search = new Search(ops, key, rule, isCounter && !isMixed, isMixed)
  const offered = new Set(
    all
      .filter((op) => !op.isWrite || op.outcome === 'refused')
      .map((op) => (op.op === 'read' ? '' : op.text)),
  )
  return initials(key, ops, isCounter, isMixed, offered).some((initial) => search.holds(initial))
}

/** The initial values to try: the given one, or under initialUnknown every one that could matter. */
function initials(
  key: PlainKey,
  ops: Op[],
  isCounter: boolean,
  isMixed: boolean,
  offered: Set<string>,
): unknown[] {
  if (key.initial !== undefined) return [key.initial]
  if (!key.initialUnknown) return [isCounter ? 0 : null]
  if (isCounter) {
    // A mixed key may have started with something that is no count; of the counts those in reach are enough.
    const met = ops.flatMap(({ value, expect, saw }) => [value, expect, saw])
    const counts = met.filter((value): value is number => typeof value === 'number')
    const others = met.filter((value) => value !== undefined && value !== null && typeof value !== 'number')
    const span = ops.reduce((sum, op) => sum + Math.abs(op.by ?? 1), 0)
    const [least, most] = [Math.min(0, ...counts) - span, Math.max(0, ...counts) + span]
    const reachable = Array.from({ length: most - least + 1 }, (_, i) => least + i)
    return isMixed ? [...reachable, ...others, { nobody: 'knows' }] : reachable
  }
  const written = new Set(ops.filter((op) => op.isWrite).map((op) => op.text))
  // An unsure cas that took effect found its `expect` there as well.
  const found = ops.filter((op) => op.isRead || (op.op === 'cas' && !op.acked))
  const unwritten = [...new Set(found.map(returned))].filter(
    (t): t is string => t !== undefined && !written.has(t) && !offered.has(t),
  )
  // Absence is not a value that anybody chooses: a delete later on does not show that it was not there before.
  return [...unwritten.map((t) => JSON.parse(t)), null, { nobody: 'knows' }]
}

/** The text of what a register read returned, undefined where it does not say. */
function returned(op: Op): string | undefined {
  if (op.op !== 'cas') return op.text
  if (op.acked && op.applied === false) return op.saw === undefined ? undefined : text(op.saw)
  return text(op.expect)
}

class Search {
  readonly #ops: Op[]
  readonly #key: PlainKey
  readonly #rule: PlainRule
  readonly #isCounter: boolean
  readonly #isMixed: boolean
  readonly #closing: boolean[]

  constructor(ops: Op[], key: PlainKey, rule: PlainRule, isCounter: boolean, isMixed: boolean) {
    this.#ops = ops
    this.#key = key
    this.#rule = rule
    this.#isCounter = isCounter
    this.#isMixed = isMixed
    const writes = ops.filter((op) => op.acked && op.isWrite)
    const settle = rule.settle ?? 0
    this.#closing = ops.map(
      (b) =>
        b.isRead &&
        writes.every(
          (w) => w !== b && this.#precedes(w, b) && b.start >= w.end! + settle + this.#slack(w, b),
        ),
    )
  }

  #slack(a: Op, b: Op): number {
    const oneClock = a.client === b.client || (a.host !== undefined && a.host === b.host)
    return oneClock ? 0 : 2 * this.#key.clockError
  }

  /** a ≺ b, by the three rules. */
  #precedes(a: Op, b: Op): boolean {
    if (!a.acked || a === b) return false
    if (a.client === b.client) {
      const forward = a.end! <= b.start
      const backward = b.end !== undefined && b.end <= a.start
      return forward && (!backward || a.index < b.index)
    }
    return a.end! + this.#slack(a, b) < b.start
  }

  /** Whether the pair counts for a in role ra and b in role rb. */
  #counts(a: Op, ra: 'read' | 'write', b: Op, rb: 'read' | 'write'): boolean {
    if (!this.#precedes(a, b)) return false
    const inSession = a.client === b.client
    if (ra === 'write' && rb === 'write' && !this.#isCounter) return true
    switch (this.#rule.promise) {
      case 'written-values':
      case 'monotonic-writes':
        return false
      case 'read-your-writes':
        return inSession && ra === 'write' && rb === 'read'
      case 'monotonic-reads':
        return inSession && ra === 'read' && rb === 'read'
      case 'writes-follow-reads':
        return inSession && ra === 'read' && rb === 'write'
      case 'coherent':
        return inSession
      case 'bounded-staleness':
        // The bound on versions is looked at when a read is placed.
        return (
          this.#rule.within !== undefined &&
          ra === 'write' &&
          rb === 'read' &&
          b.start > a.end! + this.#rule.within + this.#slack(a, b)
        )
      case 'durable':
        return ra === 'write' && rb === 'read' && this.#closing[this.#ops.indexOf(b)]
      case 'regular':
        return !(ra === 'read' && rb === 'read')
      case 'linearizable':
        return true
      default:
        throw new Error(`no such promise: ${this.#rule.promise}`)
    }
  }

  #mustPrecede(a: Op, b: Op): boolean {
    for (const ra of ['read', 'write'] as const) {
      for (const rb of ['read', 'write'] as const) {
        if ((ra === 'read' ? a.isRead : a.isWrite) && (rb === 'read' ? b.isRead : b.isWrite)) {
          if (this.#counts(a, ra, b, rb)) return true
        }
      }
    }
    // Nobody reads the future: on a counter a read comes before the increments that it precedes.
    return this.#isCounter && a.isRead && b.isWrite && this.#precedes(a, b)
  }

  holds(initial: unknown): boolean {
    const n = this.#ops.length
    const before = this.#ops.map((b) => this.#ops.map((a) => a !== b && this.#mustPrecede(a, b)))
    const seen = new Set<string>()
    const placed: boolean[] = new Array(n).fill(false)

    // The state: value now, and the writes it came about by (for the rules on what a read may not precede).
    const place = (
      count: number,
      value: unknown,
      lastWrite: Op | undefined,
      since: Op[],
      sequence: Op[],
    ): boolean => {
      if (this.#ops.every((op, i) => placed[i] || !op.acked)) return true
      const state = `${placed.map(Number).join('')}|${text(value)}|${lastWrite?.index ?? -1}|${since
        .map((op) => op.index)
        .sort()
        .join()}|${
        this.#rule.versions === undefined
          ? ''
          : sequence
              .filter((op) => op.isWrite)
              .map((op) => op.index)
              .join()
      }`
      if (seen.has(state)) return false
      seen.add(state)
      for (let i = 0; i < n; i++) {
        const op = this.#ops[i]
        if (placed[i]) continue
        // Everything placed must not be required after it; everything required before it must be placed or left out.
        if (this.#ops.some((a, j) => !placed[j] && j !== i && before[i][j] && a.acked)) continue
        if (this.#ops.some((_, j) => placed[j] && before[j][i])) continue
        const next = this.#apply(op, value, lastWrite, since)
        if (!next) continue
        placed[i] = true
        if (place(count + 1, next.value, next.lastWrite, next.since, [...sequence, op])) return true
        placed[i] = false
      }
      return false
    }
    return place(0, initial, undefined, [], [])
  }

  /** What the operation leaves behind, or undefined when it could not have answered as it did. */
  #apply(
    op: Op,
    value: unknown,
    lastWrite: Op | undefined,
    since: Op[],
  ): { value: unknown; lastWrite: Op | undefined; since: Op[] } | undefined {
    const sees = (): boolean => {
      if (!op.isRead) return true
      if (lastWrite && this.#precedes(op, lastWrite)) return false
      if (since.some((i) => this.#precedes(op, i))) return false
      if (this.#rule.versions !== undefined && !this.#isCounter && !this.#isMixed) {
        const newer = this.#ops.filter(
          (w) =>
            w.acked &&
            w.isWrite &&
            w !== lastWrite &&
            (!lastWrite || this.#precedes(lastWrite, w)) &&
            this.#precedes(w, op),
        )
        if (newer.length > this.#rule.versions) return false
      }
      return true
    }
    switch (op.op) {
      case 'read':
        if (!this.#same(op.value, value)) return undefined
        return sees() ? { value, lastWrite, since } : undefined
      case 'write':
      case 'delete':
        return { value: op.op === 'delete' ? null : op.value, lastWrite: op, since: [] }
      case 'cas': {
        if (op.acked && op.applied === false) {
          if (op.saw !== undefined ? !this.#same(op.saw, value) : this.#same(op.expect, value))
            return undefined
          if (op.saw === undefined) return { value, lastWrite, since }
          return sees() ? { value, lastWrite, since } : undefined
        }
        if (!this.#same(op.expect, value) || !sees()) return undefined
        return { value: op.value, lastWrite: op, since: [] }
      }
      case 'increment': {
        const count = absence(value)
        if (typeof count !== 'number' || !Number.isInteger(count)) return undefined
        const sum = count + (op.by ?? 1)
        if (op.isRead && (op.value !== sum || !sees())) return undefined
        return { value: sum, lastWrite, since: [...since, op] }
      }
    }
  }

  /** On a key with increments absence counts as 0. */
  #same(a: unknown, b: unknown): boolean {
    const countsAbsence = this.#isCounter || this.#isMixed
    return countsAbsence ? text(absence(a)) === text(absence(b)) : text(a) === text(b)
  }
}

/** The count that a key holds, where absence counts as 0. */
function absence(value: unknown): unknown {
  return value ?? 0
}

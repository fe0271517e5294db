/**
 * Converts foreign logs into a history, as they stream by.
 */
import { InputError, type InputProblem, PROBLEM_LIMIT } from '../history/problems.js'
import type { ByteSource } from '../history/source.js'
import { readCsv } from './csv-rows.js'
import type { Mapping } from './mapping-file.js'
import { readNdjson } from './ndjson-rows.js'
import { readSpans } from './otlp-rows.js'
import { makePlan, type Plan } from './plan.js'
import { RecordMaker, type Tally } from './record-maker.js'
import type { Row, RowVisitor } from './rows.js'
import { RowTrouble } from './trouble.js'

/** What a conversion did. */
export interface Conversion extends Tally {
  /** the most lanes that one client was split into; absent where clients are not split */
  readonly mostLanes?: number
  /** records that were not asked for, by the reason */
  readonly passedOver: ReadonlyMap<string, number>
  readonly warnings: readonly { readonly file: string; readonly line: number; readonly text: string }[]
}

/** Characters of output between two writes. */
const BATCH = 1 << 16

/**
 * Converts all sources, by one mapping, into one history. `write` is awaited with pieces of it, whole lines; it sees
 * no more after the first problem. Throws InputError with at most PROBLEM_LIMIT problems; without any operation too.
 */
export async function convert(
  sources: readonly ByteSource[],
  mapping: Mapping,
  write: (text: string) => Promise<void>,
): Promise<Conversion> {
  const plan = makePlan(mapping)
  const maker = new RecordMaker(plan)
  const state = new State(plan, maker, write)
  for (const source of sources) {
    await readRows(source, plan, state.visitor(source.name))
    if (state.isFull) break
  }
  const count = Object.values(maker.tally.operations).reduce((sum, n) => sum + n, 0)
  if (state.problems.length === 0 && count === 0) state.problems.push(emptyProblem(sources, state))
  if (state.problems.length > 0) throw new InputError(state.problems)
  await state.flush()
  const { mostLanes } = maker
  return {
    ...maker.tally,
    ...(mostLanes === undefined ? {} : { mostLanes }),
    passedOver: state.passedOver,
    warnings: state.warnings,
  }
}

async function readRows(source: ByteSource, plan: Plan, visitor: RowVisitor): Promise<void> {
  const { mapping } = plan
  const { format, otlp } = mapping.spec
  try {
    if (format === 'csv') await readCsv(source, mapping, plan.uses, visitor)
    else if (format === 'ndjson') await readNdjson(source, visitor)
    else await readSpans(source, otlp, visitor)
  } catch (error) {
    if (!(error instanceof InputError)) throw error
    for (const problem of error.problems) visitor.problem(problem)
  }
}

class State {
  readonly problems: InputProblem[] = []
  readonly passedOver = new Map<string, number>()
  readonly warnings: { file: string; line: number; text: string }[] = []
  readonly #maker: RecordMaker
  readonly #write: (text: string) => Promise<void>
  #text: string

  constructor(plan: Plan, maker: RecordMaker, write: (text: string) => Promise<void>) {
    this.#maker = maker
    this.#write = write
    this.#text = plan.header
  }

  get isFull(): boolean {
    return this.problems.length >= PROBLEM_LIMIT
  }

  async flush(): Promise<void> {
    const text = this.#text
    this.#text = ''
    if (this.problems.length === 0 && text !== '') await this.#write(text)
  }

  visitor(file: string): RowVisitor {
    return {
      row: (row) => this.#row(row, file),
      problem: (problem) => this.#problem(problem),
      warning: (line, text) => this.warnings.push({ file, line, text }),
      passedOver: (why) => this.passedOver.set(why, (this.passedOver.get(why) ?? 0) + 1),
      pause: async () => {
        if (this.#text.length >= BATCH) await this.flush()
      },
    }
  }

  #row(row: Row, file: string): boolean {
    try {
      const line = this.#maker.line(row, file)
      if (this.problems.length === 0) this.#text += line
      return true
    } catch (error) {
      if (!(error instanceof RowTrouble)) throw error
      const { code, found, expected, advice } = error
      return this.#problem({
        code,
        file,
        line: row.line,
        found: row.label === undefined ? found : `${found} (${row.label})`,
        expected,
        ...(advice === undefined ? {} : { advice }),
      })
    }
  }

  #problem(problem: InputProblem): boolean {
    if (!this.isFull) this.problems.push(problem)
    return !this.isFull
  }
}

function emptyProblem(sources: readonly ByteSource[], { passedOver }: State): InputProblem {
  const reasons = Array.from(passedOver, ([why, count]) => `${count} ${why}`)
  return {
    code: 'empty-history',
    file: sources.map(({ name }) => name).join(', '),
    found: `no operations${reasons.length === 0 ? '' : ` (spans passed over: ${reasons.join(', ')})`}`,
    expected: 'at least one record that is an operation',
    advice: 'check the rules that pass records over (skip, marks, otlp)',
  }
}

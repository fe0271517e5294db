/**
 * Reads a history: all files, line by line, into columns (format.md).
 */
import type { History, Mark } from './columns.js'
import { readDump } from './dump.js'
import { type LineVisitor, visitLines } from './lines.js'
import { InputError, type InputProblem, PROBLEM_LIMIT } from './problems.js'
import { type Place, RecordReader } from './record-reader.js'
import type { ByteSource } from './source.js'
import { unitNs } from './time-text.js'
import { checkCounterValues, checkSessions } from './whole-history.js'

export interface ReadOptions {
  /** a dump of the store taken after the run, added as reads by a client of its own; the last of the files */
  readonly final?: ByteSource
  /** told now and then how many bytes (decompressed) have been read */
  onProgress?(bytes: number): void
}

/** A history read by skipping what is wrong with it. */
export interface TolerantReading {
  readonly history: History
  /** the first PROBLEM_LIMIT problems, by place */
  readonly problems: readonly InputProblem[]
  readonly problemCount: number
}

/**
 * Reads the files of one history, in the order given. Throws InputError with the first problems when anything is
 * wrong with it, an empty history included. O(bytes), plus a sort of each client's operations.
 */
export async function readHistory(
  sources: readonly ByteSource[],
  options: ReadOptions = {},
): Promise<History> {
  const { history, problems } = await readAll(sources, options, PROBLEM_LIMIT)
  if (problems.length > 0) throw new InputError(problems)
  return history
}

/** Reads on past what is wrong, leaving it out, for looking at a recording. A file that breaks off is a problem too. */
export async function readTolerantly(
  sources: readonly ByteSource[],
  options: ReadOptions = {},
): Promise<TolerantReading> {
  return readAll(sources, options, Number.POSITIVE_INFINITY)
}

async function readAll(
  sources: readonly ByteSource[],
  options: ReadOptions,
  limit: number,
): Promise<TolerantReading> {
  const reader = new RecordReader()
  const problems = new Problems(options.final ? [...sources, options.final] : sources, limit)
  let total = 0
  for (const [file, source] of sources.entries()) {
    if (problems.isFull) break
    const bytes = await readFile(reader, source, file, problems, (n) => {
      total += n
      options.onProgress?.(total)
    })
    const last = reader.builder.files[file]
    reader.builder.files[file] = { ...last, bytes: source.sizeBytes ?? bytes }
  }
  if (!problems.isFull) for (const problem of reader.splits.unopened()) problems.add(problem)
  if (options.final && !problems.isFull) {
    await readDump(reader.builder, options.final, (problem) => problems.add(problem))
  }
  const history = finish(reader)
  if (!problems.isFull) {
    const report = (make: () => InputProblem): void => problems.addMade(make)
    checkSessions(history, report)
    checkCounterValues(history, reader.headers.initial, report)
  }
  if (history.count === 0 && problems.count === 0) {
    problems.add({
      code: 'empty-history',
      file: sources.map((source) => source.name).join(', ') || '(no file)',
      found: 'no operations',
      expected: 'at least one: a check of nothing must not pass',
    })
  }
  return { history, problems: problems.sorted(), problemCount: problems.count }
}

async function readFile(
  reader: RecordReader,
  source: ByteSource,
  file: number,
  problems: Problems,
  onBytes: (n: number) => void,
): Promise<number> {
  const place: Place = { file, fileName: source.name, line: 0, lineStart: 0, first: true, unit: 'ns' }
  const { builder, scanner } = reader
  builder.files.push({ name: source.name, bytes: 0, unitNs: 1n, firstOperation: builder.count })
  let bytesRead = 0
  /** lines read whole */
  let lines = 0
  const visitor: LineVisitor = {
    line(bytes, from, to, line, terminated) {
      lines = line
      if (isBlank(bytes, from, to)) return true
      if (scanner.scan(bytes, from, to)) {
        place.line = line
        place.lineStart = from
        const problem = reader.read(place)
        place.first = false
        if (problem) problems.add(problem)
        return !problems.isFull
      }
      place.first = false
      const { code, at, expected } = scanner.failure
      if (!terminated && !isWholeJson(bytes, from, to)) {
        builder.warnings.push({
          code: 'torn-last-line',
          file: source.name,
          line,
          text: 'the last line is cut short and has no line end, as after a crash: it is set aside',
        })
        return true
      }
      problems.add({
        code,
        file: source.name,
        line,
        column: at - from + 1,
        found: foundAt(bytes, at, to),
        expected,
      })
      return !problems.isFull
    },
    tooLong(line) {
      lines = line
      place.first = false
      problems.add({
        code: 'line-too-long',
        file: source.name,
        line,
        found: 'a line of over 16 MiB',
        expected: 'one record a line, of at most 16 MiB',
      })
      return !problems.isFull
    },
  }
  try {
    await visitLines(source, visitor, (n) => {
      bytesRead += n
      onBytes(n)
    })
  } catch (error) {
    // What was read before it broke off counts, and so do the problems in it.
    if (!(error instanceof InputError)) throw error
    for (const problem of error.problems)
      problems.add(bytesRead > 0 ? { ...problem, line: lines + 1 } : problem)
  }
  const { name, firstOperation } = builder.files[file]
  builder.files[file] = { name, bytes: bytesRead, unitNs: unitNs(place.unit), firstOperation }
  return bytesRead
}

function finish({ builder, headers }: RecordReader): History {
  joinMarks(builder.marks)
  const initial = new Map<number, number>()
  if (headers.initial.size > 0) {
    for (let key = 0; key < builder.keys.size; key++) {
      const value = headers.initial.get(builder.keys.name(key))?.value
      if (value !== undefined) initial.set(key, value)
    }
  }
  return builder.finish({
    title: headers.title,
    clockErrorNs: headers.clockErrorNs,
    initial,
    initialUnknown: headers.initialUnknown ?? false,
  })
}

/** A recorder writes a mark when it begins and once more, with its end, when it is over: the first one goes. */
function joinMarks(marks: Mark[]): void {
  const name = ({ text, startNs }: Mark): string => `${startNs} ${text}`
  const spans = new Set(marks.filter(({ startNs, endNs }) => endNs > startNs).map(name))
  const kept = marks.filter((mark) => mark.endNs > mark.startNs || !spans.has(name(mark)))
  marks.splice(0, marks.length, ...kept)
}

/** Collects problems, keeps the first by place. */
class Problems {
  count = 0
  readonly #kept: InputProblem[] = []
  readonly #fileOrder: Map<string, number>
  readonly #limit: number

  constructor(sources: readonly ByteSource[], limit: number) {
    this.#fileOrder = new Map(sources.map((source, i) => [source.name, i]))
    this.#limit = limit
  }

  get isFull(): boolean {
    return this.count >= this.#limit
  }

  add(problem: InputProblem): void {
    this.addMade(() => problem)
  }

  /** Counts a problem, and makes it only if it is kept. */
  addMade(make: () => InputProblem): void {
    this.count++
    if (this.#kept.length < PROBLEM_LIMIT) this.#kept.push(make())
  }

  sorted(): InputProblem[] {
    const order = (p: InputProblem): number => this.#fileOrder.get(p.file) ?? -1
    return this.#kept.sort(
      (a, b) => order(a) - order(b) || (a.line ?? 0) - (b.line ?? 0) || (a.column ?? 0) - (b.column ?? 0),
    )
  }
}

function isBlank(bytes: Uint8Array, from: number, to: number): boolean {
  for (let i = from; i < to; i++)
    if (bytes[i] !== 0x20 && bytes[i] !== 0x09 && bytes[i] !== 0x0d) return false
  return true
}

/** Whether JSON that is no good record is JSON all the same: then it was not cut short. */
function isWholeJson(bytes: Uint8Array, from: number, to: number): boolean {
  try {
    JSON.parse(new TextDecoder().decode(bytes.subarray(from, to)))
    return true
  } catch {
    return false
  }
}

function foundAt(bytes: Uint8Array, at: number, to: number): string {
  if (at >= to) return 'the end of the line'
  const text = new TextDecoder().decode(bytes.subarray(at, Math.min(to, at + 24)))
  return JSON.stringify(text)
}

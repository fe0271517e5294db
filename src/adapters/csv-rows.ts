/**
 * Records of a CSV file (RFC 4180, with other delimiters and quotes where the mapping says so).
 */
import { type CsvError, parse } from 'csv-parse'
import type { InputProblem } from '../history/problems.js'
import type { ByteSource } from '../history/source.js'
import { didYouMean } from '../promises/nearest.js'
import { type JsonNode, stringNode } from './json-node.js'
import type { Mapping } from './mapping-file.js'
import { RecordLines } from './record-lines.js'
import type { Field, Row, RowVisitor } from './rows.js'
import type { FieldUse } from './sources.js'
import { textChunks } from './text-chunks.js'
import { quoted } from './trouble.js'

/** Longest record, in bytes. */
const RECORD_LIMIT = 16 * 1024 * 1024

/**
 * Reads the rows of a source. The first one names the columns unless the mapping does; a field of the mapping that
 * is no column is a problem of the mapping's.
 */
export async function readCsv(
  source: ByteSource,
  mapping: Mapping,
  uses: readonly FieldUse[],
  visitor: RowVisitor,
): Promise<void> {
  const { delimiter = ',', quote = '"', comment, columns: named } = mapping.spec.csv ?? {}
  const lines = new RecordLines(comment)
  let columns: Columns | undefined
  let isWanted = true
  const take = (cells: readonly string[], line: number): boolean => {
    if (columns && cells.length === columns.names.length) return visitor.row(new CsvRow(columns, cells, line))
    return visitor.problem({
      code: 'wrong-cells',
      file: source.name,
      line,
      found: `${cells.length} ${cells.length === 1 ? 'cell' : 'cells'}`,
      expected: `${columns?.names.length}, as many as columns`,
      advice: 'check quotes and the delimiter (csv: delimiter)',
    })
  }
  const learn = (names: readonly string[], line: number): boolean => {
    columns = new Columns(names)
    const problems = headProblems(names, line, source.name, mapping, uses)
    // Every row would be wrong in the same way.
    for (const problem of problems) visitor.problem(problem)
    return problems.length === 0
  }
  if (named && !learn(named, 1)) return
  const parser = parse({
    delimiter,
    quote,
    ...(comment === undefined ? {} : { comment, comment_no_infix: true }),
    relax_column_count: true,
    skip_empty_lines: true,
    max_record_size: RECORD_LIMIT,
    // Called within `write`, so that no row is lost where a later one is malformed.
    on_record(cells: string[], { bytes }) {
      const line = lines.take(bytes)
      if (isWanted) isWanted = columns ? take(cells, line) : learn(cells, line)
      return null
    },
  })
  const failed = new Promise<CsvError>((resolve) => parser.once('error', resolve))
  try {
    for await (const text of textChunks(source)) {
      const bytes = Buffer.from(text)
      lines.feed(bytes)
      await new Promise<void>((resolve) => parser.write(bytes, () => resolve()))
      if (parser.errored || !isWanted) break
      await visitor.pause()
    }
    if (!isWanted) return
    if (!parser.errored) {
      parser.resume()
      await Promise.race([failed, new Promise((resolve) => parser.end(resolve))])
    }
    if (!parser.errored) return
    const { code, message } = await failed
    const { found, expected } = TROUBLES[code] ?? { found: message, expected: 'CSV by RFC 4180' }
    visitor.problem({
      code: 'bad-csv',
      file: source.name,
      line: lines.open,
      found,
      expected,
      advice: 'check quotes and the delimiter (csv: delimiter, quote)',
    })
  } finally {
    parser.destroy()
  }
}

/** What the parser stumbles over, in the record that begins on the line told. */
const TROUBLES: Partial<Record<string, { found: string; expected: string }>> = {
  CSV_QUOTE_NOT_CLOSED: { found: 'a quote that is never closed', expected: 'its end' },
  INVALID_OPENING_QUOTE: {
    found: 'a quote inside a cell that does not begin with one',
    expected: 'the whole cell in quotes, and quotes in it doubled',
  },
  CSV_INVALID_CLOSING_QUOTE: {
    found: 'text after a quote that closes a cell',
    expected: 'the delimiter or the end of the line; quotes in a cell are doubled',
  },
  CSV_MAX_RECORD_SIZE: { found: 'a record of over 16 MiB', expected: 'records of at most 16 MiB' },
}

function headProblems(
  names: readonly string[],
  line: number,
  file: string,
  mapping: Mapping,
  uses: readonly FieldUse[],
): InputProblem[] {
  const problems: InputProblem[] = []
  const twice = names.find((name, i) => names.indexOf(name) !== i)
  if (twice !== undefined) {
    problems.push({
      code: 'column-twice',
      file,
      line,
      found: `two columns named ${quoted(twice)}`,
      expected: 'columns that are all named differently',
      advice: 'name them in the mapping (csv: columns) and pass the head over (skip)',
    })
  }
  for (const { fields, path } of uses) {
    if (fields.some(({ name }) => names.includes(name))) continue
    const [{ name }] = fields
    problems.push(
      mapping.problemAt(
        path,
        `${quoted(name)}, which is no column of ${file}`,
        `one of ${names.join(', ')}${didYouMean(name, names)}`,
      ),
    )
  }
  return problems
}

class Columns {
  readonly names: readonly string[]
  readonly #index: ReadonlyMap<string, number>

  constructor(names: readonly string[]) {
    this.names = names
    this.#index = new Map(names.map((name, i) => [name, i]))
  }

  /** The index of the column of a field, or -1. */
  of({ name }: Field): number {
    return this.#index.get(name) ?? -1
  }
}

class CsvRow implements Row {
  readonly line: number
  readonly #columns: Columns
  readonly #cells: readonly string[]

  constructor(columns: Columns, cells: readonly string[], line: number) {
    this.#columns = columns
    this.#cells = cells
    this.line = line
  }

  get(field: Field): JsonNode | undefined {
    const cell = this.#cells[this.#columns.of(field)]
    return cell === undefined || cell === '' ? undefined : stringNode(cell)
  }

  isEmpty(field: Field): boolean {
    return this.#cells[this.#columns.of(field)] === ''
  }

  all(): JsonNode {
    const members = this.#columns.names.map((name, i) => [name, stringNode(this.#cells[i])] as const)
    return { kind: 'object', members: new Map(members) }
  }
}

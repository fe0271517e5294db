/**
 * Records of a CSV file (RFC 4180, with other delimiters and quotes where the mapping says so).
 */
import { Readable } from 'node:stream'
import { CsvError, type Info, parse } from 'csv-parse'
import type { InputProblem } from '../history/problems.js'
import type { ByteSource } from '../history/source.js'
import { didYouMean } from '../promises/nearest.js'
import { type JsonNode, stringNode } from './json-node.js'
import type { Mapping } from './mapping-file.js'
import type { Field, Row, RowVisitor } from './rows.js'
import type { FieldUse } from './sources.js'
import { textChunks } from './text-chunks.js'
import { quoted } from './trouble.js'

/** Rows between two pauses. */
const PAUSE = 4096
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
  const parser = parse({
    delimiter,
    quote,
    ...(comment === undefined ? {} : { comment, comment_no_infix: true }),
    info: true,
    raw: true,
    relax_column_count: true,
    skip_empty_lines: true,
    max_record_size: RECORD_LIMIT,
  })
  const text = Readable.from(textChunks(source))
  text.on('error', (error) => parser.destroy(error))
  text.pipe(parser)
  let columns: Columns | undefined
  const take = (cells: readonly string[], line: number): boolean => {
    if (columns && cells.length === columns.names.length) return visitor.row(new CsvRow(columns, cells, line))
    return visitor.problem({
      code: 'wrong-cells',
      file: source.name,
      line,
      found: `${cells.length} cells`,
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
  let count = 0
  try {
    for await (const { record, info, raw } of parser as AsyncIterable<Parsed>) {
      // The reader counts to the record's last line.
      const line = info.lines - newlines(raw)
      if (!(columns ? take(record, line) : learn(record, line))) return
      if (++count % PAUSE === 0) await visitor.pause()
    }
  } catch (error) {
    if (!(error instanceof CsvError)) throw error
    visitor.problem({
      code: 'bad-csv',
      file: source.name,
      line: Number((error as { lines?: number }).lines ?? 1),
      found: error.message.replace(/^[^:]*: /, '').replace(/ at line .*/, ''),
      expected: 'CSV by RFC 4180',
      advice: 'check quotes and the delimiter (csv: delimiter, quote)',
    })
  } finally {
    text.destroy()
    parser.destroy()
  }
}

interface Parsed {
  readonly record: string[]
  readonly info: Info
  readonly raw: string
}

/** Line ends inside a record, whose own may stand at its end. */
function newlines(raw: string): number {
  return raw.replace(/^[\r\n]+|[\r\n]+$/g, '').split(/\r\n|\n|\r/).length - 1
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

/**
 * Spans of an OTLP/JSON export (opentelemetry-proto: ExportTraceServiceRequest as proto3 JSON, as the file exporter
 * of the OpenTelemetry specification writes it): one document, or one a line.
 *
 * Resource and scope come before their spans in all exports known; where they come after, the spans wait in memory.
 */
import type { ByteSource } from '../history/source.js'
import type { JsonNode } from './json-node.js'
import { JsonStream, StreamTrouble, type Waiting } from './json-stream.js'
import type { MappingFile } from './mapping-schema.js'
import { DATABASE_FIELDS } from './otlp-conventions.js'
import { described, labelOf, type Members, NO_MEMBERS, Span } from './otlp-span.js'
import type { RowVisitor } from './rows.js'
import { textChunks } from './text-chunks.js'
import { RowTrouble } from './trouble.js'

/** What the spans of one resource and scope share; undefined until it was read. */
interface Surroundings {
  resource: Members | undefined
  scope: Members | undefined
}

/** Reads the spans of a source. Counts those that the mapping does not ask for. */
export async function readSpans(
  source: ByteSource,
  options: MappingFile['otlp'],
  visitor: RowVisitor,
): Promise<void> {
  const stream = new JsonStream()
  const reader = new SpanReader(stream, source.name, options ?? {}, visitor)
  const steps = reader.documents()
  try {
    for await (const text of textChunks(source)) {
      stream.push(text)
      if (steps.next().done) return
      await visitor.pause()
    }
    stream.end()
    steps.next()
  } catch (error) {
    if (!(error instanceof StreamTrouble)) throw error
    if (error.isCut && reader.documentLine > 1 && reader.documentLine === error.line) {
      visitor.warning(
        error.line,
        'the last line is cut short, as after a crash: what is not whole in it is set aside',
      )
      return
    }
    visitor.problem({
      code: error.isCut ? 'cut-short' : 'not-json',
      file: source.name,
      line: error.line,
      found: error.found,
      expected: error.expected,
      ...(error.isCut ? { advice: 'export or copy the file again' } : {}),
    })
  }
}

/** Thrown when no more spans are wanted. */
const ENOUGH = Symbol('enough')

class SpanReader {
  /** line on which the document begins that is being read */
  documentLine = 1
  readonly #stream: JsonStream
  readonly #file: string
  readonly #kinds: ReadonlySet<string>
  readonly #database: boolean
  readonly #visitor: RowVisitor
  /** spans read before their resource or scope */
  #waiting: (() => void)[] = []

  constructor(
    stream: JsonStream,
    file: string,
    { kinds = ['client'], database = true }: NonNullable<MappingFile['otlp']>,
    visitor: RowVisitor,
  ) {
    this.#stream = stream
    this.#file = file
    this.#kinds = new Set(kinds)
    this.#database = database
    this.#visitor = visitor
  }

  *documents(): Waiting<void> {
    const stream = this.#stream
    try {
      while ((yield* stream.next()) !== '') {
        this.documentLine = stream.line
        yield* stream.object('an OTLP document', (name) =>
          name === 'resourceSpans'
            ? stream.array('resourceSpans', () => this.#resourceSpans())
            : this.#passOver(),
        )
      }
    } catch (error) {
      if (error !== ENOUGH) throw error
    }
  }

  *#resourceSpans(): Waiting<void> {
    const stream = this.#stream
    const shared: Surroundings = { resource: undefined, scope: undefined }
    yield* stream.object('an element of resourceSpans', (name) =>
      name === 'resource'
        ? this.#described(shared, 'resource')
        : name === 'scopeSpans' || name === 'instrumentationLibrarySpans'
          ? stream.array(name, () => this.#scopeSpans(shared))
          : this.#passOver(),
    )
    shared.resource ??= NO_MEMBERS
    this.#release()
  }

  *#scopeSpans(shared: Surroundings): Waiting<void> {
    const stream = this.#stream
    const own: Surroundings = { resource: shared.resource, scope: undefined }
    const surroundings = {
      get resource() {
        return shared.resource
      },
      get scope() {
        return own.scope
      },
    }
    yield* stream.object('an element of scopeSpans', (name) =>
      name === 'scope' || name === 'instrumentationLibrary'
        ? this.#described(own, 'scope')
        : name === 'spans'
          ? stream.array('spans', () => this.#span(surroundings))
          : this.#passOver(),
    )
    own.scope ??= NO_MEMBERS
    if (shared.resource) this.#release()
  }

  *#passOver(): Waiting<void> {
    yield* this.#stream.value()
  }

  *#described(into: Surroundings, what: 'resource' | 'scope'): Waiting<void> {
    yield* this.#stream.next()
    const { line } = this.#stream
    const node = yield* this.#stream.value()
    try {
      into[what] = described(node, what)
    } catch (error) {
      if (!(error instanceof RowTrouble)) throw error
      into[what] = NO_MEMBERS
      this.#report(error, line, '')
    }
  }

  *#span(surroundings: Readonly<Surroundings>): Waiting<void> {
    yield* this.#stream.next()
    const { line } = this.#stream
    const node = yield* this.#stream.value()
    if (surroundings.resource && surroundings.scope) this.#take(node, line, surroundings)
    else this.#waiting.push(() => this.#take(node, line, surroundings))
  }

  #release(): void {
    const waiting = this.#waiting
    this.#waiting = []
    for (const take of waiting) take()
  }

  #take(node: JsonNode, line: number, { resource, scope }: Readonly<Surroundings>): void {
    let span: Span
    try {
      span = new Span(node, line, resource ?? NO_MEMBERS, scope ?? NO_MEMBERS)
    } catch (error) {
      if (!(error instanceof RowTrouble)) throw error
      this.#report(error, line, labelOf(node))
      return
    }
    if (!this.#kinds.has(span.kind)) this.#visitor.passedOver(`of kind ${span.kind}`)
    else if (this.#database && !DATABASE_FIELDS.some((field) => span.get(field)))
      this.#visitor.passedOver('of no database (no db.system.name)')
    else if (!this.#visitor.row(span)) throw ENOUGH
  }

  #report({ code, found, expected }: RowTrouble, line: number, label: string): void {
    const isWanted = this.#visitor.problem({
      code,
      file: this.#file,
      line,
      found: label === '' ? found : `${found} (${label})`,
      expected,
    })
    if (!isWanted) throw ENOUGH
  }
}

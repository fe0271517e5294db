/**
 * Spans of an OTLP/JSON export (opentelemetry-proto: ExportTraceServiceRequest as proto3 JSON, as the file exporter
 * of the OpenTelemetry specification writes it): one document, or one a line.
 *
 * Resource and scope come before their spans in all exports known; where they come after, the spans wait in memory.
 */
import type { ByteSource } from '../history/source.js'
import { type JsonNode, jsonText, NULL, scalarText, stringNode } from './json-node.js'
import { JsonStream, StreamTrouble, type Waiting } from './json-stream.js'
import type { MappingFile } from './mapping-schema.js'
import { DATABASE_FIELDS } from './otlp-conventions.js'
import { type Field, lookUp, type Row, type RowVisitor } from './rows.js'
import { textChunks } from './text-chunks.js'
import { quoted, RowTrouble } from './trouble.js'

type Members = ReadonlyMap<string, JsonNode>
const NO_MEMBERS: Members = new Map()

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

const KINDS = ['unspecified', 'internal', 'server', 'client', 'producer', 'consumer']
const STATUSES = ['unset', 'ok', 'error']

/** Members of a span that fields name before its attributes. */
const OWN =
  /^(traceId|spanId|parentSpanId|traceState|name|kind|startTimeUnixNano|endTimeUnixNano|status|resource|scope|attributes)(\.|$)/

class Span implements Row {
  readonly line: number
  readonly label: string
  /** in words, lower case */
  readonly kind: string
  readonly #root: JsonNode
  readonly #attributes: JsonNode

  constructor(node: JsonNode, line: number, resource: Members, scope: Members) {
    this.line = line
    this.label = labelOf(node)
    if (node.kind !== 'object') throw new RowTrouble('bad-span', quoted(jsonText(node)), 'a span, an object')
    this.#attributes = { kind: 'object', members: attributes(node.members.get('attributes')) }
    this.kind = enumName(node.members.get('kind'), KINDS, 'SPAN_KIND_', 'kind')
    const status = node.members.get('status')
    const members = new Map<string, JsonNode>()
    for (const name of ['traceId', 'spanId', 'parentSpanId', 'traceState', 'name']) {
      const found = node.members.get(name)
      // proto3 JSON writes the empty text for an id that is not set.
      if (found && scalarText(found)) members.set(name, found)
    }
    members.set('kind', stringNode(this.kind))
    for (const name of ['startTimeUnixNano', 'endTimeUnixNano']) {
      const found = node.members.get(name)
      if (found) members.set(name, found)
    }
    members.set('status', { kind: 'object', members: statusMembers(status) })
    members.set('attributes', this.#attributes)
    members.set('resource', { kind: 'object', members: resource })
    members.set('scope', { kind: 'object', members: scope })
    this.#root = { kind: 'object', members }
  }

  get(field: Field): JsonNode | undefined {
    return lookUp(field.pointer || OWN.test(field.name) ? this.#root : this.#attributes, field)
  }

  isEmpty(): boolean {
    return false
  }

  all(): JsonNode {
    return this.#root
  }
}

function labelOf(node: JsonNode): string {
  const id = node.kind === 'object' ? node.members.get('spanId') : undefined
  return id ? `span ${scalarText(id) ?? jsonText(id)}` : 'a span without id'
}

function statusMembers(status: JsonNode | undefined): Members {
  const given = status?.kind === 'object' ? status.members : NO_MEMBERS
  const members = new Map([
    ['code', stringNode(enumName(given.get('code'), STATUSES, 'STATUS_CODE_', 'status'))],
  ])
  const message = given.get('message')
  if (message) members.set('message', message)
  return members
}

/** A value of a proto3 enum, by number or by name. */
function enumName(
  node: JsonNode | undefined,
  names: readonly string[],
  prefix: string,
  what: string,
): string {
  if (node === undefined || node.kind === 'null') return names[0]
  const text = scalarText(node) ?? ''
  const name = /^[0-9]$/.test(text) ? names[Number(text)] : text.replace(prefix, '').toLowerCase()
  if (name === undefined || !names.includes(name))
    throw new RowTrouble(
      'bad-span',
      `${what} ${quoted(jsonText(node))}`,
      `${what} 0 to ${names.length - 1} or ${prefix}…`,
    )
  return name
}

/** The attributes of a resource; name and version of a scope beside its attributes. */
function described(node: JsonNode, what: 'resource' | 'scope'): Members {
  if (node.kind === 'null') return NO_MEMBERS
  if (node.kind !== 'object') throw new RowTrouble('bad-span', quoted(jsonText(node)), `a ${what}, an object`)
  const members = new Map(attributes(node.members.get('attributes')))
  if (what === 'scope') {
    for (const name of ['name', 'version']) {
      const found = node.members.get(name)
      if (found) members.set(name, found)
    }
  }
  return members
}

/** A list of {"key":…,"value":{…}}. */
function attributes(node: JsonNode | undefined): Members {
  if (node === undefined || node.kind === 'null') return NO_MEMBERS
  if (node.kind !== 'array') throw new RowTrouble('bad-span', quoted(jsonText(node)), 'attributes, an array')
  const members = new Map<string, JsonNode>()
  for (const item of node.items) {
    const key = item.kind === 'object' ? item.members.get('key') : undefined
    if (item.kind !== 'object' || key?.kind !== 'string')
      throw new RowTrouble('bad-span', quoted(jsonText(item)), 'an attribute with key and value')
    if (members.has(key.text))
      throw new RowTrouble('bad-span', `the attribute ${quoted(key.text)} twice`, 'each attribute once')
    members.set(key.text, anyValue(item.members.get('value')))
  }
  return members
}

/** An AnyValue of OTLP as JSON; a 64-bit number is a string there. */
function anyValue(node: JsonNode | undefined): JsonNode {
  if (node === undefined || node.kind === 'null') return NULL
  if (node.kind !== 'object' || node.members.size > 1)
    throw new RowTrouble('bad-span', quoted(jsonText(node)), 'a value such as {"stringValue":"…"}')
  for (const [type, value] of node.members) {
    const result = Object.hasOwn(READERS, type) ? READERS[type](value) : undefined
    if (result) return result
    throw new RowTrouble(
      'bad-span',
      quoted(jsonText(node)),
      `one of ${Object.keys(READERS).join(', ')}, with a value of its type`,
    )
  }
  return NULL
}

const READERS: Record<string, (value: JsonNode) => JsonNode | undefined> = {
  stringValue: (value) => (value.kind === 'string' ? value : undefined),
  boolValue: (value) => (value.kind === 'boolean' ? value : undefined),
  intValue(value) {
    const text = value.kind === 'string' || value.kind === 'number' ? value.text : ''
    return /^-?(0|[1-9][0-9]*)$/.test(text) ? { kind: 'number', text } : undefined
  },
  // NaN and the infinities are strings in proto3 JSON, and stay strings.
  doubleValue: (value) => (value.kind === 'number' || value.kind === 'string' ? value : undefined),
  bytesValue: (value) => (value.kind === 'string' ? value : undefined),
  arrayValue(value) {
    const values = value.kind === 'object' ? value.members.get('values') : undefined
    if (value.kind !== 'object' || (values && values.kind !== 'array')) return undefined
    return { kind: 'array', items: values?.kind === 'array' ? values.items.map(anyValue) : [] }
  },
  kvlistValue(value) {
    if (value.kind !== 'object') return undefined
    return { kind: 'object', members: attributes(value.members.get('values')) }
  },
}

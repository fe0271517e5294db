/**
 * One span of an OTLP/JSON export as a record: its own members, its attributes, those of its resource and scope.
 * Shapes by opentelemetry-proto (trace.proto, common.proto) under the JSON mapping of proto3.
 */
import { type JsonNode, jsonText, NULL, scalarText, stringNode } from './json-node.js'
import { type Field, lookUp, type Row } from './rows.js'
import { quoted, RowTrouble } from './trouble.js'

export type Members = ReadonlyMap<string, JsonNode>
export const NO_MEMBERS: Members = new Map()

const KINDS = ['unspecified', 'internal', 'server', 'client', 'producer', 'consumer']
const STATUSES = ['unset', 'ok', 'error']

/** Members of a span that fields name before its attributes. */
const OWN =
  /^(traceId|spanId|parentSpanId|traceState|name|kind|startTimeUnixNano|endTimeUnixNano|status|resource|scope|attributes)(\.|$)/

export class Span implements Row {
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

/** How messages name a span. */
export function labelOf(node: JsonNode): string {
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
export function described(node: JsonNode, what: 'resource' | 'scope'): Members {
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

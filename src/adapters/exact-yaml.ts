/**
 * The JSON that a node of a YAML (or JSON) document stands for, with each number's own digits, and where nodes stand.
 */
import { type Document, isAlias, isMap, isScalar, isSeq, type Node } from 'yaml'
import { type JsonNode, NULL, parseJson } from './json-node.js'

/** Thrown for a node that is no JSON. `node` is the one at fault. */
export class YamlTrouble extends Error {
  readonly node: Node

  constructor(node: Node, expected: string) {
    super(expected)
    this.node = node
  }
}

/** The value of a node. Throws YamlTrouble for a number that JSON writes otherwise. */
export function exactJson(document: Document, node: Node | null | undefined): JsonNode {
  const found = resolved(document, node)
  if (!found) return NULL
  if (isMap(found)) {
    const members = found.items.map(
      ({ key, value }) => [nameOf(document, key as Node), exactJson(document, value as Node | null)] as const,
    )
    return { kind: 'object', members: new Map(members) }
  }
  if (isSeq(found))
    return { kind: 'array', items: found.items.map((item) => exactJson(document, item as Node | null)) }
  if (!isScalar(found)) throw new YamlTrouble(found, 'a value')
  const { value } = found
  if (value === null) return NULL
  if (typeof value === 'string') return { kind: 'string', text: value }
  if (typeof value === 'boolean') return { kind: 'boolean', text: value ? 'true' : 'false' }
  try {
    return parseJson(found.source ?? String(value))
  } catch {
    throw new YamlTrouble(found, 'a number as JSON writes it, such as 17 or -0.5')
  }
}

/** The node at a path of member names and indices, as far as it goes; and the key that names it, if one does. */
export function nodeAt(document: Document, path: readonly PropertyKey[]): { node: Node; key?: Node } {
  let node = resolved(document, document.contents as Node | null)
  let last: { node: Node; key?: Node } = { node: node! }
  for (const part of path) {
    if (isMap(node)) {
      const pair = node.items.find(({ key }) => nameOf(document, key as Node) === String(part))
      if (!pair) break
      node = resolved(document, pair.value as Node | null)
      last = { node: node ?? (pair.key as Node), key: pair.key as Node }
    } else if (isSeq(node)) {
      node = resolved(document, node.items[Number(part)] as Node | null)
      if (!node) break
      last = { node }
    } else break
  }
  return last
}

/** The name that a key node stands for; YAML's null, true and numbers by their own text. */
export function nameOf(document: Document, key: Node | null): string {
  const node = resolved(document, key)
  if (!isScalar(node)) return ''
  return typeof node.value === 'string' ? node.value : (node.source ?? String(node.value))
}

function resolved(document: Document, node: Node | null | undefined): Node | undefined {
  if (!node) return undefined
  return isAlias(node) ? node.resolve(document) : node
}

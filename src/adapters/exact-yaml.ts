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

/** Deeper, or larger once its aliases are followed, no mapping has a reason to be. */
const DEPTH_LIMIT = 100
const NODE_LIMIT = 100_000

/**
 * The value of a node. Throws YamlTrouble for a number that JSON writes otherwise, an alias of nothing, and what
 * aliases make endless.
 */
export function exactJson(document: Document, root: Node | null): JsonNode {
  let count = 0
  const value = (node: Node | null, depth: number): JsonNode => {
    const found = resolved(document, node)
    if (!found) {
      if (isAlias(node)) throw new YamlTrouble(node, 'the name of an anchor before it')
      return NULL
    }
    if (++count > NODE_LIMIT || depth > DEPTH_LIMIT)
      throw new YamlTrouble(node!, 'a mapping of sane size and depth')
    if (isMap(found)) {
      const members = found.items.map(
        (pair) => [nameOf(document, pair.key as Node), value(pair.value as Node | null, depth + 1)] as const,
      )
      return { kind: 'object', members: new Map(members) }
    }
    if (isSeq(found))
      return { kind: 'array', items: found.items.map((item) => value(item as Node | null, depth + 1)) }
    return scalar(found)
  }
  return value(root, 0)
}

function scalar(node: Node): JsonNode {
  if (!isScalar(node)) throw new YamlTrouble(node, 'a value')
  const { value } = node
  if (value === null) return NULL
  if (typeof value === 'string') return { kind: 'string', text: value }
  if (typeof value === 'boolean') return { kind: 'boolean', text: value ? 'true' : 'false' }
  try {
    return parseJson(node.source ?? String(value))
  } catch {
    throw new YamlTrouble(node, 'a number as JSON writes it, such as 17 or -0.5')
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

/**
 * Records of a foreign log, whatever its format: what a mapping is applied to.
 */
import type { InputProblem } from '../history/problems.js'
import type { JsonNode } from './json-node.js'

/** A field as a mapping names it, and as a path: names of members to be followed. */
export interface Field {
  /** as typed */
  readonly name: string
  /** the members of a JSON Pointer; undefined for a dotted path or the name of a column */
  readonly pointer?: readonly string[]
}

/** A record of a log. */
export interface Row {
  /** 1-based line on which it begins */
  readonly line: number
  /** how a message names it beside its line, such as a span's id */
  readonly label?: string
  /** What stands at a field; undefined where there is no such member, or the cell is empty (`isEmpty`). */
  get(field: Field): JsonNode | undefined
  /** Whether the field is there and is the empty text of a format that cannot tell empty from missing. */
  isEmpty(field: Field): boolean
  /** The whole record as an object. */
  all(): JsonNode
}

/** Takes the rows of a log as they are read. */
export interface RowVisitor {
  /** False: no more rows are wanted. */
  row(row: Row): boolean
  /** Something that is no usable row. False: no more rows are wanted. */
  problem(problem: InputProblem): boolean
  warning(line: number, text: string): void
  /** Counts records that are not asked for, by the reason. */
  passedOver(why: string): void
  /** Awaited now and then, so that what rows became can be written before there is more of it. */
  pause(): Promise<void>
}

/** Parses a field as mappings write it: a JSON Pointer (RFC 6901) where it begins with /. */
export function parseField(name: string): Field {
  if (!name.startsWith('/')) return { name }
  const pointer = name
    .slice(1)
    .split('/')
    .map((part) => part.replaceAll('~1', '/').replaceAll('~0', '~'))
  return { name, pointer }
}

/**
 * Follows a field in a JSON value. In a dotted path a member whose name has dots itself comes before the
 * members that the dots would part, the longest name first: `db.system` finds {"db.system":…} and {"db":{"system":…}}.
 */
export function lookUp(node: JsonNode, field: Field): JsonNode | undefined {
  if (field.pointer) {
    let found: JsonNode | undefined = node
    for (const name of field.pointer) {
      if (!found) return undefined
      found = member(found, name)
    }
    return found
  }
  return lookUpDotted(node, field.name)
}

function lookUpDotted(node: JsonNode, path: string): JsonNode | undefined {
  const whole = member(node, path)
  if (whole) return whole
  for (let dot = path.lastIndexOf('.'); dot > 0; dot = path.lastIndexOf('.', dot - 1)) {
    const child = member(node, path.slice(0, dot))
    const found = child && lookUpDotted(child, path.slice(dot + 1))
    if (found) return found
  }
  return undefined
}

function member(node: JsonNode, name: string): JsonNode | undefined {
  if (node.kind === 'object') return node.members.get(name)
  if (node.kind === 'array' && /^(0|[1-9][0-9]{0,8})$/.test(name)) return node.items[Number(name)]
  return undefined
}

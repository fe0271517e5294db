/**
 * What a mapping asks of a record: outcome rules, records to pass over, marks.
 */
import { canonicalNumber, parseDecimal } from '../history/decimal.js'
import { type JsonNode, scalarText, stringNode } from './json-node.js'
import type { ConditionSpec } from './mapping-schema.js'
import { parseField, type Row } from './rows.js'
import { type Compilation, exactAt } from './sources.js'

export type Condition = (row: Row) => boolean

/** The condition at a path of the mapping; all that it names must hold. */
export function compileCondition(
  compilation: Compilation,
  spec: ConditionSpec,
  path: readonly PropertyKey[],
): Condition {
  const { mapping } = compilation
  const inner = (spec.all ?? []).map((each, i) => compileCondition(compilation, each, [...path, 'all', i]))
  if (spec.field === undefined) {
    if (inner.length === 0 || hasTest(spec))
      compilation.refuse(path, 'no field', 'the field that is to be looked at')
    return (row) => inner.every((holds) => holds(row))
  }
  if (!hasTest(spec)) {
    compilation.refuse(path, 'no test', 'one of equals, in, matches and present')
  }
  const fields = [spec.field].flat().map(parseField)
  compilation.uses.push({ fields, path: [...path, 'field'] })
  const equals = exactAt(mapping, [...path, 'equals'])
  const among = exactAt(mapping, [...path, 'in'])
  const wanted = equals ? [equals] : among?.kind === 'array' ? among.items : undefined
  if (equals && among) compilation.refuse(path, 'equals and in', 'one of them')
  const tests = wanted?.map(equalTo)
  const pattern = spec.matches === undefined ? undefined : new RegExp(spec.matches, 'u')
  return (row) => {
    let found: JsonNode | undefined
    for (const field of fields) {
      found ??= row.get(field) ?? (row.isEmpty(field) ? stringNode('') : undefined)
    }
    if (spec.present !== undefined && isPresent(found) !== spec.present) return false
    if (tests && !(found && tests.some((test) => test(found)))) return false
    // A field that is not there matches nothing, not even a pattern of anything.
    const text = found && scalarText(found)
    if (pattern && (text === undefined || !pattern.test(text))) return false
    return inner.every((holds) => holds(row))
  }
}

function hasTest(spec: ConditionSpec): boolean {
  return [spec.equals, spec.in, spec.matches, spec.present].some((test) => test !== undefined)
}

function isPresent(node: JsonNode | undefined): boolean {
  return node !== undefined && node.kind !== 'null' && scalarText(node) !== ''
}

/** Numbers of a mapping equal numbers and texts of the same exact value; texts equal the same text. */
function equalTo(wanted: JsonNode): (found: JsonNode) => boolean {
  const text = scalarText(wanted)
  if (text === undefined) return (found) => found.kind === 'null'
  const number = wanted.kind === 'number' ? parseDecimal(text) : undefined
  if (!number) return (found) => scalarText(found) === text
  const canonical = canonicalNumber(number)
  return (found) => {
    const decimal = parseDecimal(scalarText(found) ?? '')
    return decimal !== undefined && canonicalNumber(decimal) === canonical
  }
}

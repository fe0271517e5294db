/**
 * Where a mapping says that something comes from, made ready to be asked of row after row.
 */
import { parseDecimal } from '../history/decimal.js'
import { type JsonNode, jsonText, parseJson, scalarText, stringNode } from './json-node.js'
import type { Mapping } from './mapping-file.js'
import type { SourceSpec } from './mapping-schema.js'
import { type Field, parseField, type Row } from './rows.js'
import { quoted, RowTrouble } from './trouble.js'

/** Something to be found in a row. */
export interface Source {
  /** undefined where nothing is there; throws RowTrouble where it is not what the mapping says */
  get(row: Row): JsonNode | undefined
  /** what stands there instead, for a message */
  missing(row: Row): string
}

/** Fields of which one must be there, and the member of the mapping that names them. */
export interface FieldUse {
  readonly fields: readonly Field[]
  readonly path: readonly PropertyKey[]
}

/** Collects what goes wrong, and the fields used, while a mapping is made ready. */
export interface Compilation {
  readonly mapping: Mapping
  readonly uses: FieldUse[]
  refuse(path: readonly PropertyKey[], found: string, expected: string, advice?: string): void
}

type Path = readonly PropertyKey[]

/** The exact value at a path of the mapping. */
export function exactAt(mapping: Mapping, path: Path): JsonNode | undefined {
  let node: JsonNode | undefined = mapping.exact
  for (const part of path) {
    if (node?.kind === 'object') node = node.members.get(String(part))
    else if (node?.kind === 'array') node = node.items[Number(part)]
    else return undefined
  }
  return node
}

/** The source that a mapping names at a path. `fallback`: what it means where it names none. */
export function compileSource(
  compilation: Compilation,
  spec: SourceSpec,
  path: Path,
  fallback?: Source,
): Source {
  if (typeof spec === 'string') {
    return spec.includes('{')
      ? templateSource(compilation, spec, path)
      : fieldSource(compilation, [parseField(spec)], path)
  }
  const given = (['field', 'template', 'constant'] as const).filter((name) => spec[name] !== undefined)
  if (given.length > 1 || (given.length === 0 && !fallback)) {
    compilation.refuse(
      path,
      given.length > 1 ? given.join(' and ') : 'no field',
      'one of field, template and constant',
    )
  }
  const { mapping } = compilation
  const constant = exactAt(mapping, [...path, 'constant'])
  const base =
    spec.field !== undefined
      ? fieldSource(compilation, [spec.field].flat().map(parseField), [...path, 'field'])
      : spec.template !== undefined
        ? templateSource(compilation, spec.template, [...path, 'template'])
        : constant
          ? { get: () => constant, missing: () => 'nothing' }
          : (fallback ?? NOTHING)
  const translate = exactAt(mapping, [...path, 'translate'])
  const pattern = spec.match === undefined ? undefined : new RegExp(spec.match, 'u')
  const empty =
    spec.empty === undefined || spec.empty === 'missing'
      ? undefined
      : spec.empty === null
        ? exactNull
        : stringNode('')
  const otherwise = exactAt(mapping, [...path, 'default'])
  const emptyAs = (translate?.kind === 'object' ? translate.members.get('') : undefined) ?? empty
  const fields = [spec.field ?? []].flat().map(parseField)
  return {
    get(row) {
      const found = base.get(row)
      if (found === undefined) {
        const isEmpty = emptyAs !== undefined && fields.some((field) => row.isEmpty(field))
        return isEmpty ? emptyAs : otherwise
      }
      const matched = pattern ? matchIn(found, pattern) : found
      if (matched === undefined) return otherwise
      if (translate?.kind === 'object') {
        const known = translate.members.get(scalarText(matched) ?? jsonText(matched))
        if (known) return known
      }
      return spec.as === undefined ? matched : converted(matched, spec.as)
    },
    missing: (row) => {
      const found = base.get(row)
      return found && pattern ? `${quoted(scalarText(found) ?? jsonText(found))}` : base.missing(row)
    },
  }
}

const exactNull: JsonNode = { kind: 'null' }
const NOTHING: Source = { get: () => undefined, missing: () => 'nothing' }

/** The first field that is there. */
export function fieldSource(compilation: Compilation, fields: readonly Field[], path: Path): Source {
  compilation.uses.push({ fields, path })
  return anyField(fields)
}

/** The first field that is there, wherever the format keeps it. */
export function anyField(fields: readonly Field[]): Source {
  const names = fields.map(({ name }) => name).join(' or ')
  return {
    get(row) {
      for (const field of fields) {
        const found = row.get(field)
        if (found) return found
      }
      return undefined
    },
    missing: (row) => (fields.some((field) => row.isEmpty(field)) ? `an empty ${names}` : `no ${names}`),
  }
}

/** Text with fields in braces; doubled braces stand for themselves. */
export function templateSource(compilation: Compilation, template: string, path: Path): Source {
  const parts: (string | Field)[] = []
  const rest = template.replace(/\{\{|\}\}|\{([^{}]+)\}|([^{}]+)/g, (whole, field, text) => {
    parts.push(field ? parseField(field) : (text ?? whole[0]))
    return ''
  })
  if (rest !== '') {
    compilation.refuse(
      path,
      quoted(template),
      'each field in a pair of braces, and braces of the text doubled',
    )
  }
  const fields = parts.filter((part) => typeof part !== 'string')
  for (const field of fields) compilation.uses.push({ fields: [field], path })
  return {
    get(row) {
      let text = ''
      for (const part of parts) {
        if (typeof part === 'string') text += part
        else {
          const found = row.get(part)
          if (found === undefined || found.kind === 'null') return undefined
          const scalar = scalarText(found)
          if (scalar === undefined) throw notScalar(found, `text or a number as ${part.name}`)
          text += scalar
        }
      }
      return stringNode(text)
    },
    missing(row) {
      const field = fields.find((field) => (row.get(field) ?? exactNull).kind === 'null')
      if (!field) return 'nothing'
      return row.get(field)
        ? `null as ${field.name}`
        : row.isEmpty(field)
          ? `an empty ${field.name}`
          : `no ${field.name}`
    },
  }
}

function matchIn(node: JsonNode, pattern: RegExp): JsonNode | undefined {
  const text = scalarText(node)
  const match = text === undefined ? null : pattern.exec(text)
  const found = match && (match.length > 1 ? match[1] : match[0])
  return found === null || found === undefined ? undefined : stringNode(found)
}

function converted(node: JsonNode, as: 'unchanged' | 'string' | 'number' | 'json'): JsonNode {
  if (as === 'unchanged' || node.kind === 'null') return node
  if (as === 'string') {
    const text = scalarText(node)
    if (text === undefined) throw notScalar(node, 'text')
    return stringNode(text)
  }
  if (as === 'number') {
    if (node.kind === 'number') return node
    if (node.kind === 'string' && parseDecimal(node.text)) return { kind: 'number', text: node.text }
    throw new RowTrouble(
      'ill-typed-field',
      quoted(scalarText(node) ?? jsonText(node)),
      'a number as JSON writes it, without blanks, signs of thousands or leading zeros',
      'as: string keeps the text as it stands',
    )
  }
  if (node.kind !== 'string') return node
  try {
    return parseJson(node.text)
  } catch {
    throw new RowTrouble(
      'not-json',
      quoted(node.text),
      'a text that holds JSON',
      'as: string keeps the text as it stands',
    )
  }
}

function notScalar(node: JsonNode, expected: string): RowTrouble {
  return new RowTrouble(
    'ill-typed-field',
    `${node.kind === 'array' ? 'an array' : 'an object'} ${quoted(jsonText(node))}`,
    expected,
    'name the member in it that is meant',
  )
}

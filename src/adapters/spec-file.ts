/**
 * Reads a file that people write (YAML or JSON) by its schema, and says where what is wrong with it stands.
 */
import { LineCounter, type Node, parseDocument } from 'yaml'
import { z } from 'zod'
import { InputError, type InputProblem, PROBLEM_LIMIT } from '../history/problems.js'
import { didYouMean } from '../promises/nearest.js'
import { exactJson, nodeAt, YamlTrouble } from './exact-yaml.js'
import type { JsonNode } from './json-node.js'

/** What was validated, and the same with every number's own digits. */
export interface SpecFile<T> {
  readonly file: string
  readonly spec: T
  readonly exact: JsonNode
  /** What is wrong with the member at a path, at its place. */
  problemAt(path: readonly PropertyKey[], found: string, expected: string, advice?: string): InputProblem
}

/**
 * Parses the text of such a file; `code` is that of its problems. Throws InputError with the place of each, and the
 * nearest right name for an unknown one.
 */
export function parseSpec<S extends z.ZodType>(
  text: string,
  file: string,
  schema: S,
  code: string,
): SpecFile<z.output<S>> {
  const lines = new LineCounter()
  const document = parseDocument(text, { lineCounter: lines, uniqueKeys: true })
  const problem = (offset: number, found: string, expected: string, advice?: string): InputProblem => {
    const { line, col } = lines.linePos(offset)
    return {
      code,
      file,
      line,
      column: col,
      found,
      expected,
      ...(advice === undefined ? {} : { advice }),
    }
  }
  if (document.errors.length > 0) {
    throw new InputError(
      document.errors
        .slice(0, PROBLEM_LIMIT)
        .map(({ pos, message }) =>
          problem(pos[0], message.split('\n')[0].replace(/ at line .*/, ''), 'YAML or JSON'),
        ),
    )
  }
  let exact: JsonNode
  try {
    exact = exactJson(document, document.contents as Node | null)
  } catch (error) {
    if (!(error instanceof YamlTrouble)) throw error
    throw new InputError([problem(offsetOf(error.node), quoted(text, error.node), error.message)])
  }
  const problemAt: SpecFile<unknown>['problemAt'] = (path, found, expected, advice) =>
    problem(offsetOf(nodeAt(document, path).node), found, expected, advice)
  const parsed = schema.safeParse(plain(exact))
  if (parsed.success) return { file, spec: parsed.data, exact, problemAt }
  const problems = parsed.error.issues.flatMap((issue) => explain(issue, [], schema)).slice(0, PROBLEM_LIMIT)
  throw new InputError(
    problems.map(({ path, unknown, expected }) => {
      const { node } = nodeAt(document, unknown === undefined ? path : [...path, unknown])
      const at = unknown === undefined ? node : (nodeAt(document, [...path, unknown]).key ?? node)
      const found = unknown === undefined ? shown(path, exact, quoted(text, node)) : JSON.stringify(unknown)
      return problem(offsetOf(at), found, expected)
    }),
  )
}

interface Complaint {
  readonly path: PropertyKey[]
  /** a member that is not known, of what stands at `path` */
  readonly unknown?: string
  readonly expected: string
}

/** What zod found, as what was expected where. */
function explain(issue: z.core.$ZodIssue, above: readonly PropertyKey[], schema: z.ZodType): Complaint[] {
  const path = [...above, ...issue.path]
  switch (issue.code) {
    case 'unrecognized_keys': {
      const names = namesAt(path, schema)
      return issue.keys.map((unknown) => ({
        path,
        unknown,
        expected: `${names.join(', ')}${didYouMean(unknown, names)}`,
      }))
    }
    case 'invalid_union': {
      if (issue.discriminator !== undefined && 'options' in issue)
        return [{ path, expected: (issue.options as unknown[]).map(String).join(', ') }]
      // The branch that was meant is the one that knows most of the members.
      const inside = issue.errors.filter(
        (branch) => !branch.some(({ code, path }) => code !== 'unrecognized_keys' && path.length === 0),
      )
      const strangers = (branch: z.core.$ZodIssue[]): number =>
        branch.reduce((sum, it) => sum + (it.code === 'unrecognized_keys' ? it.keys.length : 0), 0)
      const branch = inside.sort((a, b) => strangers(a) - strangers(b) || a.length - b.length)[0]
      if (branch) return branch.flatMap((inner) => explain(inner, path, schema))
      const wanted = issue.errors.flatMap((branch) => branch.map((inner) => wantedBy(inner)))
      return [{ path, expected: [...new Set(wanted)].join(' or ') }]
    }
    default:
      return [{ path, expected: wantedBy(issue) }]
  }
}

const NOUNS: Record<string, string> = {
  string: 'text',
  object: 'members of its own',
  record: 'members of its own',
  array: 'a list',
  boolean: 'true or false',
  number: 'a number',
  int: 'a whole number',
}

function wantedBy(issue: z.core.$ZodIssue): string {
  // A schema may say in its own words what it wants.
  if (issue.code === 'invalid_type')
    return issue.message.startsWith('Invalid input')
      ? (NOUNS[issue.expected] ?? issue.expected)
      : issue.message
  if (issue.code === 'invalid_value') return issue.values.map((value) => String(value)).join(', ')
  if (issue.code === 'too_small')
    return issue.origin === 'number' ? `${issue.minimum} or more` : 'something, not nothing'
  if (issue.code === 'too_big') return `at most ${issue.maximum}`
  if (issue.code === 'custom') return issue.message
  if (issue.code === 'invalid_union')
    return [...new Set(issue.errors.flatMap((branch) => branch.map(wantedBy)))].join(' or ')
  return issue.message
}

type Schema = { [name: string]: unknown }

/** The members that may stand at a path, from the published schema. */
function namesAt(path: readonly PropertyKey[], schema: z.ZodType): string[] {
  const root = z.toJSONSchema(schema, { io: 'input' }) as Schema
  let schemas = branches(root, root)
  for (const part of path) {
    schemas = schemas.flatMap(({ properties, items, additionalProperties }) => {
      const next =
        typeof part === 'number'
          ? items
          : ((properties as Schema | undefined)?.[String(part)] ?? additionalProperties)
      return typeof next === 'object' && next !== null ? branches(next as Schema, root) : []
    })
  }
  return [...new Set(schemas.flatMap(({ properties }) => Object.keys((properties ?? {}) as Schema)))]
}

/** The schemas that a schema stands for: those of a union, and the one that it refers to. */
function branches(schema: Schema, root: Schema): Schema[] {
  if (Array.isArray(schema.anyOf)) return (schema.anyOf as Schema[]).flatMap((each) => branches(each, root))
  if (typeof schema.$ref !== 'string') return [schema]
  const name = schema.$ref.replace('#/$defs/', '')
  return branches((root.$defs as Schema)[name] as Schema, root)
}

function plain(node: JsonNode): unknown {
  switch (node.kind) {
    case 'object':
      return Object.fromEntries(Array.from(node.members, ([name, value]) => [name, plain(value)]))
    case 'array':
      return node.items.map(plain)
    case 'number':
      return Number(node.text)
    case 'boolean':
      return node.text === 'true'
    case 'null':
      return null
    case 'string':
      return node.text
  }
}

/** What stands at a path: nothing where a member is missing. */
function shown(path: readonly PropertyKey[], root: JsonNode, text: string): string {
  let node: JsonNode | undefined = root
  for (const part of path) {
    node =
      node?.kind === 'object'
        ? node.members.get(String(part))
        : node?.kind === 'array'
          ? node.items[Number(part)]
          : undefined
    if (!node) return `no ${String(part)}`
  }
  return text
}

function offsetOf(node: Node | undefined): number {
  return node?.range?.[0] ?? 0
}

function quoted(text: string, node: Node | undefined): string {
  const [from, to] = node?.range ?? [0, 0]
  const line = text.slice(from, to).split('\n')[0]
  return line === '' ? 'nothing' : JSON.stringify(line.length > 40 ? `${line.slice(0, 40)}…` : line)
}

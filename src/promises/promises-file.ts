/**
 * A promises file (YAML or JSON): what the store or the application counts on, for which keys.
 */
import { isMap, isScalar, isSeq, LineCounter, type Node, type Pair, parseDocument, type YAMLMap } from 'yaml'
import { InputError, type InputProblem, PROBLEM_LIMIT } from '../history/problems.js'
import { didYouMean } from './nearest.js'
import { buildRequest, PromiseTrouble } from './parse-request.js'
import type { PromiseRequest } from './request.js'

/** Members of one promise that are no parameters. */
const MEMBERS = ['name', 'keys', 'promise', 'within', 'versions', 'settle']

/**
 * Parses the text of a promises file. Throws InputError with the line of each problem: unknown promises, members
 * and parameters (and the nearest right name), missing ones, equal names.
 */
export function parsePromisesFile(text: string, file: string): PromiseRequest[] {
  const lines = new LineCounter()
  const document = parseDocument(text, { lineCounter: lines, uniqueKeys: true })
  const problems: InputProblem[] = []
  const report = (offset: number, found: string, expected: string): void => {
    const { line, col } = lines.linePos(offset)
    problems.push({ code: 'bad-promises-file', file, line, column: col, found, expected })
  }
  for (const error of document.errors) {
    report(error.pos[0], error.message.split('\n')[0].replace(/ at line .*/, ''), 'YAML or JSON')
  }
  if (problems.length > 0) throw new InputError(problems.slice(0, PROBLEM_LIMIT))

  const requests: PromiseRequest[] = []
  const list = isMap(document.contents) ? document.contents.get('promises', true) : undefined
  if (!isSeq(list) || list.items.length === 0) {
    report(0, 'no list of promises', 'promises: and under it one entry a promise, with promise and keys')
  } else {
    for (const { key } of (document.contents as YAMLMap<Node>).items) {
      const name = isScalar(key) ? String(key.value) : 'a key that is no text'
      if (name !== 'promises')
        report(
          offsetOf(key),
          JSON.stringify(name),
          `promises and nothing beside it${didYouMean(name, ['promises'])}`,
        )
    }
    for (const item of list.items) {
      const request = parseEntry(item as Node, file, lines, report)
      if (!request) continue
      if (requests.some(({ name }) => name === request.name)) {
        report(
          offsetOf(item as Node),
          `a second promise named ${JSON.stringify(request.name)}`,
          'names that are all different',
        )
      }
      requests.push(request)
    }
  }
  if (problems.length > 0) throw new InputError(problems.slice(0, PROBLEM_LIMIT))
  return requests
}

type Report = (offset: number, found: string, expected: string) => void

function parseEntry(
  item: Node,
  file: string,
  lines: LineCounter,
  report: Report,
): PromiseRequest | undefined {
  if (!isMap(item)) {
    report(offsetOf(item), 'an entry that is no mapping', 'members such as promise, keys and name')
    return undefined
  }
  const members = new Map<string, string>()
  let isSound = true
  const refuse: Report = (offset, found, expected) => {
    isSound = false
    report(offset, found, expected)
  }
  for (const { key, value } of item.items as Pair<Node, Node | null>[]) {
    const name = isScalar(key) ? String(key.value) : ''
    if (!MEMBERS.includes(name)) {
      refuse(
        offsetOf(key),
        `the member ${JSON.stringify(name)}`,
        `${MEMBERS.join(', ')}${didYouMean(name, MEMBERS)}`,
      )
    } else if (!isScalar(value) || value.value === null || typeof value.value === 'boolean') {
      refuse(offsetOf(value ?? key), `no text as ${name}`, name === 'versions' ? 'a whole number' : 'text')
    } else members.set(name, typeof value.source === 'string' ? value.source : String(value.value))
  }
  const promise = members.get('promise')
  if (promise === undefined)
    refuse(offsetOf(item), 'an entry without promise', 'promise: and the name of one')
  if (!isSound || promise === undefined) return undefined
  const { line } = lines.linePos(offsetOf(item))
  const parameters = Object.fromEntries(
    [...members].filter(([name]) => !['name', 'keys', 'promise'].includes(name)),
  )
  try {
    const request = buildRequest(
      members.get('name') ?? promise,
      promise,
      parameters,
      members.get('keys') ?? '**',
    )
    return { ...request, place: { file, line } }
  } catch (error) {
    if (!(error instanceof PromiseTrouble)) throw error
    const at = (item.items as Pair<Node, Node>[]).find(({ key }) => isScalar(key) && key.value === 'promise')
    report(offsetOf(at?.value ?? item), error.message, 'a promise as docs/promises.md lists them')
    return undefined
  }
}

function offsetOf(node: Node | null | undefined | unknown): number {
  return (node as Node | null)?.range?.[0] ?? 0
}

/**
 * A result as text for a terminal. Pure: width, colour and limits come in from outside.
 */
import { FINDING_KINDS } from '../findings/kinds.js'
import type { PromiseResult, Result } from '../findings/result.js'
import { duration } from '../findings/telling.js'
import { type CauseGroup, groupFindings } from '../findings/telling-order.js'
import { tellMarks, tellUpheld } from './broken-keys.js'
import { tellGroup } from './finding-text.js'
import { Page } from './page.js'
import { counted, cut, thousands } from './printable.js'

export interface TextOptions {
  /** columns; below 60 counts as 60 */
  readonly width: number
  readonly colour: boolean
  /** most findings told */
  readonly limit: number
  /** the folder that the counterexamples were written to */
  readonly out?: string
}

const NAME_LENGTH = 80
/** Most undecided keys that are named. */
const UNDECIDED_SHOWN = 20

/** The report: what was read, the verdicts, the findings with their evidence, what stays open. */
export function textReport(result: Result, options: TextOptions): string {
  const page = new Page(options.width, options.colour)
  tellInput(page, result)
  for (const { file, line, text } of result.warnings) {
    const place = [file, line].filter((part) => part !== undefined).join(':')
    page.prose(cut(`${place && `${place}: `}${text}`, 1000), 'warning: ', page.colours.yellow)
  }
  page.blank()
  if (result.interrupted) {
    page.prose('Interrupted: keys that were not reached count as undecided.', '', page.colours.yellow)
  }
  for (const promise of result.promises) tellVerdict(page, promise)
  tellEveryKey(page, result)
  tellUpheld(page, result)
  tellMarks(page, result)
  tellFindings(page, result, options)
  tellUndecided(page, result)
  page.blank()
  page.prose(caveat(result), '', page.colours.dim)
  return page.toString()
}

function tellInput(page: Page, { inputs, history: h, onlyKeys }: Result): void {
  const files = inputs.map(({ file, bytes }) => `${cut(file, NAME_LENGTH)} (${counted(bytes, 'byte')})`)
  page.prose(files.join(', '), 'Read: ')
  if (h.title !== undefined) page.prose(cut(h.title, 200), 'Title: ')
  const kinds = list([
    [h.reads, 'read'],
    [h.writes, 'write'],
    [h.increments, 'increment'],
    [h.cas, 'cas', 'cas'],
    [h.deletes, 'delete'],
  ])
  page.prose(`${counted(h.operations, 'operation')}: ${kinds}`)
  const outcomes = `${thousands(h.acked)} acked, ${thousands(h.refused)} refused, ${thousands(h.unsure)} unsure`
  page.prose(`Outcomes: ${outcomes}`)
  const span = duration(BigInt(h.lastEnd) - BigInt(h.firstStart))
  const hosts = h.hosts > 0 ? counted(h.hosts, 'named host') : 'no named host: a clock each'
  page.prose(
    `${counted(h.clients, 'client')} (${hosts}), ${counted(h.keys, 'key')}, ${counted(h.marks, 'mark')}, over ${span}`,
  )
  page.prose(
    `Clock error assumed: ${duration(BigInt(h.clockErrorNs))} (${CLOCK_ERROR_FROM[h.clockErrorFrom]})`,
  )
  if (onlyKeys)
    page.prose(`Only keys that match: ${onlyKeys.map((glob) => cut(glob, NAME_LENGTH)).join(', ')}`)
}

const CLOCK_ERROR_FROM: Record<Result['history']['clockErrorFrom'], string> = {
  option: 'given for this check',
  headers: 'the largest that a header states',
  default: 'nobody stated one',
}

/** "3 reads, 2 writes", without those that there are none of. */
function list(parts: readonly (readonly [number, string, string?])[]): string {
  return parts
    .filter(([n]) => n > 0)
    .map(([n, one, many]) => counted(n, one, many))
    .join(', ')
}

function tellVerdict(page: Page, promise: PromiseResult): void {
  const { name, verdict, keys, holds, broken, undecided, leftOut, untested } = promise
  const { bold } = page.colours
  const paint = { holds: page.colours.green, broken: page.colours.red, undecided: page.colours.yellow }[
    verdict
  ]
  const on = keys === '**' ? '' : ` on ${cut(keys, NAME_LENGTH)}`
  page.line(`${bold(cut(name, NAME_LENGTH))}${on}: ${paint(bold(verdict))}`)
  const counts =
    holds === undefined
      ? []
      : [
          broken ? `broken on ${counted(broken, 'key')}` : '',
          undecided ? `undecided on ${counted(undecided, 'key')}` : '',
          `holds on ${counted(holds, 'key')}${untested ? ` (${thousands(untested)} of them untested: nothing there to test it on)` : ''}`,
        ]
  if (leftOut > 0) counts.push(`means nothing on ${counted(leftOut, 'key')}`)
  page.prose(counts.filter(Boolean).join(', '), '  ')
}

/** With --every-key the result lists keys that hold, too. */
function tellEveryKey(page: Page, { keys }: Result): void {
  if (!keys.some(({ verdicts }) => Object.values(verdicts).every((verdict) => verdict === 'holds'))) return
  page.blank()
  page.line(page.colours.bold('Keys'))
  for (const { key, kind, operations, verdicts, untested = [] } of keys) {
    const words = Object.entries(verdicts).map(
      ([name, verdict]) =>
        `${cut(name, NAME_LENGTH)} ${verdict}${untested.includes(name) ? ' untested' : ''}`,
    )
    page.prose(
      `${cut(key, NAME_LENGTH)}  ${kind}, ${counted(operations, 'operation')}: ${words.join(', ')}`,
      '  ',
    )
  }
}

function tellFindings(page: Page, { findings, findingCounts }: Result, options: TextOptions): void {
  if (findings.length === 0) return
  const counts = FINDING_KINDS.filter((kind) => findingCounts[kind]).map(
    (kind) => `${thousands(findingCounts[kind]!)} ${kind}`,
  )
  page.blank()
  page.prose(`${counted(findings.length, 'finding')}: ${counts.join(', ')}`, '', page.colours.bold)
  let left = options.limit
  for (const group of groupFindings(findings)) {
    if (left <= 0) break
    const shown = group.slice(0, left)
    left -= shown.length
    page.blank()
    tellGroup(page, shown as unknown as CauseGroup, options.out)
  }
  const told = toldCount(findings, options.limit)
  if (told === findings.length) return
  page.blank()
  page.prose(
    `${counted(findings.length - told, 'more finding')} not shown: raise --limit, or see them all with --format json.`,
  )
}

/** How many findings the first `limit` paragraphs tell. */
function toldCount(findings: Result['findings'], limit: number): number {
  return groupFindings(findings)
    .flat()
    .slice(0, limit)
    .reduce((n, paragraph) => n + paragraph.length, 0)
}

function tellUndecided(page: Page, { undecided }: Result): void {
  if (undecided.length === 0) return
  page.blank()
  page.line(page.colours.bold('Undecided'))
  const byReason = new Map<string, { keys: Set<string>; progress: string | undefined }>()
  for (const { key, promise, reason, progress } of undecided) {
    const text = `${promise}: ${reason}`
    const entry = byReason.get(text) ?? { keys: new Set(), progress }
    if (key !== undefined) entry.keys.add(key)
    byReason.set(text, entry)
  }
  for (const [text, { keys, progress }] of byReason) {
    const names = [...keys].slice(0, UNDECIDED_SHOWN).map((key) => cut(key, NAME_LENGTH))
    const more = keys.size > names.length ? ` and ${thousands(keys.size - names.length)} more` : ''
    page.prose(`${cut(text, 400)}${progress ? ` (${cut(progress, 200)})` : ''}`, '  ')
    if (names.length > 0) page.prose(`${counted(keys.size, 'key')}: ${names.join(', ')}${more}`, '    ')
  }
}

/** What the verdicts do not say. */
function caveat({ promises }: Result): string {
  return promises.some(({ verdict }) => verdict === 'holds')
    ? '"holds" speaks of this recording, not of the store: another run may show what this one did not.'
    : 'Verdicts speak of this recording, with the clock error assumed and every writer recorded; not of the store.'
}

/**
 * A result as Markdown (CommonMark with tables), to be pasted into a bug report. Whatever comes from the input is
 * escaped; timelines stand in code blocks.
 */
import type { Result } from '../findings/result.js'
import { duration } from '../findings/telling.js'
import { type CauseGroup, groupFindings } from '../findings/telling-order.js'
import { tellGroup } from './finding-text.js'
import { Page } from './page.js'
import { counted, cut, printable } from './printable.js'

/** Columns of a timeline: what trackers show without a scroll bar. */
const WIDTH = 76
const NAME_LENGTH = 80

/** The report; `limit`: most findings told. */
export function markdownReport(result: Result, { limit }: { readonly limit: number }): string {
  const { history: h, findings } = result
  const told = groupFindings(findings).slice(0, limit)
  return [
    '# What misread found',
    '',
    `Read: ${result.inputs.map(({ file }) => code(cut(file, NAME_LENGTH))).join(', ')}${h.title === undefined ? '' : `, ${text(cut(h.title, 200))}`}. ` +
      `${counted(h.operations, 'operation')} of ${counted(h.clients, 'client')} on ${counted(h.keys, 'key')}, clock error assumed ${duration(BigInt(h.clockErrorNs))}.`,
    '',
    '| promise | keys | verdict | broken | holds | undecided |',
    '| --- | --- | --- | --- | --- | --- |',
    ...result.promises.map(
      ({ name, keys, verdict, broken, holds, undecided }) =>
        `| ${text(cut(name, NAME_LENGTH))} | ${code(cut(keys, NAME_LENGTH))} | **${verdict}** | ${broken ?? ''} | ${holds ?? ''} | ${undecided ?? ''} |`,
    ),
    '',
    ...told.flatMap(tellCause),
    ...(told.length < groupFindings(findings).length
      ? [`${counted(findings.length, 'finding')} in all; the result (JSON) lists the others.`, '']
      : []),
    ...tellUndecided(result),
    '## How to check again',
    '',
    ...fenced(recheck(result), 'sh'),
    '',
    'Verdicts speak of this recording, with the clock error assumed and every writer recorded; `holds` does not speak of the store.',
    '',
  ].join('\n')
}

function tellCause(group: CauseGroup): string[] {
  const [[finding]] = group
  const where = finding.key ?? (finding.keys ?? []).join(', ')
  const page = new Page(WIDTH, false)
  tellGroup(page, group, undefined)
  return [
    `## ${finding.id}. ${finding.kind}: ${text(cut(where, NAME_LENGTH))}`,
    '',
    text(cut(finding.summary, 1200)),
    '',
    ...fenced(page.toString().trimEnd(), 'text'),
    '',
    'The records:',
    '',
    ...fenced(
      finding.operations
        .flatMap(({ record, closeRecord }) => (closeRecord === undefined ? [record] : [record, closeRecord]))
        .map((record) => cut(record, 1000))
        .join('\n'),
      'json',
    ),
    '',
  ]
}

function tellUndecided({ undecided }: Result): string[] {
  if (undecided.length === 0) return []
  return [
    '## Undecided',
    '',
    ...undecided
      .slice(0, 20)
      .map(
        ({ key, promise, reason }) =>
          `- ${key === undefined ? '' : `${code(cut(key, NAME_LENGTH))}: `}${text(cut(`${promise}: ${reason}`, 400))}`,
      ),
    ...(undecided.length > 20 ? [`- and ${undecided.length - 20} more`] : []),
    '',
  ]
}

/** A command line for a POSIX shell. */
function recheck({ inputs, promises, history, onlyKeys }: Result): string {
  const quoted = (word: string): string =>
    /^[\w@%+=:,./-]+$/.test(word) ? word : `'${printable(word).replaceAll("'", `'\\''`)}'`
  const words = ['npx', 'misread', 'check', ...inputs.map(({ file }) => quoted(file))]
  for (const { promise, parameters } of promises) {
    const typed = [promise, ...Object.entries(parameters).map(([name, value]) => `${name}=${value}`)].join(
      ' ',
    )
    words.push('--promise', quoted(typed))
  }
  for (const glob of onlyKeys ?? []) words.push('--keys', quoted(glob))
  if (history.clockErrorFrom === 'option') words.push('--clock-error', `${history.clockErrorNs}ns`)
  return words.join(' ')
}

/** Text of the input as Markdown text: whatever could mean something, there or at the start of a line, is escaped. */
function text(plain: string): string {
  return printable(plain)
    .replace(/[\\`*_{}[\]<>#|~!&@$]/g, '\\$&')
    .replace(
      /^(\s*)([-+=]|\d+(?=[.)]))/,
      (_, space, mark) => `${space}${/\d/.test(mark) ? `${mark}\\` : `\\${mark}`}`,
    )
}

/** Text of the input as a code span, its ticks longer than any in it. */
function code(plain: string): string {
  const safe = printable(plain).replaceAll('|', '\\|')
  const ticks = '`'.repeat(1 + longestRun(safe))
  return `${ticks} ${safe} ${ticks}`
}

function fenced(content: string, language: string): string[] {
  const fence = '`'.repeat(Math.max(3, 1 + longestRun(content)))
  return [`${fence}${language}`, content, fence]
}

function longestRun(content: string): number {
  return Math.max(0, ...[...content.matchAll(/`+/g)].map(([run]) => run.length))
}

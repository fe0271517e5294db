/**
 * The output that docs/rehearsal.md shows: of each rehearsal the summary, the verdict, the counts of the findings and
 * one finding, the first of the kind that the page has chosen.
 */
import { mkdtemp, rm } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { textReport } from '../../src/reports/text.js'
import { misread } from '../cli/in-process.js'
import { checked, named, play } from './play.js'

const BLOCK =
  /(rehearse --scenario ([a-z-]+) --seed (\d+) --out rehearsal\nnpx misread check rehearsal\/history\.ndjson\n```\n\n```text\n)([\s\S]*?)(\n```)/g
/** Operations of a finding that are shown; of more the last three. */
const OPERATIONS = 6

export interface Shown {
  readonly name: string
  readonly seed: number
  readonly text: string
}

/** What a page shows now. */
export function shownOn(page: string): Shown[] {
  return [...page.matchAll(BLOCK)].map(([, , name, seed, text]) => ({ name, seed: Number(seed), text }))
}

/** The page with what comes out today. */
export async function rewritten(page: string): Promise<string> {
  const texts = await Promise.all(shownOn(page).map(today))
  return page.replace(BLOCK, (_, before, _name, _seed, _text, after) => `${before}${texts.shift()}${after}`)
}

/** What comes out today, of the kind of finding that is shown. */
export async function today({ name, seed, text }: Shown): Promise<string> {
  const folder = await mkdtemp(join(tmpdir(), 'misread-page-'))
  const { out } = await misread([
    'rehearse',
    '--scenario',
    name,
    '--seed',
    String(seed),
    '--out',
    join(folder, 'out'),
  ])
  await rm(folder, { recursive: true })
  const summary = out.split('\n').slice(1)
  const excerpts = [summary.slice(0, summary.indexOf(''))]

  const { history } = play(named(name), seed)
  const result = await checked(history, 'linearizable', undefined, 'rehearsal/history.ndjson')
  const report = textReport(result, { width: 100, colour: false, limit: 1_000_000 }).split('\n')
  const verdict = report.findIndex((line) => line.startsWith('linearizable:'))
  excerpts.push(report.slice(verdict, verdict + 2))
  const kind = /^\[\d+\] ([a-z-]+) /m.exec(text)?.[1]
  if (kind !== undefined) {
    const counts = report.findIndex((line) => /^\d+ findings?: /.test(line))
    excerpts.push(report.slice(counts, report.indexOf('', counts)))
    excerpts.push(...finding(report, kind))
  }
  return excerpts.map((lines) => lines.join('\n')).join('\n…\n')
}

/** A finding without its chain. */
function finding(report: readonly string[], kind: string): string[][] {
  const from = report.findIndex((line) => line.startsWith('[') && line.includes(`] ${kind} `))
  if (from < 0) throw new Error(`the rehearsal shows no ${kind} any more: choose another kind or seed`)
  const end = report.findIndex((line, i) => i > from && line.startsWith('  Counterexample'))
  const lines = report.slice(from, end)
  const why = lines.findIndex((line) => /^ {2}(Why|Counted)/.test(line))
  const body = lines.slice(0, lines.lastIndexOf('', why))
  const starts = body.flatMap((line, i) => (/^ +\d+ +\+/.test(line) ? [i] : []))
  const last = lines.slice(lines.findIndex((line) => /^ {2}(It is still|No clock)/.test(line)))
  if (starts.length <= OPERATIONS) return [body, last]
  return [body.slice(0, starts[0] - 1), body.slice(starts[starts.length - 3]), last]
}

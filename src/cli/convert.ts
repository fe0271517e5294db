/**
 * `misread convert FILE...`: other logs into a history.
 */
import { type Conversion, convert } from '../adapters/convert.js'
import { type Mapping, parseMapping } from '../adapters/mapping-file.js'
import { formatProblem, InputError } from '../history/problems.js'
import { type ByteSource, fileSource } from '../history/source.js'
import { openSources, totalSize } from './check.js'
import type { ExitStatus } from './exit.js'
import { Progress } from './progress.js'
import { type Terminal, write } from './terminal.js'
import { WholeOutput } from './whole-output.js'

export interface ConvertOptions {
  mapping: string
  out?: string
  force?: boolean
}

/** Ends with 0, 2 for anything that cannot be used (a file is then not written), 130 when interrupted. */
export async function runConvert(
  files: readonly string[],
  { mapping: path, out, force = false }: ConvertOptions,
  terminal: Terminal,
): Promise<ExitStatus> {
  const progress = new Progress(terminal)
  let output: WholeOutput | undefined
  let isWritten = false
  try {
    const mapping = await readMapping(path)
    const sources = await openSources(files, terminal)
    if (out !== undefined && out !== '-') output = await WholeOutput.start(out, force, [...files, path])
    const conversion = await convert(watched(sources, progress), mapping, async (text) => {
      terminal.signal.throwIfAborted()
      isWritten = true
      await (output ? output.write(text) : write(terminal.out, text))
    })
    await output?.commit()
    progress.clear()
    await write(terminal.err, summary(conversion))
    return 0
  } catch (error) {
    progress.clear()
    await output?.discard()
    const fate =
      output || !isWritten ? 'nothing was written' : 'what was written to standard output is not whole'
    if (terminal.signal.aborted) {
      await write(terminal.err, `interrupted; ${fate}\n`)
      return 130
    }
    if (!(error instanceof InputError)) throw error
    const lines = error.problems.map((problem) => `error: ${formatProblem(problem)}\n`)
    await write(terminal.err, `${lines.join('')}${fate}\n`)
    return 2
  }
}

async function readMapping(path: string): Promise<Mapping> {
  const chunks: Uint8Array[] = []
  for await (const chunk of (await fileSource(path)).chunks()) chunks.push(new Uint8Array(chunk))
  return parseMapping(Buffer.concat(chunks).toString('utf8'), path)
}

/** The sources, with their progress shown. */
function watched(sources: readonly ByteSource[], progress: Progress): ByteSource[] {
  const total = totalSize(sources)
  let bytes = 0
  return sources.map((source) => ({
    name: source.name,
    async *chunks() {
      for await (const chunk of source.chunks()) {
        bytes += chunk.length
        progress.show('converting', bytes, total === undefined ? undefined : Math.max(bytes, total))
        yield chunk
      }
    },
  }))
}

/** What was done, and what a reader of the history should know of it. */
function summary(conversion: Conversion): string {
  const { operations, outcomes, marks, skipped, noRule, noEnd, mostLanes, passedOver, warnings } = conversion
  const lines = warnings.map(({ file, line, text }) => `warning: ${file}:${line}: ${text}`)
  const total = Object.values(operations).reduce((sum, count) => sum + count, 0)
  lines.push(`${counted(total, 'operation')} (${listed(operations)}; ${listed(outcomes)})`)
  if (marks > 0) lines[lines.length - 1] += `, ${counted(marks, 'mark')}`
  if (skipped > 0) lines.push(`${counted(skipped, 'record')} passed over by a rule of the mapping (skip)`)
  for (const [why, count] of passedOver) lines.push(`${counted(count, 'span')} passed over: ${why}`)
  if (noRule > 0) lines.push(`${counted(noRule, 'operation')} that no outcome rule fits: taken as unsure`)
  if (noEnd > 0)
    lines.push(`${counted(noEnd, 'operation')} answered by the rules but without an end: taken as unsure`)
  if (mostLanes !== undefined)
    lines.push(
      `clients split into at most ${counted(mostLanes, 'lane')} each: session promises speak of lanes, not of clients`,
    )
  return `${lines.join('\n')}\n`
}

function counted(count: number, noun: string): string {
  return `${count} ${noun}${count === 1 ? '' : 's'}`
}

function listed(counts: Readonly<Record<string, number>>): string {
  return Object.entries(counts)
    .filter(([, count]) => count > 0)
    .map(([name, count]) => `${count} ${name}`)
    .join(', ')
}

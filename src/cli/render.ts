/**
 * `misread render RESULT`: a saved result in another format.
 */
import type { Result } from '../findings/result.js'
import { jsonReport } from '../reports/json.js'
import { ndjsonReport } from '../reports/ndjson.js'
import { textReport } from '../reports/text.js'
import type { ExitStatus } from './exit.js'
import { readResult } from './read-result.js'
import { type Terminal, write } from './terminal.js'

export const RESULT_FORMATS = ['text', 'json', 'ndjson', 'markdown', 'junit'] as const
export type ResultFormat = (typeof RESULT_FORMATS)[number]

export interface FormatOptions {
  readonly limit: number
  readonly width: number
  readonly colour: boolean
  /** the folder that counterexamples were written to */
  readonly out?: string
}

/** A result in a format. */
export async function formatted(
  result: Result,
  format: ResultFormat,
  options: FormatOptions,
): Promise<string> {
  switch (format) {
    case 'json':
      return jsonReport(result)
    case 'ndjson':
      return ndjsonReport(result)
    case 'markdown':
      return (await import('../reports/markdown.js')).markdownReport(result, options)
    case 'junit':
      return (await import('../reports/junit.js')).junitReport(result)
    case 'text':
      return textReport(result, options)
  }
}

export async function runRender(
  path: string,
  { format, limit }: { format: ResultFormat; limit: number },
  terminal: Terminal,
): Promise<ExitStatus> {
  const { width, colour } = terminal
  await write(terminal.out, await formatted(await readResult(path), format, { limit, width, colour }))
  return 0
}

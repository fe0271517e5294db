/**
 * `misread compare OLD NEW`: findings that are new, gone or still there between two results.
 */
import { type Comparison, compareResults } from '../findings/compare.js'
import { compareText } from '../reports/compare-text.js'
import { VERSION } from '../version.js'
import type { ExitStatus } from './exit.js'
import { readResult } from './read-result.js'
import { type Terminal, write } from './terminal.js'

/** 1 only for new findings. */
export async function runCompare(
  old: string,
  now: string,
  options: { format: 'text' | 'json' },
  terminal: Terminal,
): Promise<ExitStatus> {
  const comparison: Comparison = {
    ...compareResults(await readResult(old), await readResult(now)),
    misread: VERSION,
  }
  const text =
    options.format === 'json' ? `${JSON.stringify(comparison, null, 1)}\n` : compareText(comparison, terminal)
  await write(terminal.out, text)
  return comparison.exit
}

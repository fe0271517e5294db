/**
 * `misread freshness FILE...`: how fresh the reads were.
 */
import { join } from 'node:path'
import type { Freshness } from '../freshness/figures.js'
import { type GroupBy, measureFreshness } from '../freshness/measure.js'
import { readHistory } from '../history/read.js'
import { freshnessCsv } from '../reports/freshness-csv.js'
import { freshnessSvg } from '../reports/freshness-svg.js'
import { freshnessText } from '../reports/freshness-text.js'
import { VERSION } from '../version.js'
import { checkGlobs, openSources, totalSize } from './check.js'
import type { ExitStatus } from './exit.js'
import { Progress } from './progress.js'
import { type Terminal, write } from './terminal.js'
import { prepareFolder, writeWhole } from './write-files.js'

export interface FreshnessOptions {
  keys?: string[]
  by?: GroupBy
  clockError?: bigint
  format: 'text' | 'json' | 'csv' | 'svg'
  out?: string
  force?: boolean
}

export async function runFreshness(
  files: readonly string[],
  options: FreshnessOptions,
  terminal: Terminal,
): Promise<ExitStatus> {
  if (options.out !== undefined) await prepareFolder(options.out, options.force ?? false)
  const sources = await openSources(files, terminal)
  const progress = new Progress(terminal)
  const total = totalSize(sources)
  const history = await readHistory(sources, {
    onProgress: (bytes) =>
      progress.show('reading', bytes, total === undefined ? undefined : Math.max(bytes, total)),
  })
  if (options.keys) checkGlobs(history, options.keys, () => '--keys')
  const freshness: Freshness = {
    freshness: 1,
    misread: VERSION,
    ...measureFreshness(history, {
      ...(options.clockError === undefined ? {} : { clockErrorNs: options.clockError }),
      ...(options.keys ? { keys: options.keys } : {}),
      ...(options.by ? { by: options.by } : {}),
    }),
  }
  progress.clear()
  const formats = {
    text: () => freshnessText(freshness, terminal),
    json: () => `${JSON.stringify(freshness, null, 1)}\n`,
    csv: () => freshnessCsv(freshness),
    svg: () => freshnessSvg(freshness.groups[0]),
  }
  if (options.out !== undefined) {
    await writeWhole(join(options.out, 'freshness.json'), formats.json())
    await writeWhole(join(options.out, 'freshness.csv'), formats.csv())
    await writeWhole(join(options.out, 'freshness.svg'), formats.svg())
    await writeWhole(
      join(options.out, 'freshness.txt'),
      freshnessText(freshness, { width: 100, colour: false }),
    )
  }
  await write(terminal.out, formats[options.format]())
  return 0
}

/**
 * `misread check FILE...`: decide promises; findings; counterexamples.
 */
import { join } from 'node:path'
import type { Budget } from '../deciders/search/budget.js'
import { check } from '../findings/check.js'
import { compareResults } from '../findings/compare.js'
import type { Result } from '../findings/result.js'
import type { History } from '../history/columns.js'
import { readHistory } from '../history/read.js'
import { type ByteSource, fileSource, standardInputSource } from '../history/source.js'
import { keyGlob } from '../promises/glob.js'
import { didYouMean } from '../promises/nearest.js'
import { PromiseTrouble, parsePromise } from '../promises/parse-request.js'
import type { PromiseRequest } from '../promises/request.js'
import { compareText } from '../reports/compare-text.js'
import { jsonReport } from '../reports/json.js'
import { textReport } from '../reports/text.js'
import { CertificateFile } from './certificate-file.js'
import { sha256Of } from './digests.js'
import { type ExitStatus, UsageError } from './exit.js'
import type { BudgetOption } from './options.js'
import { Progress } from './progress.js'
import { readResult } from './read-result.js'
import { formatted, type ResultFormat } from './render.js'
import { type Terminal, write } from './terminal.js'
import { prepareFolder, writeWhole } from './write-files.js'

export interface CheckOptions {
  promise?: string[]
  promises?: string
  clockError?: bigint
  keys?: string[]
  budget?: BudgetOption
  format: ResultFormat
  out?: string
  certificate?: string
  force?: boolean
  everyKey?: boolean
  baseline?: string
  final?: string
  limit: number
}

export async function runCheck(
  files: readonly string[],
  options: CheckOptions,
  terminal: Terminal,
): Promise<ExitStatus> {
  // A promises file alone does not ask for linearizable; with --promise both count.
  const typed = options.promise ?? (options.promises === undefined ? ['linearizable'] : [])
  const promises = distinct([...requests(typed), ...(await promisesFrom(options.promises))])
  const baseline = options.baseline === undefined ? undefined : await readResult(options.baseline)
  if (options.out !== undefined) await prepareFolder(options.out, options.force ?? false)
  const sources = await openSources(files, terminal)
  const [final] = options.final === undefined ? [] : await openSources([options.final], terminal)
  const progress = new Progress(terminal)
  const total = totalSize(sources)
  const history = await readHistory(sources, {
    ...(final ? { final } : {}),
    onProgress: (bytes) =>
      progress.show('reading', bytes, total === undefined ? undefined : Math.max(bytes, total)),
  })
  if (options.keys) checkGlobs(history, options.keys, () => '--keys')
  for (const { keys, place } of promises) {
    if (keys !== '**')
      checkGlobs(history, [keys], () => (place ? `${place.file}:${place.line}` : '--promise'))
  }
  const certificate =
    options.certificate === undefined
      ? undefined
      : await CertificateFile.start(options.certificate, options.force ?? false, history, {
          promises,
          ...(options.clockError === undefined ? {} : { clockErrorNs: options.clockError }),
          ...(options.keys ? { keys: options.keys } : {}),
          newBudget: () => budgetOf(options.budget),
        })
  const { result, counterexamples } = await check(history, final ? [...sources, final] : sources, {
    promises,
    ...(options.clockError === undefined ? {} : { clockErrorNs: options.clockError }),
    ...(options.keys ? { keys: options.keys } : {}),
    everyKey: options.everyKey ?? false,
    counterexamples: options.out === undefined ? 0 : options.limit,
    newBudget: () => budgetOf(options.budget),
    onProgress: (done, all, searched) =>
      progress.show(searched === undefined ? 'deciding' : 'searching', done, all),
    signal: terminal.signal,
    ...(certificate ? certificate.listeners : {}),
  }).catch(async (error) => {
    await certificate?.discard()
    throw error
  })
  await certificate?.commit()
  progress.clear()
  if (options.out !== undefined) {
    const complete = await withDigests(result)
    for (const { path, text } of counterexamples) await writeWhole(join(options.out, path), text)
    await writeWhole(join(options.out, 'result.json'), jsonReport(complete))
    const report = textReport(complete, { width: 100, colour: false, limit: options.limit, out: options.out })
    await writeWhole(join(options.out, 'report.txt'), report)
    const shape = { limit: options.limit, width: 100, colour: false }
    await writeWhole(join(options.out, 'report.md'), await formatted(complete, 'markdown', shape))
    await writeWhole(join(options.out, 'junit.xml'), await formatted(complete, 'junit', shape))
  }
  const { width, colour } = terminal
  const { out, limit, format } = options
  const shown = await formatted(result, format, {
    width,
    colour,
    limit,
    ...(out === undefined ? {} : { out }),
  })
  await write(terminal.out, shown)
  if (!baseline || result.exit === 130) return result.exit
  const comparison = compareResults(baseline, result)
  await write(terminal.err, compareText({ ...comparison, misread: result.misread }, terminal))
  if (comparison.exit === 1) return 1
  return result.undecided.length > 0 ? 3 : 0
}

/** Time on this machine's clock, or steps; 10 s where nothing is said. */
function budgetOf(option: BudgetOption = { ns: 10_000_000_000n }): Budget {
  if ('steps' in option) return option
  const until = process.hrtime.bigint() + option.ns
  return { steps: Number.POSITIVE_INFINITY, isSpent: () => process.hrtime.bigint() > until }
}

/** The promises as typed. Equal names are an error: the result tells them apart by name. */
function requests(typed: readonly string[]): PromiseRequest[] {
  const promises: PromiseRequest[] = []
  for (const text of typed) {
    try {
      promises.push(parsePromise(text))
    } catch (error) {
      throw error instanceof PromiseTrouble ? new UsageError(`--promise: ${error.message}`) : error
    }
  }
  return promises
}

/** Equal names are an error: the result tells promises apart by name. */
function distinct(promises: PromiseRequest[]): PromiseRequest[] {
  const names = promises.map(({ name }) => name)
  const twice = names.find((name, i) => names.indexOf(name) !== i)
  if (twice !== undefined) throw new UsageError(`the promise ${JSON.stringify(twice)} is asked for twice`)
  return promises
}

async function promisesFrom(path: string | undefined): Promise<PromiseRequest[]> {
  if (path === undefined) return []
  const { parsePromisesFile } = await import('../promises/promises-file.js')
  const chunks: Uint8Array[] = []
  for await (const chunk of (await fileSource(path)).chunks()) chunks.push(new Uint8Array(chunk))
  return parsePromisesFile(Buffer.concat(chunks).toString('utf8'), path)
}

/** A glob that no key matches is a mistake: a check of nothing must not pass. */
export function checkGlobs(history: History, globs: readonly string[], where: () => string): void {
  for (const glob of globs) {
    const matches = keyGlob(glob)
    let any = false
    for (let k = 0; k < history.keys.size && !any; k++) any = matches(history.keys.name(k))
    if (any) continue
    const names = Array.from({ length: Math.min(history.keys.size, 10_000) }, (_, k) => history.keys.name(k))
    throw new UsageError(`${where()}: no key matches ${JSON.stringify(glob)}${didYouMean(glob, names)}`)
  }
}

/** The sources of the files on the command line, `-` being standard input. */
export function openSources(files: readonly string[], terminal: Terminal): Promise<ByteSource[]> {
  const twice = files.find((file, i) => files.indexOf(file) !== i)
  if (twice !== undefined) throw new UsageError(`${twice} is named twice`)
  return Promise.all(
    files.map((file) =>
      file === '-' ? standardInputSource(terminal.input as NodeJS.ReadStream) : fileSource(file),
    ),
  )
}

export function totalSize(sources: readonly ByteSource[]): number | undefined {
  let total = 0
  for (const { sizeBytes } of sources) {
    if (sizeBytes === undefined) return undefined
    total += sizeBytes
  }
  return total
}

/** Adds the SHA-256 of each input file. */
async function withDigests(result: Result): Promise<Result> {
  const inputs = []
  for (const input of result.inputs) {
    inputs.push(input.file === '-' ? input : { ...input, sha256: await sha256Of(input.file) })
  }
  return { ...result, inputs }
}

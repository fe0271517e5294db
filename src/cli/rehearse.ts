/**
 * `misread rehearse`: a history of a simulated store, and the truth beside it.
 */
import { mkdir } from 'node:fs/promises'
import { join } from 'node:path'
import { stringify } from 'yaml'
import { formatProblem, InputError } from '../history/problems.js'
import { fileSource } from '../history/source.js'
import { didYouMean } from '../promises/nearest.js'
import { rehearse } from '../rehearsal/rehearse.js'
import { contradictions, parseScenario } from '../rehearsal/scenario-file.js'
import type { Scenario } from '../rehearsal/scenario-schema.js'
import { SCENARIOS } from '../rehearsal/scenarios.js'
import type { Account } from '../rehearsal/truth-schema.js'
import { type ExitStatus, UsageError } from './exit.js'
import { Progress } from './progress.js'
import { type Terminal, write } from './terminal.js'
import { WholeOutput } from './whole-output.js'

export interface RehearseOptions {
  scenario?: string
  seed: number
  lasts?: bigint
  out?: string
  gzip?: boolean
  force?: boolean
  list?: boolean
  print?: boolean
}

/** Ends with 0, 2 for anything that cannot be used, 130 when interrupted: then nothing is written. */
export async function runRehearse(options: RehearseOptions, terminal: Terminal): Promise<ExitStatus> {
  if (options.list) {
    await write(terminal.out, listed())
    return 0
  }
  if (options.scenario === undefined)
    throw new UsageError('which scenario? Name one or a file with --scenario; --list shows those with names')
  const { text, file } = await scenarioText(options.scenario)
  let scenario: Scenario
  try {
    scenario = lasting(parseScenario(text, file), options.lasts)
  } catch (error) {
    if (!(error instanceof InputError)) throw error
    const lines = error.problems.map((problem) => `error: ${formatProblem(problem)}\n`)
    await write(terminal.err, `${lines.join('')}nothing was written\n`)
    return 2
  }
  if (options.print) {
    await write(terminal.out, text)
    return 0
  }
  if (options.out === undefined) throw new UsageError('where to? Name a folder with --out')
  return play(scenario, text, file, { ...options, out: options.out }, terminal)
}

async function play(
  scenario: Scenario,
  text: string,
  name: string,
  { out, seed, gzip = false, force = false, lasts }: RehearseOptions & { out: string },
  terminal: Terminal,
): Promise<ExitStatus> {
  const progress = new Progress(terminal)
  const outputs: WholeOutput[] = []
  const start = async (file: string): Promise<WholeOutput> => {
    const output = await WholeOutput.start(join(out, file), force, [name])
    outputs.push(output)
    return output
  }
  try {
    await makeFolder(out)
    const file = gzip ? 'history.ndjson.gz' : 'history.ndjson'
    const history = await start(file)
    const truth = await start('truth.ndjson')
    const copy = await start('scenario.yaml')
    const run = rehearse(scenario, seed, (time, end) => progress.show('rehearsing', Math.min(time, end), end))
    let step = run.next()
    for (; !step.done; step = run.next()) {
      terminal.signal.throwIfAborted()
      await history.write(step.value.history)
      await truth.write(step.value.truth)
      // A turn for others, the signal that stops it among them.
      await new Promise((resolve) => setImmediate(resolve))
    }
    const further = lasts === undefined ? '' : `, lasting ${Number(lasts) / 1e9}s`
    await copy.write(`# played with seed ${seed}${further}\n${text}`)
    for (const output of outputs) await output.commit()
    progress.clear()
    await write(terminal.out, summary(scenario.title, step.value, seed, out, file))
    return 0
  } catch (error) {
    progress.clear()
    for (const output of outputs) await output.discard()
    if (!terminal.signal.aborted) throw error
    await write(terminal.err, 'interrupted; nothing was written\n')
    return 130
  }
}

/** The text of a scenario by its name, or of a file. */
async function scenarioText(name: string): Promise<{ text: string; file: string }> {
  const known = SCENARIOS.find((scenario) => scenario.name === name)
  if (known) return { text: `# ${known.about}\n${stringify(known.text)}`, file: name }
  if (!/[./\\]/.test(name)) {
    const names = SCENARIOS.map((scenario) => scenario.name)
    throw new UsageError(
      `no scenario is named ${JSON.stringify(name)}${didYouMean(name, names)} (--list shows them; a file has a dot or a slash in its name)`,
    )
  }
  const chunks: Uint8Array[] = []
  for await (const chunk of (await fileSource(name)).chunks()) chunks.push(new Uint8Array(chunk))
  return { text: Buffer.concat(chunks).toString('utf8'), file: name }
}

/** The scenario with another length. Throws UsageError where its faults do not fit in. */
function lasting(scenario: Scenario, lasts: bigint | undefined): Scenario {
  if (lasts === undefined) return scenario
  if (lasts > 7n * 24n * 3600n * 1_000_000_000n) throw new UsageError('--lasts: expected at most 168h')
  const longer = { ...scenario, workload: { ...scenario.workload, lasts: Number(lasts) } }
  for (const { found, expected } of contradictions(longer))
    throw new UsageError(`--lasts: found ${found}, expected ${expected}`)
  return longer
}

async function makeFolder(path: string): Promise<void> {
  try {
    await mkdir(path, { recursive: true })
  } catch (error) {
    throw new UsageError(`cannot make the folder ${path}: ${(error as Error).message}`)
  }
}

function listed(): string {
  const width = Math.max(...SCENARIOS.map(({ name }) => name.length))
  return SCENARIOS.map(({ name, about }) => `${name.padEnd(width)}  ${about}\n`).join('')
}

function summary(
  title: string,
  { operations, outcomes, hits }: Account,
  seed: number,
  out: string,
  file: string,
): string {
  const number = (n: number): string => n.toLocaleString('en-US')
  const lines = [
    `${title}, seed ${seed}`,
    `${number(operations)} operations: ${number(outcomes.acked)} acked, ${number(outcomes.refused)} refused, ${number(outcomes.unsure)} unsure`,
  ]
  if (hits.length === 0) lines.push('Nothing befell them.')
  else {
    const width = Math.max(...hits.map(({ count }) => number(count).length))
    const effects = Math.max(...hits.map(({ effect }) => effect.length))
    lines.push('What befell them, and why:')
    for (const { effect, cause, count } of hits)
      lines.push(`  ${number(count).padStart(width)}  ${effect.padEnd(effects)}  ${cause}`)
  }
  lines.push(
    '',
    `Written to ${out}: ${file}, truth.ndjson, scenario.yaml`,
    `Next: misread check ${quoted(join(out, file))}`,
  )
  return `${lines.join('\n')}\n`
}

/** A path as a shell takes it. */
function quoted(path: string): string {
  return /^[\w./\\:@+-]+$/.test(path) ? path : `'${path.replaceAll("'", "'\\''")}'`
}

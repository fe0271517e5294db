/**
 * What a check costs, as a ratio to a bare loop of readFileSync and JSON.parse a line over the same file in the
 * same run. Times alone say little on a shared machine; ratios compare.
 *
 *   npm run bench                 all cases
 *   npm run bench -- keys hot     cases by name
 */
import { execFileSync, spawnSync } from 'node:child_process'
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { cpus, tmpdir } from 'node:os'
import { join } from 'node:path'
import { makeHistory } from './make-history.js'

interface Case {
  readonly name: string
  readonly operations: number
  readonly keys: number
}

const CASES: readonly Case[] = [
  { name: 'keys', operations: 1_000_000, keys: 10_000 },
  { name: 'hot', operations: 1_000_000, keys: 1 },
]
const ROUNDS = 3

/** Time and memory of a fresh Node process that runs a script. */
function measure(
  script: string,
  args: readonly string[],
): { seconds: number; peakBytes: number; output: string } {
  const code = `
    const started = process.hrtime.bigint()
    process.on('exit', () => {
      const seconds = Number(process.hrtime.bigint() - started) / 1e9
      require('node:fs').writeSync(2, JSON.stringify({ seconds, peakBytes: process.resourceUsage().maxRSS * 1024 }))
    })`
  const before = process.hrtime.bigint()
  const result = spawn(script, args, code)
  const seconds = Number(process.hrtime.bigint() - before) / 1e9
  const { peakBytes } = JSON.parse(result.stderr.slice(result.stderr.lastIndexOf('{')))
  return { seconds, peakBytes, output: result.stdout }
}

function spawn(script: string, args: readonly string[], preload: string): { stdout: string; stderr: string } {
  const file = join(folder, 'preload.cjs')
  writeFileSync(file, preload)
  const child = spawnSync(process.execPath, ['--require', file, script, ...args], {
    encoding: 'utf8',
    maxBuffer: 1 << 28,
  })
  if (child.status !== 0) throw new Error(`${script} ended with ${child.status}: ${child.stderr}`)
  return child
}

const folder = mkdtempSync(join(tmpdir(), 'misread-bench-'))
const root = new URL('../..', import.meta.url).pathname

function median(values: number[]): number {
  return values.sort((a, b) => a - b)[values.length >> 1]
}

async function main(): Promise<void> {
  const wanted = process.argv.slice(2)
  execFileSync('npm', ['run', '-s', 'build'], { cwd: root })
  const loop = join(folder, 'loop.cjs')
  writeFileSync(
    loop,
    `const text = require('node:fs').readFileSync(process.argv[2], 'utf8'); let n = 0
     for (let at = 0; at < text.length; ) { const end = text.indexOf('\\n', at); if (JSON.parse(text.slice(at, end)).op) n++; at = end + 1 }
     console.log(n)`,
  )
  const empty = join(folder, 'empty.cjs')
  writeFileSync(empty, '')
  const bare = measure(empty, [])
  console.log(
    `node ${process.version}, ${cpus().length} × ${cpus()[0].model}; medians of ${ROUNDS}, cold processes`,
  )
  for (const { name, operations, keys } of CASES) {
    if (wanted.length > 0 && !wanted.includes(name)) continue
    const file = join(folder, `${name}.ndjson`)
    const bytes = await makeHistory(file, { operations, keys })
    const ratios: number[] = []
    const checks: number[] = []
    let peak = 0
    for (let round = 0; round < ROUNDS; round++) {
      const parse = measure(loop, [file])
      if (Number(parse.output) !== operations) throw new Error(`the loop saw ${parse.output} operations`)
      const check = measure(join(root, 'dist/cli/bin.js'), ['check', file, '--format', 'json'])
      const result = JSON.parse(check.output)
      if (result.history.operations !== operations || result.exit !== 0)
        throw new Error('a sound history must hold')
      ratios.push(check.seconds / parse.seconds)
      checks.push(check.seconds)
      peak = Math.max(peak, check.peakBytes)
    }
    const perOperation = (peak - bare.peakBytes) / operations
    console.log(
      `${name}: ${operations} operations on ${keys} keys, ${(bytes / 1e6).toFixed(0)} MB: ` +
        `check ${median(ratios).toFixed(2)} × the JSON.parse loop (${median(checks).toFixed(2)} s), ` +
        `peak ${perOperation.toFixed(0)} bytes an operation beyond an empty node`,
    )
  }
}

main().finally(() => rmSync(folder, { recursive: true, force: true }))

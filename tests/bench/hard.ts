/**
 * What deciding hard keys costs: this program's search, the textbook search and a general-purpose solver on the same
 * keys in one run; and how the time grows. `npm run bench:hard`.
 */
import { mkdtempSync, readFileSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { decideKey } from '../../src/deciders/decide-key.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { gatherKey, indexByKey, type KeyHistory } from '../../src/order/key-history.js'
import { linearizable } from '../../src/promises/linearizable.js'
import { keyText } from '../oracles/arbitraries.js'
import type { PlainKey } from '../oracles/brute-force.js'
import { smtProblem } from '../oracles/smt.js'
import { Solver } from '../oracles/z3.js'
import { type HardKey, makeHardKey } from './hard-keys.js'
import { makeHistory } from './make-history.js'
import { textbookSearch } from './textbook.js'

const LIMIT_MS = 20_000

async function gather(key: PlainKey): Promise<KeyHistory> {
  const history = await readHistory([textSource('hard', keyText(key))])
  return gatherKey(history, indexByKey(history), 0, 0n)
}

interface Answer {
  readonly verdict: string
  readonly ms: number
}

/** Milliseconds of processor time: a machine that is busy with other things changes it little. */
function spent(): number {
  const { user, system } = process.cpuUsage()
  return (user + system) / 1000
}

async function ours(key: PlainKey): Promise<Answer> {
  const gathered = await gather(key)
  const until = performance.now() + LIMIT_MS
  const started = spent()
  const { verdict } = decideKey(gathered, gathered.history.values, linearizable, {
    steps: Number.POSITIVE_INFINITY,
    isSpent: () => performance.now() > until,
  })
  return { verdict, ms: spent() - started }
}

function textbook(key: PlainKey): Answer {
  const started = spent()
  const holds = textbookSearch(key, LIMIT_MS)
  return { verdict: said(holds), ms: spent() - started }
}

async function solve(solver: Solver, key: PlainKey): Promise<Answer> {
  const started = spent()
  const holds = await solver.isSatisfiable(smtProblem(key, { promise: 'linearizable' }), LIMIT_MS)
  return { verdict: said(holds), ms: spent() - started }
}

const said = (holds: boolean | undefined): string =>
  holds === undefined ? 'gave up' : holds ? 'holds' : 'broken'
const shown = ({ verdict, ms }: Answer): string => `${verdict} ${ms.toFixed(ms < 10 ? 1 : 0)} ms`
const times = (other: Answer, own: Answer): string =>
  `${other.verdict === 'gave up' ? 'over ' : ''}${(other.ms / own.ms).toFixed(1)}×`

const PLANTED = [undefined, 'stale read', 'turns'] as const
type Planted = (typeof PLANTED)[number]

const named = (planted: Planted): string => (planted ? `, one anomaly (${planted})` : '')

/** What the keys are is known from how they are made. */
function expected(answer: Answer, planted: Planted): Answer {
  if (answer.verdict === (planted ? 'holds' : 'broken'))
    throw new Error(`wrong: ${answer.verdict}${named(planted)}`)
  return answer
}

/** Nothing is compared before it is compiled: small keys first. */
async function warmUp(): Promise<void> {
  for (let seed = 0; seed < 30; seed++)
    await ours(makeHardKey({ operations: 300, clients: 8, values: 5, unsure: 0.02, seed }))
}

/** Processor time of a bare loop of readFileSync and JSON.parse over a file of a million operations. */
function bareLoop(file: string): number {
  const started = spent()
  const text = readFileSync(file, 'utf8')
  let n = 0
  for (let at = 0; at < text.length; ) {
    const end = text.indexOf('\n', at)
    if (JSON.parse(text.slice(at, end)).op) n++
    at = end + 1
  }
  if (n !== 1_000_000) throw new Error('the loop lost operations')
  return spent() - started
}

async function loops(): Promise<number> {
  const folder = mkdtempSync(join(tmpdir(), 'misread-bench-'))
  try {
    const file = join(folder, 'million.ndjson')
    await makeHistory(file, { operations: 1_000_000, keys: 10_000 })
    return [bareLoop(file), bareLoop(file), bareLoop(file)].sort((a, b) => a - b)[1]
  } finally {
    rmSync(folder, { recursive: true })
  }
}

async function againstOthers(): Promise<void> {
  console.log('\nthe same keys: ours | textbook search | z3, and how many times as long they take')
  const solver = await Solver.start()
  const sizes: [number, number, number][] = [
    [20, 4, 3],
    [40, 5, 4],
    [80, 8, 5],
    [200, 8, 5],
    [1000, 10, 10],
    [3000, 20, 10],
  ]
  let solverGaveUp = false
  for (const [operations, clients, values] of sizes) {
    for (const planted of PLANTED) {
      const key = makeHardKey({ operations, clients, values, unsure: 0.02, planted, seed: 7 })
      const own = expected(await ours(key), planted)
      const book = textbook(key)
      const z3: Answer | undefined = solverGaveUp ? undefined : await solve(solver, key)
      solverGaveUp ||= z3?.verdict === 'gave up'
      for (const { verdict } of [book, z3 ?? book])
        if (verdict !== 'gave up' && verdict !== own.verdict)
          throw new Error(`they disagree on ${operations} operations`)
      console.log(
        `${operations} operations, ${clients} clients, ${values} values, 2% unsure${named(planted)}: ${shown(own)} | ${shown(book)}, ${times(book, own)} | ${z3 ? `${shown(z3)}, ${times(z3, own)}` : 'z3 gave up before'}`,
      )
    }
  }
  solver.end()
}

async function growth(title: string, keys: readonly [string, HardKey][]): Promise<void> {
  console.log(`\n${title}`)
  for (const [name, key] of keys) {
    const answers: string[] = []
    for (const planted of PLANTED)
      answers.push(
        `${shown(expected(await ours(makeHardKey({ ...key, planted })), planted))}${named(planted)}`,
      )
    console.log(`${name}: ${answers.join('; ')}`)
  }
}

async function main(): Promise<void> {
  const base: HardKey = { operations: 10_000, clients: 20, values: 10, unsure: 0.02, seed: 1 }
  await warmUp()
  const loop = await loops()
  console.log(
    `node ${process.version}; a bare JSON.parse loop over 1,000,000 operations: ${Math.round(loop)} ms`,
  )
  for (const key of [base, { ...base, clients: 25, values: 30 }]) {
    for (const planted of PLANTED) {
      const answer = expected(await ours(makeHardKey({ ...key, planted })), planted)
      console.log(
        `10,000 operations, ${key.clients} clients, ${key.values} values, 2% unsure${named(planted)}: ${shown(answer)}, ${(answer.ms / loop).toFixed(2)} loops (bar 1.5)`,
      )
    }
  }
  await againstOthers()
  await growth(
    'how it grows with concurrency',
    [5, 10, 20, 30, 40].map((clients) => [`${clients} clients`, { ...base, clients }]),
  )
  await growth(
    'with writes that got no answer',
    [0, 0.01, 0.02, 0.05, 0.1].map((unsure) => [`${unsure * 100}% unsure`, { ...base, unsure }]),
  )
  await growth(
    'with values that are written again and again',
    [2, 5, 10, 30, 100].map((values) => [`${values} values`, { ...base, values }]),
  )
}

await main()

import { describe, expect, it } from 'vitest'
import { checkText } from '../findings/story.js'
import { TIMED, TIMELESS, type Verdict } from './cases.js'

/** One process as records; `time` gives the place of each operation where the case has none. */
function records(
  client: string,
  process: string,
  time: (i: number) => [number, number],
): Record<string, unknown>[] {
  return process.split(' ').map((step, i) => {
    const [, what, from, to] = /^([^[]+)(?:\[(\d+),(\d+|∞)\])?$/.exec(step)!
    const [start, end] = from === undefined ? time(i) : [Number(from), to === '∞' ? null : Number(to)]
    return { client, key: 'x', ...operation(what), start, end }
  })
}

function operation(what: string): Record<string, unknown> {
  if (what[0] === 'c') {
    const [, expect, value, failed] = /^c(\d+)>(\d+)(!)?$/.exec(what)!
    return { op: 'cas', expect: Number(expect), value: Number(value), ...(failed ? { applied: false } : {}) }
  }
  // The source's increment returns the old value, the format's the count after it.
  if (what[0] === 'i')
    return { op: 'increment', ...(what.length > 2 ? { value: Number(what.slice(2)) + 1 } : {}) }
  return { op: what[0] === 'w' ? 'write' : 'read', value: Number(what.slice(1)) }
}

function historyText(processes: Record<string, unknown>[][], header: Record<string, unknown>): string {
  return [{ history: 1, ...header }, ...processes.flat()]
    .map((record) => `${JSON.stringify(record)}\n`)
    .join('')
}

const VERDICT: Record<Exclude<Verdict, 'not here'>, string> = { yes: 'holds', no: 'broken' }

describe('published histories with times', () => {
  const cases = TIMED.flatMap((each) =>
    (
      [
        ['linearizable', each.lin],
        ['coherent', each.coh ?? 'not here'],
        ['regular', each.reg ?? 'not here'],
      ] as const
    ).flatMap(([promise, verdict]) =>
      verdict === 'not here' ? [] : [{ ...each, promise, expected: VERDICT[verdict] }],
    ),
  )
  it.each(cases)(
    '$id is judged $expected for $promise ($source)',
    async ({ processes, promise, expected, ambiguous }) => {
      const text = historyText(
        processes.map((process, p) => records(`P${p + 1}`, process, () => [0, 0])),
        { initial: { x: 0 } },
      )
      const { result } = await checkText(text, promise)
      const { verdict } = result.promises[0]
      // A value written twice needs the search: until then the answer is that it is not decided, never a wrong one.
      if (ambiguous) expect(['undecided', expected]).toContain(verdict)
      else expect(verdict).toBe(expected)
    },
  )
})

describe('published histories without times', () => {
  it.each(TIMELESS)('$id: coherent $coh ($source)', async ({ processes, coh, initial }) => {
    // Every process is one session; a clock error as long as the history leaves no other order between them.
    const text = historyText(
      processes.map((process, p) => records(`P${p + 1}`, process, (i) => [10 * i, 10 * i + 5])),
      { clockError: 1000, initial: { x: initial ?? 0 } },
    )
    const { result } = await checkText(text, 'coherent')
    expect(result.promises[0].verdict).toBe(VERDICT[coh as 'yes'])
  })
})

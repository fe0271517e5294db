import { describe, expect, it } from 'vitest'
import { checkText } from '../findings/story.js'
import { SESSIONS, TIMED, type Verdict } from './cases.js'
import { CAUSAL_CASES } from './causal-cases.js'

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

/** Every process is one session; a clock error as long as the history leaves no other order between them. */
const ONLY_SESSIONS = { clockError: 1000 }
const inTurn = (i: number): [number, number] => [10 * i, 10 * i + 5]

describe('published histories without times', () => {
  it.each(CAUSAL_CASES)('$id: each location coherent: $coherent ($source)', async (each) => {
    const { id, history, coherent, notDifferentiated } = each
    const initial = id.startsWith('ALPHA') ? 1 : 0
    const keys = new Set<string>()
    const processes = history.split(' ; ').map((process) => {
      const [client, steps] = process.split(': ')
      return steps.split(' ').map((step, i) => {
        const [, letter, key, value] = /^([wr])\((\w+)\)(\d+)$/.exec(step)!
        keys.add(key)
        const [start, end] = inTurn(i)
        return { client, key, ...operation(letter + value), start, end }
      })
    })
    const header = { ...ONLY_SESSIONS, initial: Object.fromEntries([...keys].map((key) => [key, initial])) }
    const { result } = await checkText(historyText(processes, header), 'coherent')
    const { verdict } = result.promises[0]
    // The initial value is written once more, which needs the search: never a wrong answer until then.
    if (notDifferentiated) expect(['undecided', coherent ? 'holds' : 'broken']).toContain(verdict)
    else expect(verdict).toBe(coherent ? 'holds' : 'broken')
  })

  const SESSION_PROMISES = ['read-your-writes', 'monotonic-reads', 'writes-follow-reads', 'monotonic-writes']
  it.each(SESSIONS)(
    '$id breaks $breaks and no other session promise ($source)',
    async ({ processes, breaks }) => {
      const text = historyText(
        processes.map((process, p) => records(`P${p + 1}`, process, inTurn)),
        { ...ONLY_SESSIONS, initial: { x: 0 } },
      )
      const broken: string[] = []
      for (const promise of SESSION_PROMISES) {
        const { result } = await checkText(text, promise)
        if (result.promises[0].verdict === 'broken') broken.push(promise)
        else expect(result.promises[0].verdict).toBe('holds')
      }
      expect(broken).toEqual(breaks)
    },
  )
})

describe('published histories of more than one register, and with refused writes', () => {
  // Guerraoui and Kuznetsov, Fig. 2.13: each object alone is sequentially consistent, the whole is not; x is not
  // linearizable. (The promises of a single key say nothing of the whole.)
  it('GK-2.13: x alone is to blame', async () => {
    const text = historyText(
      [
        [
          { client: 'P1', op: 'write', key: 'x', value: 1, start: 0, end: 1 },
          { client: 'P1', op: 'write', key: 'y', value: 1, start: 2, end: 3 },
          { client: 'P2', op: 'read', key: 'y', value: 1, start: 4, end: 5 },
          { client: 'P2', op: 'read', key: 'x', value: 0, start: 6, end: 7 },
        ],
      ],
      { initial: { x: 0, y: 0 } },
    )
    const { result } = await checkText(text, 'linearizable')
    expect(result.keys.map(({ key, verdicts }) => [key, verdicts.linearizable])).toEqual([['x', 'broken']])
    expect(result.promises[0]).toMatchObject({ holds: 1, broken: 1 })
    expect((await checkText(text, 'coherent')).result.promises[0].verdict).toBe('holds')
  })

  // Berenson et al. 1995, H4: r1[x=100] r2[x=100] w2[x=120] c2 w1[x=130] c1: an update is lost, though every answer
  // is that of a single copy.
  it('H4 loses an update and is linearizable', async () => {
    const at = (i: number): { start: number; end: number } => ({ start: 10 * i, end: 10 * i + 5 })
    const text = historyText(
      [
        [
          { client: 'T1', op: 'read', key: 'x', value: 100, ...at(0) },
          { client: 'T2', op: 'read', key: 'x', value: 100, ...at(1) },
          { client: 'T2', op: 'write', key: 'x', value: 120, basis: 100, ...at(2) },
          { client: 'T1', op: 'write', key: 'x', value: 130, basis: 100, ...at(3) },
        ],
      ],
      { initial: { x: 100 } },
    )
    expect((await checkText(text, 'no-lost-updates')).result.promises[0].verdict).toBe('broken')
    expect((await checkText(text, 'linearizable')).result.promises[0].verdict).toBe('holds')
  })

  // Adya 1999, G1a (aborted read), in the register counterpart of the collection (constructed).
  it.each([
    ['refused', 'broken'],
    ['unsure', 'holds'],
  ])('G1a: reading what a write wrote that was %s is %s', async (outcome, expected) => {
    const text = historyText(
      [
        [
          { client: 'P1', op: 'write', key: 'x', value: 7, start: 0, end: 1, outcome },
          { client: 'P2', op: 'read', key: 'x', value: 7, start: 2, end: 3 },
        ],
      ],
      { initial: { x: 0 } },
    )
    for (const promise of ['written-values', 'linearizable']) {
      expect((await checkText(text, promise)).result.promises[0].verdict).toBe(expected)
    }
  })
})

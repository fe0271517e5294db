/**
 * Big histories with known anomalies: a sound simulated store, then on chosen keys one thing done wrong.
 */
import { seededRandom } from './random.js'

export const ANOMALIES = [
  'stale-read',
  'own-write-missed',
  'lost-write',
  'refused-write-seen',
  'unwritten-value',
  'early-read',
  'lost-increment',
  'repeated-increment',
] as const
export type Anomaly = (typeof ANOMALIES)[number]

export interface Planted {
  readonly text: string
  /** key → what was planted on it */
  readonly planted: ReadonlyMap<string, Anomaly>
}

/** About `operations` operations on `keys` keys; every anomaly on `each` keys of its own. Seeded. */
export function plant(operations: number, keys: number, each: number, seed: number): Planted {
  const random = seededRandom(seed)
  const clients = 32
  const lines: string[] = []
  const clock = new Array<number>(clients).fill(0)
  const state = Array.from({ length: keys }, (_, k) => ({
    name: k % 4 === 3 ? `sailing/${k}/boarded` : `berth/${k}`,
    counter: k % 4 === 3,
    value: null as string | number | null,
    now: 0,
  }))
  const planted = new Map<string, Anomaly>()
  let fresh = 0

  /** One request that takes effect between its ends; requests on a key take effect one after the other. */
  const send = (
    c: number,
    k: number,
    record: (key: (typeof state)[number]) => Record<string, unknown>,
  ): void => {
    const key = state[k]
    const start = Math.max(clock[c], 0) + 1 + Math.floor(random() * 400)
    const effect = Math.max(start, key.now + 1) + Math.floor(random() * 200)
    const end = effect + 1 + Math.floor(random() * 200)
    key.now = effect
    clock[c] = end
    lines.push(JSON.stringify({ client: `c${c}`, key: key.name, ...record(key), start, end }))
  }
  const write = (c: number, k: number): void =>
    send(c, k, (key) => {
      if (key.counter) {
        key.value = ((key.value as number | null) ?? 0) + 1
        return { op: 'increment' }
      }
      key.value = `v${++fresh}`
      return { op: 'write', value: key.value }
    })
  const read = (c: number, k: number): void => send(c, k, (key) => ({ op: 'read', value: key.value }))
  const some = (c: number, k: number): void => (random() < 0.4 ? write(c, k) : read(c, k))

  for (let i = 0; i < operations; i++) some(Math.floor(random() * clients), Math.floor(random() * keys))

  /** Everything so far is over: what comes next comes after it on every clock. */
  const settle = (): void => {
    clock.fill(Math.max(...clock, ...state.map(({ now }) => now)) + 10)
  }
  const bend = (c: number, k: number, value: unknown): void => send(c, k, () => ({ op: 'read', value }))
  const bendWrite = (c: number, k: number, value: unknown): void => send(c, k, () => ({ op: 'write', value }))
  let register = 0
  let counter = 3
  for (const anomaly of ANOMALIES) {
    for (let n = 0; n < each; n++) {
      const isCounter = anomaly.endsWith('increment')
      const k = isCounter ? counter : register
      if (isCounter) counter += 4
      else register += register % 4 === 2 ? 2 : 1
      planted.set(state[k].name, anomaly)
      const [a, b] = [Math.floor(random() * 16), 16 + Math.floor(random() * 16)]
      settle()
      write(a, k)
      const old = state[k].value
      settle()
      if (anomaly === 'early-read') bend(b, k, 'tomorrow')
      if (anomaly === 'refused-write-seen') {
        lines.push(
          JSON.stringify({
            client: `c${a}`,
            key: state[k].name,
            op: 'write',
            value: `refused ${k}`,
            start: clock[a] + 1,
            end: clock[a] + 2,
            outcome: 'refused',
          }),
        )
        clock[a] += 3
        bend(b, k, `refused ${k}`)
      }
      if (anomaly === 'unwritten-value') bend(b, k, 'nobody wrote this')
      settle()
      if (anomaly === 'early-read') {
        state[k].value = 'tomorrow'
        bendWrite(a, k, 'tomorrow')
      } else write(a, k)
      settle()
      if (anomaly === 'stale-read') bend(b, k, old)
      if (anomaly === 'own-write-missed') bend(a, k, old)
      if (anomaly === 'lost-write') for (const c of [a, b, 20]) bend(c, k, old)
      if (anomaly === 'lost-increment') bend(b, k, old)
      if (anomaly === 'repeated-increment') bend(b, k, (state[k].value as number) + 1)
      settle()
      if (anomaly !== 'lost-write' && !isCounter) read(b, k)
    }
  }
  return { text: `${lines.join('\n')}\n`, planted }
}

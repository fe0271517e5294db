/**
 * Big histories with known anomalies: a sound simulated store, then on chosen keys one thing done wrong.
 *
 * Sound is whatever takes effect at one instant between its start and its end (an unsure operation late, or never),
 * recorded by clocks that are off by no more than the clock error. So no key is broken but the planted ones.
 */
import { seededRandom } from './random.js'

export const ANOMALIES = [
  'stale-read',
  'own-write-missed',
  'lost-write',
  'reverted-value',
  'read-inversion',
  'backward-read',
  'refused-write-seen',
  'unwritten-value',
  'torn-row',
  'early-read',
  'lost-update',
  'lost-increment',
  'repeated-increment',
  'backward-counter',
] as const
export type Anomaly = (typeof ANOMALIES)[number]

export interface Planted {
  readonly text: string
  /** key → what was planted on it */
  readonly planted: ReadonlyMap<string, Anomaly>
}

/** Nanoseconds that every host's clock may be off. */
const CLOCK_ERROR = 60
/** Longer than anything is in flight, on any two clocks. */
const LONG = 10_000
const CLIENTS = 32
const HOSTS = 8

interface Key {
  readonly name: string
  readonly kind: 'register' | 'lease' | 'counter'
  /** of its increments, where it is a counter */
  readonly by: number
  value: unknown
  /** unsure increments that never took effect: so many could explain a count that is too high */
  stray: number
}

interface Request {
  readonly record: Record<string, unknown>
  readonly key: Key
  readonly kind: number
  readonly luck: number
  /** when it takes effect; Infinity: never */
  readonly effect: number
}

/** About `operations` operations on `keys` keys; every anomaly on `each` keys of its own. Seeded. */
export function plant(operations: number, keys: number, each: number, seed: number): Planted {
  const random = seededRandom(seed)
  const below = (n: number): number => Math.floor(random() * n)
  const offsets = Array.from({ length: HOSTS }, () => below(2 * CLOCK_ERROR + 1) - CLOCK_ERROR)
  const clock = new Array<number>(CLIENTS).fill(LONG)
  const generation = new Array<number>(CLIENTS).fill(0)
  const state = Array.from({ length: keys }, (_, k): Key => {
    const kind = (['register', 'register', 'lease', 'counter'] as const)[k % 4]
    const name = { register: `berth/${k}`, lease: `lease/${k}`, counter: `sailing/${k}/boarded` }[kind]
    return { name, kind, by: [1, 1, 5, -2][(k >> 2) % 4], value: kind === 'counter' ? 0 : null, stray: 0 }
  })
  let fresh = 0

  /** A record with its times, by the client's own clock. */
  const stamped = (c: number, key: Key, start: number, end: number | undefined): Record<string, unknown> => {
    const host = c % HOSTS
    return {
      client: generation[c] === 0 ? `c${c}` : `c${c}.${generation[c]}`,
      host: `node ${host}`,
      key: key.name,
      start: start + offsets[host],
      ...(end === undefined ? {} : { end: end + offsets[host] }),
    }
  }

  const requests: Request[] = []
  for (let i = 0; i < operations; i++) {
    const c = below(CLIENTS)
    const start = clock[c] + 1 + below(300)
    const end = start + 2 + below(300)
    clock[c] = end
    const luck = below(100)
    const never = luck < 3 || (luck < 9 && luck % 2 === 0)
    const effect = never ? Number.POSITIVE_INFINITY : start + random() * (luck < 9 ? LONG / 4 : end - start)
    const isLost = luck === 3 || luck === 4
    const record = stamped(c, state[below(keys)], start, isLost ? undefined : end)
    if (luck < 3) record.outcome = 'refused'
    else if (luck < 9) record.outcome = 'unsure'
    // A request that never came back: its client goes on under a new name.
    if (isLost) generation[c]++
    const key = state.find(({ name }) => name === record.key)!
    requests.push({ record, key, kind: below(10), luck: below(100), effect })
  }
  const inOrder = requests.map((request, i) => ({ request, i }))
  inOrder.sort((a, b) =>
    a.request.effect === b.request.effect ? a.i - b.i : a.request.effect - b.request.effect,
  )
  for (const { request } of inOrder) answer(request, () => `v${++fresh}`)
  const lines = requests.map(({ record }) => JSON.stringify(record))

  /** Everything so far is over: what comes next comes after it on every clock. */
  const settle = (): void => {
    clock.fill(Math.max(...clock) + LONG)
  }
  const say = (c: number, key: Key, what: Record<string, unknown>, inFlight = false): void => {
    settle()
    const start = clock[c]
    lines.push(JSON.stringify({ ...stamped(c, key, start, inFlight ? undefined : start + 100), ...what }))
    clock[c] = start + 100
    if (inFlight) generation[c]++
  }
  const planted = new Map<string, Anomaly>()
  const free = {
    register: state.filter(({ kind }) => kind === 'register'),
    lease: state.filter(({ kind }) => kind === 'lease'),
    counter: state.filter(({ kind }) => kind === 'counter'),
  }
  for (const anomaly of ANOMALIES) {
    for (let n = 0; n < each; n++) {
      const isCounter = anomaly.endsWith('increment') || anomaly === 'backward-counter'
      const kind = isCounter ? 'counter' : anomaly === 'lost-update' ? 'lease' : 'register'
      // A counter that goes down has no words for going backward.
      const at = free[kind].findIndex(({ by }) => !isCounter || by > 0)
      const [key] = free[kind].splice(at, 1)
      planted.set(key.name, anomaly)
      bend(anomaly, key, [below(10), 10 + below(10), 20 + below(10)], say, () => `v${++fresh}`)
    }
  }
  const header = { history: 1, clockError: CLOCK_ERROR, title: 'sound, but for what was planted' }
  return { text: `${[JSON.stringify(header), ...lines].join('\n')}\n`, planted }
}

/** What a single copy of the key answers, which is then its record. */
function answer({ record, key, kind, luck, effect }: Request, fresh: () => string): void {
  const isAcked = record.outcome === undefined && record.end !== undefined
  const happens = effect !== Number.POSITIVE_INFINITY
  if (kind < 6) {
    Object.assign(record, { op: 'read', ...(isAcked ? { value: key.value } : {}) })
  } else if (key.kind === 'counter') {
    Object.assign(record, { op: 'increment', by: key.by })
    if (happens) key.value = (key.value as number) + key.by
    else if (record.outcome !== 'refused') key.stray++
    if (isAcked && luck < 30) record.value = key.value
  } else if (key.kind === 'lease' && kind < 9) {
    const isRight = luck < 60
    Object.assign(record, { op: 'cas', expect: isRight ? key.value : 'nobody', value: fresh() })
    if (happens && isRight) key.value = record.value
    if (isAcked && !isRight) Object.assign(record, { applied: false, saw: key.value })
  } else {
    Object.assign(record, { op: 'write', value: fresh() })
    if (happens) key.value = record.value
  }
}

type Say = (client: number, key: Key, what: Record<string, unknown>, inFlight?: boolean) => void

/** Does one thing wrong on a key that is otherwise sound, each step long after the one before. */
function bend(anomaly: Anomaly, key: Key, [a, b, c]: number[], say: Say, fresh: () => string): void {
  const write = (value: unknown): Record<string, unknown> => ({ op: 'write', value })
  const read = (value: unknown): Record<string, unknown> => ({ op: 'read', value })
  const increment = { op: 'increment', by: key.by }
  const count = key.value as number
  const [old, recent, last] = [fresh(), fresh(), fresh()]
  if (key.kind !== 'counter' && anomaly !== 'torn-row') say(a, key, write(old))
  switch (anomaly) {
    case 'stale-read':
      say(a, key, write(recent))
      say(b, key, read(old))
      say(b, key, read(recent))
      break
    case 'own-write-missed':
      say(a, key, write(recent))
      say(a, key, read(old))
      say(b, key, read(recent))
      break
    case 'lost-write':
      say(a, key, write(recent))
      for (const reader of [a, b, c]) say(reader, key, read(old))
      break
    case 'reverted-value':
      say(b, key, read(old))
      say(a, key, write(recent))
      say(b, key, read(recent))
      say(c, key, read(old))
      say(a, key, write(last))
      say(c, key, read(last))
      break
    case 'read-inversion':
      say(a, key, write(recent), true)
      say(b, key, read(recent))
      say(c, key, read(old))
      say(b, key, read(recent))
      break
    case 'backward-read':
      say(a, key, write(recent), true)
      say(b, key, read(recent))
      say(b, key, read(old))
      say(c, key, read(recent))
      break
    case 'refused-write-seen':
      say(a, key, { ...write(recent), outcome: 'refused' })
      say(b, key, read(recent))
      say(c, key, read(old))
      break
    case 'unwritten-value':
      say(b, key, read('nobody wrote this'))
      say(c, key, read(old))
      break
    case 'torn-row':
      say(a, key, write({ vessel: old, gate: 1 }))
      say(a, key, write({ vessel: recent, gate: 2 }))
      say(b, key, read({ vessel: recent, gate: 1 }))
      break
    case 'early-read':
      say(b, key, read(recent))
      say(a, key, write(recent))
      say(c, key, read(recent))
      break
    case 'lost-update':
      say(a, key, { op: 'cas', expect: old, value: recent })
      say(b, key, { op: 'cas', expect: old, value: last })
      say(c, key, read(last))
      break
    case 'lost-increment':
      say(c, key, read(count))
      say(a, key, increment)
      say(b, key, read(count))
      break
    case 'repeated-increment':
      say(a, key, increment)
      say(b, key, read(count + (2 + key.stray) * key.by))
      break
    case 'backward-counter':
      say(a, key, increment, true)
      say(b, key, read(count + key.by))
      say(c, key, read(count))
      break
  }
}

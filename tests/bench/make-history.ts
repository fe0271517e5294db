/**
 * Writes a big sound history for measuring: clients with one request at a time over many keys, every value written
 * once, reads that return what stood there, some counters. Seeded, so that runs compare.
 */

import { once } from 'node:events'
import { createWriteStream } from 'node:fs'
import { seededRandom } from '../oracles/random.js'

export interface Shape {
  readonly operations: number
  readonly keys: number
  readonly clients?: number
  readonly seed?: number
}

/** Writes the history to a file and returns its size in bytes. */
export async function makeHistory(
  path: string,
  { operations, keys, clients = 64, seed = 1 }: Shape,
): Promise<number> {
  const random = seededRandom(seed)
  const out = createWriteStream(path, { highWaterMark: 1 << 20 })
  const base = 1719830000000000000n
  // Nanoseconds after the base, exact in a double; each client's clock.
  const clock = new Float64Array(clients)
  for (let c = 0; c < clients; c++) clock[c] = Math.floor(random() * 20_000)
  const current: number[] = new Array(keys).fill(-1)
  const now = new Float64Array(keys)
  const text = (ns: number): string => (base + BigInt(ns)).toString()
  let bytes = 0
  let lines: string[] = []
  for (let i = 0; i < operations; i++) {
    const c = i % clients
    const k = Math.floor(random() * keys)
    const start = clock[c]
    // The operation takes effect at its end, and the next one on the key starts no earlier than that effect.
    const from = Math.max(start, now[k])
    const end = from + 1000 + Math.floor(random() * 40_000)
    clock[c] = end + 500 + Math.floor(random() * 20_000)
    now[k] = end
    const common = `{"client":"client-${c}","op":`
    const times = `"start":${text(start)},"end":${text(end)}}`
    if (random() < 0.4) {
      current[k] = i
      lines.push(`${common}"write","key":"berth/${k}","value":${7000000000000000000n + BigInt(i)},${times}\n`)
    } else {
      const value = current[k] < 0 ? 'null' : (7000000000000000000n + BigInt(current[k])).toString()
      lines.push(`${common}"read","key":"berth/${k}","value":${value},${times}\n`)
    }
    if (lines.length === 4096) {
      const chunk = lines.join('')
      bytes += chunk.length
      lines = []
      if (!out.write(chunk)) await once(out, 'drain')
    }
  }
  const rest = lines.join('')
  bytes += rest.length
  out.end(rest)
  await once(out, 'finish')
  return bytes
}

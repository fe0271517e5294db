/**
 * The textbook search for a linearization of a register: Wing and Gong 1993, depth first, with the memory of Lowe 2017
 * of configurations seen. A yardstick only; nothing in src/ is like it.
 */
import type { PlainKey } from '../oracles/brute-force.js'

/** Whether the register is linearizable, or undefined where the time is up. Clocks are taken to be exact. */
export function textbookSearch(key: PlainKey, budgetMs: number): boolean | undefined {
  const until = performance.now() + budgetMs
  const operations = key.operations
    .filter(({ op, outcome }) => op === 'write' || outcome !== 'unsure')
    .map((op) => ({
      isWrite: op.op === 'write',
      value: JSON.stringify(op.value ?? null),
      isSure: op.outcome !== 'unsure',
      start: op.start,
      end: op.outcome === 'unsure' ? Number.POSITIVE_INFINITY : op.end!,
    }))
    .sort((a, b) => a.start - b.start)
  const n = operations.length
  const placed = new Uint8Array(n)
  const seen = new Set<string>()
  let sureLeft = operations.filter(({ isSure }) => isSure).length

  /** What may be next: everything that begins before the earliest end of what is left. */
  const minimal = (): number[] => {
    let end = Number.POSITIVE_INFINITY
    const next: number[] = []
    for (let i = first(); i < n && operations[i].start <= end; i++) {
      if (placed[i]) continue
      next.push(i)
      if (operations[i].end < end) end = operations[i].end
    }
    return next.filter((i) => operations[i].start <= end)
  }
  let low = 0
  const first = (): number => {
    while (low < n && placed[low]) low++
    return low
  }
  interface Frame {
    readonly next: readonly number[]
    at: number
    readonly value: string
    /** nothing after this one is placed */
    readonly high: number
    placed: number
  }
  const stack: Frame[] = [{ next: minimal(), at: 0, value: 'null', high: -1, placed: -1 }]
  for (let steps = 0; stack.length > 0; steps++) {
    if ((steps & 1023) === 0 && performance.now() > until) return undefined
    if (sureLeft === 0) return true
    const frame = stack[stack.length - 1]
    if (frame.placed >= 0) {
      placed[frame.placed] = 0
      low = Math.min(low, frame.placed)
      if (operations[frame.placed].isSure) sureLeft++
      frame.placed = -1
    }
    if (frame.at === frame.next.length) {
      stack.pop()
      continue
    }
    const i = frame.next[frame.at++]
    const { isWrite, value, isSure } = operations[i]
    if (!isWrite && value !== frame.value) continue
    placed[i] = 1
    const after = isWrite ? value : frame.value
    const from = first()
    let name = `${after} ${from}`
    const high = Math.max(frame.high, i)
    for (let p = from; p <= high; p++) if (placed[p]) name += ` ${p - from}`
    if (seen.has(name) || seen.size > 3_000_000) {
      placed[i] = 0
      low = Math.min(low, i)
      if (seen.size > 3_000_000) return undefined
      continue
    }
    seen.add(name)
    frame.placed = i
    if (isSure) sureLeft--
    stack.push({ next: minimal(), at: 0, value: after, high, placed: -1 })
  }
  return false
}

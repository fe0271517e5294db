/** Makes certificates of histories held in memory, and verifies them. */
import { createHash } from 'node:crypto'
import { causalClaim, headerLine, keyClaims } from '../../src/certificates/certify.js'
import { type Verification, Verifier } from '../../src/certificates/verify/verify.js'
import { check } from '../../src/findings/check.js'
import type { Result } from '../../src/findings/result.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { parsePromise } from '../../src/promises/parse-request.js'

const digest = (text: string): string => createHash('sha256').update(text).digest('hex')

export interface Certified {
  readonly lines: string[]
  readonly result: Result
}

export async function certify(text: string, promises: readonly string[]): Promise<Certified> {
  const source = textSource('history', text)
  const history = await readHistory([source])
  const asked = promises.map(parsePromise)
  const lines: unknown[] = [headerLine(history, asked, history.clockErrorNs, [digest(text)])]
  const { result } = await check(history, [source], {
    promises: asked,
    newBudget: () => ({ steps: 100_000 }),
    onKey: async (key, decided) => {
      lines.push(...keyClaims(key, decided, () => ({ steps: 100_000 })))
    },
    onCausal: async (promise, index, found) => {
      lines.push(causalClaim(history, index, promise, undefined, found))
    },
  })
  lines.push({ end: true, claims: lines.length - 1 })
  return { lines: lines.map((line) => JSON.stringify(line)), result }
}

export async function verify(lines: readonly string[], text: string): Promise<Verification> {
  const history = await readHistory([textSource('history', text)])
  const verifier = new Verifier(history, [{ sha256: digest(text) }])
  for (const line of lines) verifier.take(line)
  return verifier.finish()
}

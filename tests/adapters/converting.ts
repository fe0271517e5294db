/** Converts texts in memory. */
import { type Conversion, convert } from '../../src/adapters/convert.js'
import { parseMapping } from '../../src/adapters/mapping-file.js'
import { formatProblem, InputError, type InputProblem } from '../../src/history/problems.js'
import { readHistory } from '../../src/history/read.js'
import { type ByteSource, textSource } from '../../src/history/source.js'

export interface Converted {
  readonly text: string
  /** lines without the header, parsed; whole numbers as strings of digits */
  readonly records: readonly Record<string, unknown>[]
  readonly conversion: Conversion
}

export async function converted(
  mapping: string,
  ...logs: (string | Uint8Array | ByteSource)[]
): Promise<Converted> {
  const pieces: string[] = []
  const sources = logs.map((log, i) =>
    typeof log === 'string' || log instanceof Uint8Array ? textSource(`log-${i + 1}`, log) : log,
  )
  const conversion = await convert(sources, parseMapping(mapping, 'map.yaml'), async (text) => {
    pieces.push(text)
  })
  const text = pieces.join('')
  const records = text
    .trimEnd()
    .split('\n')
    .slice(1)
    .map((line) => JSON.parse(line.replace(/([:,[])(-?\d+)(?=[,}\]])/g, '$1"$2"')))
  return { text, records, conversion }
}

/** The same, and the history is one that the reader takes. */
export async function readable(mapping: string, ...logs: (string | Uint8Array)[]): Promise<Converted> {
  const result = await converted(mapping, ...logs)
  await readHistory([textSource('converted', result.text)])
  return result
}

export async function problemsOf(work: () => unknown): Promise<readonly InputProblem[]> {
  try {
    await work()
  } catch (error) {
    if (error instanceof InputError) return error.problems
    throw error
  }
  throw new Error('expected an InputError')
}

/** The problems as a user reads them. */
export async function refusal(mapping: string, ...logs: (string | Uint8Array)[]): Promise<string[]> {
  return (await problemsOf(() => converted(mapping, ...logs))).map(formatProblem)
}

/** A source whose bytes come in chunks of a size. */
export function chunked(name: string, text: string, size: number): ByteSource {
  const bytes = new TextEncoder().encode(text)
  return {
    name,
    async *chunks() {
      for (let at = 0; at < bytes.length; at += size) yield bytes.slice(at, at + size)
    },
  }
}

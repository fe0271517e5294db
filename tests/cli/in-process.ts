/** Runs the command line without a process: streams in memory, no colour. */
import { PassThrough } from 'node:stream'
import { run } from '../../src/cli/main.js'
import type { Terminal } from '../../src/cli/terminal.js'

export interface Ran {
  readonly status: number
  readonly out: string
  readonly err: string
}

export async function misread(
  args: readonly string[],
  options: { input?: string; width?: number; signal?: AbortSignal; colour?: boolean } = {},
): Promise<Ran> {
  const out: string[] = []
  const err: string[] = []
  const collect = (chunks: string[]): NodeJS.WritableStream => {
    const stream = new PassThrough()
    stream.on('data', (chunk) => chunks.push(String(chunk)))
    return stream
  }
  const input = new PassThrough()
  input.end(options.input ?? '')
  const terminal: Terminal = {
    out: collect(out),
    err: collect(err),
    input,
    width: options.width ?? 100,
    colour: options.colour ?? false,
    progress: false,
    signal: options.signal ?? new AbortController().signal,
  }
  const status = await run(args, terminal)
  return { status, out: out.join(''), err: err.join('') }
}

/**
 * `misread verify CERTIFICATE --history FILE...`: check a certificate, independently.
 */
import { createInterface } from 'node:readline'
import { Readable } from 'node:stream'
import { Verifier } from '../certificates/verify/verify.js'
import { readHistory } from '../history/read.js'
import { fileSource } from '../history/source.js'
import { verifyText } from '../reports/verify-text.js'
import { openSources } from './check.js'
import { sha256Of } from './digests.js'
import { type ExitStatus, UsageError } from './exit.js'
import { type Terminal, write } from './terminal.js'

export interface VerifyOptions {
  history: string[]
  final?: string
  format: 'text' | 'json'
}

/** 0 accepted, 1 refused. */
export async function runVerify(
  certificate: string,
  { history: files, final, format }: VerifyOptions,
  terminal: Terminal,
): Promise<ExitStatus> {
  if (files.includes('-')) throw new UsageError('a certificate is about files: name them')
  const sources = await openSources(files, terminal)
  const [dump] = final === undefined ? [] : await openSources([final], terminal)
  const history = await readHistory(sources, dump ? { final: dump } : {})
  const inputs = []
  for (const file of final === undefined ? files : [...files, final])
    inputs.push({ sha256: await sha256Of(file) })
  const verifier = new Verifier(history, inputs)
  const lines = createInterface({
    input: Readable.from(copied((await fileSource(certificate)).chunks())),
    crlfDelay: Number.POSITIVE_INFINITY,
  })
  for await (const line of lines) verifier.take(line)
  const verification = verifier.finish()
  const isAccepted = verification.refusals.length === 0
  await write(
    terminal.out,
    format === 'json'
      ? `${JSON.stringify({ verification: 1, accepted: isAccepted, ...verification }, null, 1)}\n`
      : verifyText(verification, terminal),
  )
  return isAccepted ? 0 : 1
}

/** A stream reads ahead, and a chunk of a source is good only until the next is asked for. */
async function* copied(chunks: AsyncIterable<Uint8Array>): AsyncGenerator<Uint8Array> {
  for await (const chunk of chunks) yield Buffer.from(chunk)
}

import ndjson from 'ndjson'
import type { Result } from '../findings/result.js'

/** The findings of a result, one a line, as a stream of text. */
export async function ndjsonReport({ findings }: Result): Promise<string> {
  const stream = ndjson.stringify()
  const chunks: string[] = []
  stream.on('data', (chunk: Buffer | string) => chunks.push(chunk.toString()))
  for (const finding of findings) stream.write(finding)
  stream.end()
  await new Promise((resolve, reject) => stream.once('end', resolve).once('error', reject))
  return chunks.join('')
}

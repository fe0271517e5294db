/**
 * SHA-256 of input files, as they stand on the disk.
 */
import { createHash } from 'node:crypto'
import { createReadStream } from 'node:fs'

export async function sha256Of(path: string): Promise<string> {
  const hash = createHash('sha256')
  for await (const chunk of createReadStream(path)) hash.update(chunk)
  return hash.digest('hex')
}

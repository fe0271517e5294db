/**
 * Reads a saved result.
 */
import { type Result, resultSchema } from '../findings/result.js'
import { InputError } from '../history/problems.js'
import { fileSource } from '../history/source.js'

/** The result in a file (or a folder's result.json). Throws InputError that says what is wrong with it, and where. */
export async function readResult(path: string): Promise<Result> {
  const chunks: Uint8Array[] = []
  for await (const chunk of (await fileSource(path)).chunks()) chunks.push(new Uint8Array(chunk))
  const refuse = (found: string, expected: string): InputError =>
    new InputError([
      {
        code: 'bad-result',
        file: path,
        found,
        expected,
        advice: 'save one with misread check --format json, or --out',
      },
    ])
  let value: unknown
  try {
    value = JSON.parse(Buffer.concat(chunks).toString('utf8'))
  } catch (error) {
    throw refuse(`what is not JSON (${(error as Error).message})`, 'a result of misread check')
  }
  const parsed = resultSchema.safeParse(value)
  if (parsed.success) return parsed.data
  const [issue] = parsed.error.issues
  throw refuse(
    `at ${issue.path.join('.') || 'the top'}: ${issue.message}`,
    'a result of misread check, version 1',
  )
}

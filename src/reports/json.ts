/** A result as JSON. */
import { type Result, resultSchema } from '../findings/result.js'

/**
 * The result as pretty-printed JSON, members in the order of the schema. Throws what zod throws when the result is
 * none: that is a bug of the program.
 */
export function jsonReport(result: Result): string {
  return `${JSON.stringify(resultSchema.parse(result), null, 2)}\n`
}

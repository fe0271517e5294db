/**
 * How a run ends: the one place where what happened becomes an exit status.
 */
import { formatProblem, InputError } from '../history/problems.js'

/** 0 holds, 1 broken, 2 unusable input or arguments, 3 undecided, 130 interrupted. */
export type ExitStatus = 0 | 1 | 2 | 3 | 130

/** A wrong option or argument: the user's to mend. */
export class UsageError extends Error {}

/** What to print on standard error for an error, and the status to end with. */
export function endOf(error: unknown): { status: ExitStatus; message: string } {
  if (error instanceof InputError) {
    const lines = error.problems.map((problem) => `error: ${formatProblem(problem)}`)
    return { status: 2, message: `${lines.join('\n')}\nnothing was checked` }
  }
  if (error instanceof UsageError) return { status: 2, message: `error: ${error.message}` }
  const text = error instanceof Error ? (error.stack ?? error.message) : String(error)
  return { status: 2, message: `error: this is a mistake in misread, please report it\n${text}` }
}

/**
 * What is wrong with an input, as data: where it stands, what was found, what was expected, what to do.
 */
export interface InputProblem {
  /** stable, kebab-case */
  readonly code: string
  /** name of the input as given */
  readonly file: string
  /** 1-based */
  readonly line?: number
  /** 1-based, in bytes */
  readonly column?: number
  /** what stood there, quoted as it stands where it is short */
  readonly found: string
  readonly expected: string
  readonly advice?: string
}

/** Reading stops after so many problems. */
export const PROBLEM_LIMIT = 20

/** Thrown when an input cannot be used. Carries at most PROBLEM_LIMIT problems, sorted by place. */
export class InputError extends Error {
  readonly problems: readonly InputProblem[]

  constructor(problems: readonly InputProblem[]) {
    super(problems.map(formatProblem).join('\n'))
    this.name = 'InputError'
    this.problems = problems
  }
}

/** One line: "file:line:column: found …, expected …; advice". */
export function formatProblem({ file, line, column, found, expected, advice }: InputProblem): string {
  const place = [file, line, column].filter((part) => part !== undefined).join(':')
  return `${place}: found ${found}, expected ${expected}${advice ? `; ${advice}` : ''}`
}

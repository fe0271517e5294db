/**
 * `misread survey FILE...`: what is in these files.
 */
import { readTolerantly } from '../history/read.js'
import { type Survey, surveyHistory } from '../history/survey.js'
import { surveyText } from '../reports/survey-text.js'
import { VERSION } from '../version.js'
import { openSources, totalSize } from './check.js'
import type { ExitStatus } from './exit.js'
import { Progress } from './progress.js'
import { type Terminal, write } from './terminal.js'

/** Reads on past what is wrong, counts it, and then ends with 2. */
export async function runSurvey(
  files: readonly string[],
  options: { format: 'text' | 'json' },
  terminal: Terminal,
): Promise<ExitStatus> {
  const sources = await openSources(files, terminal)
  const progress = new Progress(terminal)
  const total = totalSize(sources)
  const { history, problems, problemCount } = await readTolerantly(sources, {
    onProgress: (bytes) =>
      progress.show('reading', bytes, total === undefined ? undefined : Math.max(bytes, total)),
  })
  const survey: Survey = {
    survey: 1,
    misread: VERSION,
    ...surveyHistory(history),
    problems: { count: problemCount, first: problems.map((problem) => ({ ...problem })) },
  }
  progress.clear()
  await write(
    terminal.out,
    options.format === 'json' ? `${JSON.stringify(survey, null, 1)}\n` : surveyText(survey, terminal.width),
  )
  return problemCount > 0 ? 2 : 0
}

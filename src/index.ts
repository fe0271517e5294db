/**
 * misread as a library: read a history, check it, get the result object.
 *
 * @example
 * const sources = [await fileSource('drill.ndjson')]
 * const history = await readHistory(sources)
 * const { result } = await check(history, sources, { promises: [parsePromise('linearizable')] })
 * console.log(result.promises[0].verdict)
 */
export {
  type Checked,
  type CheckRequest,
  type CounterexampleFile,
  check,
} from './findings/check.js'
export type { FindingKind } from './findings/kinds.js'
export { type Finding, type Result, resultSchema } from './findings/result.js'
export type { History } from './history/columns.js'
export { formatProblem, InputError, type InputProblem } from './history/problems.js'
export { type ReadOptions, readHistory, readTolerantly, type TolerantReading } from './history/read.js'
export { type ByteSource, fileSource, standardInputSource, textSource } from './history/source.js'
export { type Survey, surveyHistory } from './history/survey.js'
export { parsePromise } from './promises/parse-request.js'
export type { PromiseRequest } from './promises/request.js'
export { jsonReport } from './reports/json.js'
export { textReport } from './reports/text.js'
export { VERSION } from './version.js'

import { resultSchema } from '../../src/findings/result.js'
import type { Publication } from './publish.js'

export const resultPublication: Publication = {
  file: 'result.schema.json',
  title: 'The result of misread check, version 1',
  schema: resultSchema,
}

import { surveySchema } from '../../src/history/survey.js'
import type { Publication } from './publish.js'

export const surveyPublication: Publication = {
  file: 'survey.schema.json',
  title: 'The survey of misread survey, version 1',
  schema: surveySchema,
}

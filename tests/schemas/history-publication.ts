import { recordSchema } from '../../src/history/format.js'
import type { Publication } from './publish.js'

export const historyPublication: Publication = {
  file: 'history.schema.json',
  title: 'One line of a history, version 1',
  schema: recordSchema,
}

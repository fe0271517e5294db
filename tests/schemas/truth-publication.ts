import { truthSchema } from '../../src/rehearsal/truth-schema.js'
import type { Publication } from './publish.js'

export const truthPublication: Publication = {
  file: 'truth.schema.json',
  title: 'A line of the truth that misread rehearse writes, version 1',
  schema: truthSchema,
}

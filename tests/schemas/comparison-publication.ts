import { comparisonSchema } from '../../src/findings/compare.js'
import type { Publication } from './publish.js'

export const comparisonPublication: Publication = {
  file: 'comparison.schema.json',
  title: 'The comparison of misread compare, version 1',
  schema: comparisonSchema,
}

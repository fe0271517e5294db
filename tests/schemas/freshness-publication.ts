import { freshnessSchema } from '../../src/freshness/figures.js'
import type { Publication } from './publish.js'

export const freshnessPublication: Publication = {
  file: 'freshness.schema.json',
  title: 'What misread freshness measured, version 1',
  schema: freshnessSchema,
}

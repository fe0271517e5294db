import { mappingSchema } from '../../src/adapters/mapping-schema.js'
import type { Publication } from './publish.js'

export const mappingPublication: Publication = {
  file: 'mapping.schema.json',
  title: 'A mapping file of misread convert, version 1',
  schema: mappingSchema,
}

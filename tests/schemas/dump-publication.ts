import { dumpSchema } from '../../src/history/format.js'
import type { Publication } from './publish.js'

export const dumpPublication: Publication = {
  file: 'dump.schema.json',
  title: 'One line of a dump of the store, version 1',
  schema: dumpSchema,
}

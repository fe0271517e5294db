import { scenarioSchema } from '../../src/rehearsal/scenario-schema.js'
import type { Publication } from './publish.js'

export const scenarioPublication: Publication = {
  file: 'scenario.schema.json',
  title: 'A scenario file of misread rehearse, version 1',
  schema: scenarioSchema,
}

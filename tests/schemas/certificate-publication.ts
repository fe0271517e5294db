import { certificateLineSchema } from '../../src/certificates/schema.js'
import type { Publication } from './publish.js'

export const certificatePublication: Publication = {
  file: 'certificate.schema.json',
  title: 'One line of a certificate of misread check --certificate, version 1',
  schema: certificateLineSchema,
}

/**
 * Reads a mapping file (YAML or JSON) and says where what is wrong with it stands.
 */
import { type MappingFile, mappingSchema } from './mapping-schema.js'
import { parseSpec, type SpecFile } from './spec-file.js'

/** A mapping as it was validated, and the same with every number's own digits. */
export type Mapping = SpecFile<MappingFile>

/** Parses the text of a mapping file. Throws InputError with the place of each problem. */
export function parseMapping(text: string, file: string): Mapping {
  return parseSpec(text, file, mappingSchema, 'bad-mapping')
}

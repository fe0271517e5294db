/**
 * Makes a published JSON Schema (docs/schema/) from its one definition in the code. `npm run schemas` writes them
 * all; the tests hold each file to what is made here.
 */
import { readFileSync, writeFileSync } from 'node:fs'
import { fileURLToPath } from 'node:url'
import { z } from 'zod'

export interface Publication {
  /** file name in docs/schema */
  readonly file: string
  readonly title: string
  readonly schema: z.ZodType
}

/** The text of the published file. */
export function schemaText({ title, schema }: Publication): string {
  const { $schema, ...rest } = z.toJSONSchema(schema, { io: 'input', target: 'draft-2020-12' })
  return `${JSON.stringify({ $schema, title, ...rest }, null, 2)}\n`
}

export function published({ file }: Publication): string {
  return readFileSync(pathOf(file), 'utf8')
}

export function publish(publication: Publication): void {
  writeFileSync(pathOf(publication.file), schemaText(publication))
}

function pathOf(file: string): string {
  return fileURLToPath(new URL(`../../docs/schema/${file}`, import.meta.url))
}

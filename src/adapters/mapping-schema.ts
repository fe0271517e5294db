/**
 * A mapping file, version 1 (docs/convert.md): how the records of a foreign log become operations. The one
 * definition in zod, from which the published JSON Schema is made.
 */
import { z } from 'zod'

const json = z.json()
const scalar = z.union([z.string(), z.number(), z.boolean(), z.null()])
const fieldName = z
  .string()
  .min(1)
  .describe('a column; a dotted path or JSON Pointer; an attribute of a span')
const pattern = z
  .string()
  .refine(isPattern, { error: 'a regular expression' })
  .describe('a regular expression, anywhere in the text')
const duration = z.string().describe('such as 2ms, 150us or 1.5s')

const sourceObject = z.strictObject({
  field: z
    .union([fieldName, z.array(fieldName).min(1)])
    .exactOptional()
    .describe('of several the first that is there'),
  template: z.string().exactOptional().describe('text with fields in braces, such as berth/{berth_id}'),
  constant: json.exactOptional().describe('the same for every record'),
  match: pattern.exactOptional().describe('what its first group (else the whole of it) finds is taken'),
  translate: z.record(z.string(), json).exactOptional().describe('what is found, and what it stands for'),
  as: z.enum(['unchanged', 'string', 'number', 'json']).exactOptional(),
  empty: z
    .union([z.null(), z.enum(['text', 'missing'])])
    .exactOptional()
    .describe('what an empty cell of a CSV file means: absence, the empty text, nothing said'),
  default: json.exactOptional().describe('where nothing is there'),
})

/** Where something comes from. A bare text is a field, with {…} in it a template. */
const sourceSchema = z.union([z.string().min(1), sourceObject]).meta({ id: 'source' })

const clientSchema = z.union([
  z.string().min(1),
  sourceObject.extend({
    lanes: z
      .boolean()
      .exactOptional()
      .describe('split a client whose requests overlap into clients that send one at a time'),
  }),
])

const ofOneKind = sourceSchema.exactOptional()
const valueSchema = z.union([
  z.string().min(1),
  sourceObject.extend({ read: ofOneKind, write: ofOneKind, increment: ofOneKind, cas: ofOneKind }),
])

const unit = z.enum(['ns', 'us', 'ms', 's', 'iso']).describe('iso: timestamps by RFC 3339')
const timeSchema = z
  .union([
    z.string().min(1),
    sourceObject.extend({
      unit: unit.exactOptional(),
      round: z
        .boolean()
        .exactOptional()
        .describe('take times finer than a nanosecond, rounded so that the request lasts no shorter'),
    }),
  ])
  .meta({ id: 'time' })

/** What a condition asks of a record; all that is named must hold. */
const test = {
  field: z.union([fieldName, z.array(fieldName).min(1)]).exactOptional(),
  equals: scalar.exactOptional(),
  in: z.array(scalar).min(1).exactOptional(),
  matches: pattern.exactOptional(),
  present: z.boolean().exactOptional().describe('whether the field is there, not null and not empty'),
}
const conditionSchema = z.strictObject(test).meta({ id: 'condition' })
const all = z.array(conditionSchema).min(1).exactOptional().describe('conditions that must hold all')
const outcome = z.enum(['acked', 'refused', 'unsure'])

export const mappingSchema = z.strictObject({
  mapping: z.literal(1).describe('version of this file'),
  format: z.enum(['csv', 'ndjson', 'otlp']),
  csv: z
    .strictObject({
      delimiter: z.string().min(1).exactOptional().describe('default ,'),
      quote: z.string().length(1).exactOptional().describe('default "'),
      comment: z.string().min(1).exactOptional().describe('what begins a line to be passed over'),
      columns: z
        .array(z.string().min(1))
        .min(1)
        .exactOptional()
        .describe('names, where the file has no line of them'),
    })
    .exactOptional(),
  otlp: z
    .strictObject({
      kinds: z
        .array(z.enum(['unspecified', 'internal', 'server', 'client', 'producer', 'consumer']))
        .min(1)
        .exactOptional()
        .describe('kinds of span that count; default client'),
      database: z.boolean().exactOptional().describe('only spans that name a database system; default true'),
    })
    .exactOptional(),
  header: z
    .strictObject({
      title: z.string().exactOptional(),
      clockError: duration.exactOptional().describe('how far any clock may be off'),
      initial: z.record(z.string(), json).exactOptional(),
      initialUnknown: z.boolean().exactOptional(),
    })
    .exactOptional(),
  unit: unit.exactOptional().describe('of all times that name none'),
  client: clientSchema.exactOptional(),
  op: sourceSchema.exactOptional(),
  key: sourceSchema,
  value: valueSchema.exactOptional(),
  by: sourceSchema.exactOptional(),
  expect: sourceSchema.exactOptional(),
  applied: sourceSchema.exactOptional(),
  saw: sourceSchema.exactOptional(),
  basis: sourceSchema.exactOptional(),
  start: timeSchema.exactOptional(),
  end: timeSchema.exactOptional(),
  duration: timeSchema.exactOptional().describe('instead of start or end'),
  outcome: z
    .union([outcome, z.array(z.strictObject({ ...test, all, outcome })).min(1)])
    .exactOptional()
    .describe('rules in order, the first that fits; unsure where none does'),
  host: sourceSchema.exactOptional(),
  id: sourceSchema.exactOptional(),
  keep: z
    .union([z.literal('all'), z.record(z.string().min(1), sourceSchema)])
    .exactOptional()
    .describe('members to add: a name and where it comes from; all: the whole record as the member source'),
  place: z.string().min(1).exactOptional().describe('a member to add with the file and line of the record'),
  skip: z
    .array(z.strictObject({ ...test, all }))
    .min(1)
    .exactOptional()
    .describe('records to pass over'),
  marks: z
    .array(
      z.strictObject({
        when: z.strictObject({ ...test, all }),
        mark: sourceSchema,
        start: timeSchema,
        end: timeSchema.exactOptional(),
      }),
    )
    .min(1)
    .exactOptional()
    .describe('records that are no operations but something that happened to the store'),
})

export type MappingFile = z.infer<typeof mappingSchema>
export type SourceSpec = z.infer<typeof sourceSchema>
export type TimeSpec = z.infer<typeof timeSchema>
export type ConditionSpec = z.infer<typeof conditionSchema> & { all?: z.infer<typeof conditionSchema>[] }

function isPattern(text: string): boolean {
  try {
    new RegExp(text, 'u')
    return true
  } catch {
    return false
  }
}

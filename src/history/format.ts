/**
 * The records of the history format, version 1 (docs/format.md): the one definition in zod, from which the
 * published JSON Schema is made. The scanner is held to it by tests; unknown fields are always allowed.
 */
import { z } from 'zod'

const json = z.json()
/** A time or span in the file's unit: a number, or a string of one where doubles would not hold it. */
const time = z.union([z.number(), z.string().regex(/^-?(0|[1-9][0-9]*)(\.[0-9]+)?([eE][+-]?[0-9]+)?$/)])
const outcome = z.enum(['acked', 'refused', 'unsure'])

/** A field of another kind of record, which would make the line one of that kind. */
const otherKind = z.never().exactOptional()

export const headerSchema = z.looseObject({
  op: otherKind,
  mark: otherKind,
  history: z.literal(1).describe('format version'),
  title: z.string().exactOptional(),
  unit: z.enum(['ns', 'us', 'ms', 's']).exactOptional().describe('of every time in this file; default ns'),
  clockError: time.exactOptional().describe('bound on how far any host may be from true time; default 0'),
  initial: z.record(z.string(), json).exactOptional().describe('value of keys before the first record'),
  initialUnknown: z.boolean().exactOptional(),
})

const common = {
  client: z.string(),
  key: z.string(),
  start: time,
  end: time.nullable().exactOptional().describe('absent or null: the request never came back'),
  outcome: outcome.exactOptional().describe('default acked'),
  host: z.string().exactOptional().describe('whose clock stamped it'),
  id: z.string().exactOptional().describe('joins the halves of a split record'),
}

export const readSchema = z.looseObject({
  ...common,
  op: z.literal('read'),
  value: json.exactOptional().describe('what came back, null when absent; required when acked'),
})
export const writeSchema = z.looseObject({
  ...common,
  op: z.literal('write'),
  value: json,
  basis: json.exactOptional().describe('the value that it was computed from'),
})
export const incrementSchema = z.looseObject({
  ...common,
  op: z.literal('increment'),
  by: z.number().multipleOf(1).exactOptional().describe('a whole number; default 1'),
  value: json.exactOptional().describe('the count after it, where the store returns it'),
})
export const casSchema = z.looseObject({
  ...common,
  op: z.literal('cas'),
  expect: json,
  value: json,
  applied: z.boolean().exactOptional().describe('false: the comparison failed; default true'),
  saw: json.exactOptional().describe('the value found instead'),
})
export const deleteSchema = z.looseObject({ ...common, op: z.literal('delete') })

export const operationSchema = z
  .discriminatedUnion('op', [readSchema, writeSchema, incrementSchema, casSchema, deleteSchema])
  .refine(({ end, outcome }) => (end ?? null) !== null || outcome === undefined || outcome === 'unsure', {
    path: ['outcome'],
    error: '"unsure" or no outcome where the request has no end',
  })
  .refine(
    (record) =>
      record.op !== 'read' ||
      record.value !== undefined ||
      (record.end ?? null) === null ||
      (record.outcome ?? 'acked') !== 'acked',
    { path: ['value'], error: 'the value that the read returned, null when the key was absent' },
  )

export const closeSchema = z.looseObject({
  op: otherKind,
  mark: otherKind,
  history: otherKind,
  start: otherKind,
  id: z.string(),
  end: time,
  outcome: outcome.exactOptional(),
  value: json.exactOptional(),
  applied: z.boolean().exactOptional(),
  saw: json.exactOptional(),
})

export const markSchema = z.looseObject({
  op: otherKind,
  mark: z.string(),
  start: time,
  end: time.nullable().exactOptional(),
})

/** Any line of a history. */
export const recordSchema = z.union([operationSchema, markSchema, headerSchema, closeSchema])

/** The first line of a dump of the store. */
const dumpHeaderSchema = z.looseObject({
  dump: z.literal(1),
  time,
  unit: z.enum(['ns', 'us', 'ms', 's']).exactOptional(),
  complete: z.boolean().exactOptional().describe('a key of the history that the dump lacks was absent'),
})

/** Any other line of a dump. */
const dumpEntrySchema = z.looseObject({ key: z.string(), value: json })

/** Any line of a dump. */
export const dumpSchema = z.union([dumpHeaderSchema, dumpEntrySchema])

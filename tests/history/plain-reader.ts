/**
 * A slow reader that is easy to believe: the ndjson package cuts and parses, zod checks each record. For records
 * whose numbers doubles hold. The scanner must agree with it.
 */
import { Readable } from 'node:stream'
import ndjson from 'ndjson'
import { closeSchema, headerSchema, markSchema, operationSchema } from '../../src/history/format.js'

export interface PlainReading {
  operations: Record<string, unknown>[]
  marks: Record<string, unknown>[]
  /** nanoseconds in one unit of the times */
  unitNs: number
  /** records that are no valid record */
  wrong: number
}

const UNITS: Record<string, number> = { ns: 1, us: 1e3, ms: 1e6, s: 1e9 }

export async function readPlainly(text: string): Promise<PlainReading> {
  const reading: PlainReading = { operations: [], marks: [], unitNs: 1, wrong: 0 }
  const open = new Map<string, Record<string, unknown>>()
  for await (const value of Readable.from([text]).pipe(ndjson.parse())) {
    const record = value as Record<string, unknown>
    const schema =
      'op' in record
        ? operationSchema
        : 'mark' in record
          ? markSchema
          : 'history' in record
            ? headerSchema
            : closeSchema
    if (!schema.safeParse(record).success) {
      reading.wrong++
      continue
    }
    if ('op' in record) {
      const unended = record.end === undefined || record.end === null
      const operation = { ...record, outcome: record.outcome ?? (unended ? 'unsure' : 'acked') }
      reading.operations.push(operation)
      if (unended && typeof record.id === 'string') open.set(record.id, operation)
    } else if ('mark' in record) reading.marks.push(record)
    else if ('history' in record) reading.unitNs = UNITS[(record.unit as string | undefined) ?? 'ns']
    else if ('id' in record) {
      const { id, ...close } = record
      const operation = open.get(id as string)
      if (!operation) continue
      Object.assign(operation, { outcome: 'acked' }, close)
      // The halves may be good by themselves and yet make no operation.
      if (!operationSchema.safeParse(operation).success) reading.wrong++
    }
  }
  return reading
}

/**
 * What the OpenTelemetry semantic conventions say of spans of database clients, as defaults of a mapping.
 *
 * Attribute names: OpenTelemetry semantic conventions for database client calls (stable names of 2025, such as
 * db.operation.name, and the older db.operation, db.statement and db.system before them). Outcomes: the same
 * document: error.type is set if and only if the operation ended in an error, the span's status is then ERROR and
 * otherwise left unset.
 */
import { scalarText } from './json-node.js'
import type { Plan } from './plan.js'
import { parseField } from './rows.js'
import { anyField, type Source } from './sources.js'
import { timeOf } from './time-source.js'

function first(...names: string[]): Source {
  return anyField(names.map(parseField))
}

const STATUS = parseField('status.code')
const ERROR = parseField('error.type')
const OPERATION = first('db.operation.name', 'db.operation')
const STATEMENT = first('db.query.text', 'db.statement')

/** The operation by its attribute, else the first word of the statement. */
const op: Source = {
  get(row) {
    const named = OPERATION.get(row)
    if (named) return named
    const statement = STATEMENT.get(row)
    const word = /^\s*([A-Za-z_.]+)/.exec((statement && scalarText(statement)) ?? '')
    return word ? { kind: 'string', text: word[1] } : undefined
  },
  missing: () => 'no db.operation.name, db.operation, db.query.text or db.statement',
}

/** OTLP writes 0 for a time that is not set. */
function stamp(name: string): ReturnType<typeof timeOf> {
  const source = first(name)
  const set: Source = {
    get(row) {
      const found = source.get(row)
      return found && scalarText(found) === '0' ? undefined : found
    },
    missing: source.missing,
  }
  return timeOf(set, 'ns', false)
}

export const otlpDefaults = {
  client: first('resource.service.instance.id', 'resource.service.name'),
  op,
  start: stamp('startTimeUnixNano'),
  end: stamp('endTimeUnixNano'),
  /** An error need not mean that nothing happened: unsure. */
  outcome: ((row) => {
    const status = row.get(STATUS)
    const isError = (status && scalarText(status)) === 'error' || row.get(ERROR) !== undefined
    return isError ? 'unsure' : 'acked'
  }) satisfies Plan['outcome'],
  host: first('resource.host.id', 'resource.host.name'),
  keep: [
    { name: 'traceId', source: first('traceId') },
    { name: 'spanId', source: first('spanId') },
    { name: 'server', source: first('server.address', 'net.peer.name') },
  ],
} as const

/** Attributes that name the database system: those of spans of database clients. */
export const DATABASE_FIELDS = ['db.system.name', 'db.system'].map(parseField)

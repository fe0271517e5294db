/**
 * From a raw finding to the one in the result: records, values as text, reasons, marks.
 */
import {
  ACKED,
  CAS,
  type History,
  INCREMENT,
  KIND_NAMES,
  NO_VALUE,
  OUTCOME_NAMES,
  WRITE,
} from '../history/columns.js'
import { marksOf } from './marks.js'
import { reasonOf } from './reasons.js'
import type { Records } from './records.js'
import type { ChainStep, Finding, FindingOperation } from './result.js'
import type { NamedFinding } from './sorting.js'

/** A finding with its records and reasons. */
export function tell(
  history: History,
  records: Records,
  { promise, finding }: NamedFinding,
  id: number,
): Finding {
  const place = new Map(finding.exhibits.map(({ operation }, at) => [operation, at]))
  const chain = finding.links
    .filter(({ before, after }) => (before < 0 || place.has(before)) && place.has(after))
    .map((link): ChainStep => {
      const before = place.get(link.before)
      return {
        type: link.type,
        ...(before === undefined ? {} : { before }),
        after: place.get(link.after)!,
        why: reasonOf(history, link),
      }
    })
  const { bounds, also } = finding
  const marks = marksOf(history, finding.blamed).map(({ mark, relation, afterNs }) => ({
    mark,
    relation,
    ...(afterNs === undefined ? {} : { afterNs: afterNs.toString() }),
  }))
  const cause = place.get(finding.cause)
  return {
    id,
    kind: finding.kind,
    ...(also.length > 0 ? { also: [...also] } : {}),
    promise,
    ...(finding.keyIds
      ? { keys: finding.keyIds.map((keyId) => history.keys.name(keyId)) }
      : { key: history.keys.name(finding.keyId) }),
    summary: finding.summary,
    blamed: place.get(finding.blamed)!,
    ...(cause === undefined ? {} : { cause }),
    operations: finding.exhibits.map(({ operation, role }) =>
      tellOperation(history, records, operation, role),
    ),
    ...(chain.length > 0 ? { chain } : {}),
    ...(bounds
      ? {
          bounds: {
            ...(bounds.from === undefined ? {} : { from: place.get(bounds.from)! }),
            fromCount: bounds.fromCount.toString(),
            toCount: bounds.toCount.toString(),
            least: bounds.least.toString(),
            most: bounds.most.toString(),
          },
        }
      : {}),
    ...(finding.margin === undefined ? {} : { marginNs: finding.margin.toString() }),
    ...(marks.length > 0 ? { marks } : {}),
  }
}

function tellOperation(history: History, records: Records, i: number, role: string): FindingOperation {
  const [own, close] = records.of(i)
  const fileName = (file: number): string => history.files[file].name
  const kind = history.kind[i]
  const value = (name: string, id: number): Record<string, string> =>
    id === NO_VALUE ? {} : { [name]: history.values.text(id) }
  const isAckedCas = kind === CAS && history.outcome[i] === ACKED
  return {
    file: fileName(own.place.file),
    line: own.place.line,
    ...(close && close.place.file !== own.place.file ? { closeFile: fileName(close.place.file) } : {}),
    ...(close ? { closeLine: close.place.line } : {}),
    role,
    client: history.clients.name(history.client[i]),
    ...(history.host[i] >= 0 ? { host: history.hosts.name(history.host[i]) } : {}),
    key: history.keys.name(history.key[i]),
    op: KIND_NAMES[kind],
    outcome: OUTCOME_NAMES[history.outcome[i]],
    ...value('value', history.value[i]),
    ...(kind === INCREMENT ? value('by', history.extra[i]) : {}),
    ...(kind === CAS ? value('expect', history.extra[i]) : {}),
    ...(kind === WRITE ? value('basis', history.extra[i]) : {}),
    ...(isAckedCas ? { applied: history.applied[i] === 1 } : {}),
    ...(isAckedCas && history.saw ? value('saw', history.saw[i]) : {}),
    startNs: history.times.startNs(i).toString(),
    ...(history.hasEnd[i] ? { endNs: history.times.endNs(i).toString() } : {}),
    record: own.text,
    ...(close ? { closeRecord: close.text } : {}),
  }
}

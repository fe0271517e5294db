/**
 * A survey for the terminal.
 */
import wrapAnsi from 'wrap-ansi'
import { duration, plural } from '../findings/telling.js'
import { formatProblem } from '../history/problems.js'
import type { Survey } from '../history/survey.js'
import { padded } from './page.js'
import { cut, printable } from './printable.js'

/** The survey as text of at most `width` columns (at least 60). */
export function surveyText(survey: Survey, width: number): string {
  const columns = Math.max(60, width)
  const span =
    survey.firstStart === undefined || survey.lastEnd === undefined
      ? undefined
      : BigInt(survey.lastEnd) - BigInt(survey.firstStart)
  const files = survey.inputs.map(({ file, bytes }) => `${printable(file)} (${bytes} bytes)`).join(', ')
  const lines = [
    `${survey.title ? `${printable(survey.title)}: ` : ''}${files}`,
    '',
    'operation     acked refused unsure     median        p99       most',
    ...survey.operations.map(({ op, acked, refused, unsure, latencyNs }) => {
      const latency = latencyNs
        ? [latencyNs.median, latencyNs.p99, latencyNs.most]
            .map((ns) => duration(BigInt(ns)).padStart(10))
            .join(' ')
        : ''
      return `${op.padEnd(10)} ${`${acked}`.padStart(8)} ${`${refused}`.padStart(7)} ${`${unsure}`.padStart(6)} ${latency}`.trimEnd()
    }),
    '',
    `${plural(survey.clients, 'client')}${survey.hosts > 0 ? ` on ${plural(survey.hosts, 'named host')}` : ''}; ${plural(survey.keys.register, 'register key')}, ${plural(survey.keys.counter, 'counter')}, ${survey.keys.mixed} mixed`,
    ...(span === undefined
      ? []
      : [
          `over ${duration(span)}${survey.perSecond === undefined ? '' : `, ${survey.perSecond.toPrecision(3)} operations a second`}`,
        ]),
    `in flight: ${survey.inFlight.mean.toFixed(1)} on average, ${survey.inFlight.most} at most; ${plural(survey.neverEnded, 'request')} never came back`,
    `clock error by the headers: ${duration(BigInt(survey.clockErrorNs))}`,
    survey.ambiguous.values === 0
      ? 'every value is written once on its key: each read names the write that it saw'
      : `${plural(survey.ambiguous.values, 'value')} written more than once; on ${plural(survey.ambiguous.keys, 'key')} a read could have seen either write`,
    ...busiest(survey, columns),
    ...gaps(survey),
    ...marks(survey, columns),
    ...survey.warnings.map(
      ({ file, line, text }) => `warning: ${printable(file ?? '')}:${line ?? ''}: ${printable(text)}`,
    ),
    ...problems(survey),
  ]
  return `${lines.map((line) => wrapAnsi(line, columns, { trim: false })).join('\n')}\n`
}

function busiest({ busiestKeys }: Survey, width: number): string[] {
  if (busiestKeys.length === 0) return []
  return [
    '',
    'busiest keys',
    ...busiestKeys.map(
      ({ key, operations }) => `${padded(key, Math.min(40, width - 12))} ${`${operations}`.padStart(9)}`,
    ),
  ]
}

function gaps({ gaps: silences, firstStart }: Survey): string[] {
  const shown = silences.filter(({ lengthNs }) => BigInt(lengthNs) > 0n)
  if (shown.length === 0 || firstStart === undefined) return []
  return [
    '',
    'longest silences',
    ...shown.map(
      ({ startNs, lengthNs }) =>
        `${duration(BigInt(lengthNs))} from +${duration(BigInt(startNs) - BigInt(firstStart))}`,
    ),
  ]
}

function marks({ marks: all, firstStart }: Survey, width: number): string[] {
  if (all.length === 0 || firstStart === undefined) return []
  return [
    '',
    'marks',
    ...all.map(({ mark, startNs, endNs }) => {
      const length = BigInt(endNs) - BigInt(startNs)
      return cut(
        `+${duration(BigInt(startNs) - BigInt(firstStart))}${length > 0n ? ` for ${duration(length)}` : ''}  ${mark}`,
        width,
      )
    }),
  ]
}

function problems({ problems: { count, first } }: Survey): string[] {
  if (count === 0) return []
  return [
    '',
    `${plural(count, 'record')} cannot be used and ${count === 1 ? 'is' : 'are'} left out above${count > first.length ? `; the first ${first.length}` : ''}:`,
    ...first.map((problem) => printable(formatProblem(problem as Parameters<typeof formatProblem>[0]))),
  ]
}

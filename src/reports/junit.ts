/**
 * A result as JUnit XML for build servers: a promise with its keys is a test case; broken is a failure, undecided an
 * error, since neither may pass for a pass.
 */
import junit, { type Builder } from 'junit-report-builder'
import type { Result } from '../findings/result.js'
import { counted, cut, printable } from './printable.js'

/** Findings that a failure tells. */
const TOLD = 20

// The package is CommonJS and calls itself a module: what it exports is the builder itself.
const builder = junit as unknown as Builder

export function junitReport(result: Result): string {
  const report = builder.newBuilder()
  const suite = report.testSuite().name(cut(result.history.title ?? 'misread check', 200))
  for (const { file } of result.inputs) suite.property('input', printable(file))
  suite.property('clockErrorNs', result.history.clockErrorNs)
  for (const { name, keys, verdict } of result.promises) {
    const test = suite
      .testCase()
      .className('misread')
      .name(`${cut(name, 200)} on ${cut(keys, 200)}`)
    if (verdict === 'broken') {
      const findings = result.findings.filter(({ promise }) => promise === name)
      const lines = findings.slice(0, TOLD).map(({ kind, summary, operations, blamed }) => {
        const { file, line } = operations[blamed]
        return `${kind}: ${cut(summary, 600)} (${printable(file)}:${line})`
      })
      if (findings.length > TOLD) lines.push(`and ${counted(findings.length - TOLD, 'finding')} more`)
      test
        .failure(`${counted(findings.length, 'finding')}`, 'broken')
        .standardOutput(inCdata(lines.join('\n')))
    }
    if (verdict === 'undecided') {
      const open = result.undecided.filter(({ promise }) => promise === name)
      const reasons = [...new Set(open.map(({ reason }) => reason))].map((reason) => cut(reason, 300))
      test.error(reasons.join('; ') || 'no key was decided', 'undecided')
    }
  }
  return `${report.build().trimEnd()}\n`
}

/** The text stands in a CDATA section, which these three characters would end. */
function inCdata(text: string): string {
  return text.replaceAll(']]>', ']] >')
}

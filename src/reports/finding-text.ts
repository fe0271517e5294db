/**
 * Findings in words and bars: what somebody pastes into a bug report.
 */
import type { Bounds, ChainStep, Finding } from '../findings/result.js'
import { duration } from '../findings/telling.js'
import type { CauseGroup, Paragraph } from '../findings/telling-order.js'
import { drawBars } from './bars.js'
import { howLong, place, whatItDid } from './operation-words.js'
import { displayWidth, type Page, padded } from './page.js'
import { counted, cut, printable } from './printable.js'
import { relativeTimes } from './relative-times.js'

const NAME_LENGTH = 60
const SUMMARY_LENGTH = 1200

/** The first paragraph of a cause with its evidence, the others in a sentence each. */
export function tellGroup(page: Page, [first, ...others]: CauseGroup, outFolder: string | undefined): void {
  tellParagraph(page, first, outFolder)
  if (others.length === 0) return
  page.blank()
  page.line(`  ${counted(others.length, 'more finding')} of the same cause:`)
  for (const [finding] of others) {
    const at = place(finding.operations[finding.blamed])
    page.prose(`${cut(finding.summary, SUMMARY_LENGTH)} (${finding.kind}, ${at})`, '    - ')
  }
}

function tellParagraph(page: Page, findings: Paragraph, outFolder: string | undefined): void {
  const [finding] = findings
  const { bold, red, dim } = page.colours
  const where = finding.key === undefined ? (finding.keys ?? []).join(', ') : finding.key
  page.prose(cut(where, NAME_LENGTH), `${red(bold(`[${finding.id}] ${finding.kind}`))}  `, bold)
  page.prose(cut(finding.summary, SUMMARY_LENGTH), '  ')
  page.prose(breaks(findings), '  ', dim)
  page.blank()
  tellOperations(page, finding)
  page.blank()
  if (finding.chain) tellChain(page, finding.chain)
  if (finding.bounds) tellBounds(page, finding.bounds, finding)
  if (finding.marginNs !== undefined) page.prose(margin(finding.marginNs), '  ')
  for (const { mark, relation, afterNs } of finding.marks ?? []) {
    const when = afterNs === undefined ? relation : `${duration(BigInt(afterNs))} ${relation}`
    page.prose(`The blamed operation came ${when} "${cut(mark, NAME_LENGTH)}".`, '  ')
  }
  if (outFolder === undefined) {
    page.prose('Counterexample: --out DIR writes it, a history of its own that is broken alone.', '  ', dim)
  } else if (finding.counterexample !== undefined) {
    page.prose(
      `Counterexample: ${printable(`${outFolder.replace(/\/$/, '')}/${finding.counterexample}`)}`,
      '  ',
    )
  }
}

/** "Breaks linearizable and regular. Also fits own-write-missed." */
function breaks(findings: Paragraph): string {
  const promises = [...new Set(findings.map(({ promise }) => promise))].map((name) => cut(name, NAME_LENGTH))
  const also = new Set(findings.flatMap(({ kind, also = [] }) => [kind, ...also]))
  also.delete(findings[0].kind)
  return `Breaks ${promises.join(', ')}.${also.size > 0 ? ` It is also: ${[...also].join(', ')}.` : ''}`
}

/** A line in words and a line with the bar for each operation, numbered in order of time. */
function tellOperations(page: Page, { operations, blamed }: Finding): void {
  const { bold, cyan, red, dim } = page.colours
  const times = relativeTimes(operations.map(({ startNs }) => BigInt(startNs)))
  const timeWidth = Math.max(...times.map((time) => time.length))
  const numberWidth = `${operations.length}`.length
  const places = operations.map(place)
  const indent = 2 + numberWidth + 2 + timeWidth + 2
  const placeWidth = Math.max(...places.map(displayWidth))
  const room = page.width - indent - 2
  const isBeside = room - placeWidth - 1 >= 24
  const barWidth = Math.min(64, isBeside ? room - placeWidth - 1 : room)
  const spans = operations.map(({ startNs, endNs, outcome }) => ({
    startNs: BigInt(startNs),
    endNs: endNs === undefined ? undefined : BigInt(endNs),
    unsure: outcome === 'unsure',
  }))
  const bars = drawBars(spans, barWidth)
  for (const [at, operation] of operations.entries()) {
    const lead = `  ${`${at + 1}`.padStart(numberWidth)}  ${times[at].padStart(timeWidth)}  `
    const words = `${cut(operation.client, NAME_LENGTH)} ${whatItDid(operation)}, ${howLong(operation)}: ${printable(operation.role)}`
    page.prose(words, lead, at === blamed ? bold : undefined)
    const bar = `${' '.repeat(indent)}▕${(at === blamed ? red : cyan)(bars[at])}▏`
    if (isBeside) page.line(`${bar} ${dim(padded(places[at], placeWidth))}`)
    else {
      page.line(bar)
      page.prose(places[at], ' '.repeat(indent), dim)
    }
  }
}

function tellChain(page: Page, chain: readonly ChainStep[]): void {
  page.line('  Why each must come before the next:')
  for (const { before, after, why } of chain) {
    page.prose(printable(why), `    ${before === undefined ? 'start' : before + 1} before ${after + 1}  `)
  }
  if (isCycle(chain)) page.prose('These cannot all be: they go round in a circle.', '  ')
}

/** Whether the steps lead back to where they began, each from where the last one led. */
function isCycle(chain: readonly ChainStep[]): boolean {
  return chain.every(({ after }, at) => chain[(at + 1) % chain.length].before === after)
}

function tellBounds(
  page: Page,
  { from, fromCount, toCount, least, most }: Bounds,
  { blamed }: Finding,
): void {
  const start = from === undefined ? `the start of the history (${fromCount})` : `${from + 1} (${fromCount})`
  const low = BigInt(fromCount) + BigInt(least)
  const high = BigInt(fromCount) + BigInt(most)
  page.prose(
    `Counted from ${start}: the increments between come to at least ${least} and at most ${most}, so ${blamed + 1} could return ${low === high ? `only ${low}` : low < high ? `${low} to ${high}` : 'no count at all'}; it returned ${toCount}.`,
    '  ',
  )
}

function margin(marginNs: string): string {
  if (marginNs === 'unbounded') return 'No clock can explain it.'
  return `It is still broken with every clock up to ${duration(BigInt(marginNs))} off.`
}

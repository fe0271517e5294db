/**
 * Freshness for the terminal.
 */
import { duration } from '../findings/telling.js'
import type { CurveBin, Freshness, FreshnessGroup } from '../freshness/figures.js'
import { Page, padded } from './page.js'
import { counted, cut, thousands } from './printable.js'

/** Columns of the bar of a share. */
const BAR = 20

/** The measurements as text of at most `width` columns (at least 60). */
export function freshnessText(
  freshness: Freshness,
  { width, colour }: { width: number; colour: boolean },
): string {
  const page = new Page(width, colour)
  for (const group of freshness.groups) tellGroup(page, group)
  const { counters, ambiguous, wrong } = freshness.leftOut
  const left = [
    counters > 0 ? `${counted(counters, 'read')} of keys with increments` : '',
    ambiguous > 0 ? `${counted(ambiguous, 'read')} that could have seen one of several writes` : '',
    wrong > 0 ? `${counted(wrong, 'read')} of what nobody wrote, or before it was written` : '',
  ].filter((text) => text !== '')
  if (left.length > 0) page.prose(`Not judged: ${left.join('; ')}.`)
  page.prose(
    `Clock error assumed: ${duration(BigInt(freshness.clockErrorNs))}. The figures speak of this recording, not of the store.`,
  )
  return page.toString()
}

function tellGroup(page: Page, group: FreshnessGroup): void {
  const { bold } = page.colours
  page.line(bold(cut(group.name, page.width)))
  if (group.reads === 0) {
    page.prose('No read that could be judged.', '  ')
    page.blank()
    return
  }
  const share = (100 * group.stale) / group.reads
  page.prose(
    `${counted(group.reads, 'read')}, ${thousands(group.afterWrite)} of them after an acknowledged write; ${thousands(group.stale)} stale (${share.toPrecision(2)}%).`,
    '  ',
  )
  if (group.staleNs && group.behind) {
    const { staleNs: s, behind: b } = group
    page.prose(
      `Stale reads were ${time(s.median)} behind in the median, ${time(s.p90)} at 90%, ${time(s.p99)} at 99%, ${time(s.most)} at most; ${counted(b.median, 'write')} behind in the median, ${thousands(b.most)} at most.`,
      '  ',
    )
  }
  if (group.afterWrite === 0) {
    page.blank()
    return
  }
  page.line('')
  page.line('  How long after a write may I read?')
  for (const { wanted, afterNs, reads, low } of group.answers) {
    const what = wanted === 'all' ? 'all reads' : wanted
    if (afterNs === undefined || reads === undefined || low === undefined) {
      page.prose(`${padded(what, 10)} no time after which so many were fresh was seen`, '    ')
      continue
    }
    const how = `of ${counted(reads, 'read')}; with 97.5% confidence at least ${(100 * low).toFixed(low > 0.99 ? 3 : 1)}%`
    page.prose(`${padded(what, 10)} from ${time(afterNs)} on (${how})`, '    ')
  }
  page.line('')
  page.line(`  ${padded('after the write', 22)}${'reads'.padStart(9)}  fresh`)
  for (const bin of group.curve) tellBin(page, bin)
  page.blank()
}

function tellBin(page: Page, { fromNs, toNs, reads, share, low, high }: CurveBin): void {
  const span = toNs === undefined ? `${time(fromNs)} and later` : `${time(fromNs)} to ${time(toNs)}`
  const percent = `${(100 * share).toFixed(share > 0.99 && share < 1 ? 2 : 1)}%`.padStart(7)
  const full = Math.round(BAR * share)
  const bar = page.width >= 80 ? ` ▕${'█'.repeat(full)}${' '.repeat(BAR - full)}▏` : ''
  page.line(
    `  ${padded(span, 22)}${thousands(reads).padStart(9)} ${percent}${bar} ${(100 * low).toFixed(1)}–${(100 * high).toFixed(1)}%`,
  )
}

function time(ns: string): string {
  return duration(BigInt(ns))
}

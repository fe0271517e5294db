/**
 * What the findings have in common: which promises broken keys still uphold, and which marks they stand beside.
 */
import type { Result } from '../findings/result.js'
import type { Page } from './page.js'
import { counted, cut } from './printable.js'

const NAME_LENGTH = 60
const KEYS_NAMED = 3

/** One line a set of promises that some broken keys still uphold. */
export function tellUpheld(page: Page, { keys }: Result): void {
  const groups = new Map<string, string[]>()
  for (const { key, upholds } of keys) {
    if (!upholds) continue
    const kept = upholds.length > 0 ? upholds.join(', ') : 'nothing of what was tested'
    groups.set(kept, [...(groups.get(kept) ?? []), key])
  }
  if (groups.size === 0) return
  page.blank()
  page.line(page.colours.bold('Broken keys still uphold'))
  for (const [kept, names] of groups) {
    const some = names.slice(0, KEYS_NAMED).map((name) => cut(name, NAME_LENGTH))
    const more = names.length > KEYS_NAMED ? ` and ${counted(names.length - KEYS_NAMED, 'more key')}` : ''
    page.prose(`${kept}: ${some.join(', ')}${more}`, '  ')
  }
}

/** A table of marks and the findings that fall in them or come after them. */
export function tellMarks(page: Page, { findings }: Result): void {
  const marks = new Map<string, { during: number; after: number }>()
  let without = 0
  for (const { marks: beside = [] } of findings) {
    if (beside.length === 0) without++
    for (const { mark, relation } of beside) {
      const tally = marks.get(mark) ?? { during: 0, after: 0 }
      tally[relation]++
      marks.set(mark, tally)
    }
  }
  if (marks.size === 0) return
  page.blank()
  page.line(page.colours.bold('Findings by mark'))
  page.line('  during    after  mark')
  for (const [mark, { during, after }] of marks) {
    page.prose(cut(mark, NAME_LENGTH), `  ${`${during}`.padStart(6)}   ${`${after}`.padStart(6)}  `)
  }
  if (without > 0) page.prose(`${counted(without, 'finding')} before any mark`, '  ')
}

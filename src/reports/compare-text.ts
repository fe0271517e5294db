/**
 * A comparison for the terminal.
 */
import type { ComparedGroup, Comparison } from '../findings/compare.js'
import { Page } from './page.js'
import { counted, cut } from './printable.js'

/** The comparison as text: new findings first, then those still there, then those gone. */
export function compareText(
  comparison: Comparison,
  { width, colour }: { width: number; colour: boolean },
): string {
  const page = new Page(width, colour)
  const { red, green, yellow, bold } = page.colours
  tell(page, 'new', comparison.new, (text) => red(bold(text)))
  tell(page, 'still there', comparison.still, (text) => yellow(text))
  tell(page, 'gone', comparison.gone, (text) => green(text))
  if (comparison.new.length === 0) page.prose('No finding is new.')
  return page.toString()
}

function tell(
  page: Page,
  title: string,
  groups: readonly ComparedGroup[],
  paint: (text: string) => string,
): void {
  if (groups.length === 0) return
  page.prose(`${title}:`, '', paint)
  for (const { kind, promise, key, old, new: now, example } of groups) {
    const change =
      old === 0 ? counted(now, 'finding') : now === 0 ? counted(old, 'finding') : `${old} before, ${now} now`
    page.prose(`${kind} on ${cut(key, 60)} under ${cut(promise, 60)}: ${change}`, '  - ')
    page.prose(`for example: ${cut(example, 400)}`, '    ')
  }
  page.blank()
}

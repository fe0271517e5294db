/**
 * Lines of text for a terminal of a given width; wraps by display width, before colour is put on.
 */
import pc from 'picocolors'
import stringWidth from 'string-width'
import wrapAnsi from 'wrap-ansi'

export type Colours = ReturnType<typeof pc.createColors>

/** Narrower terminals get lines of this width all the same. */
const NARROWEST = 60
/** Prose and bars on very wide screens are hard to follow. */
const WIDEST = 120

export class Page {
  readonly width: number
  readonly colours: Colours
  readonly #lines: string[] = []

  constructor(width: number, colour: boolean) {
    this.width = Math.min(Math.max(width, NARROWEST), WIDEST)
    this.colours = pc.createColors(colour)
  }

  blank(): void {
    if (this.#lines.length > 0 && this.#lines.at(-1) !== '') this.#lines.push('')
  }

  /** One line as it is. */
  line(text: string): void {
    this.#lines.push(text.trimEnd())
  }

  /** Wraps plain text: the first line after `lead`, the others indented as deep; then paints each line. */
  prose(text: string, lead = '', paint: (line: string) => string = (line) => line): void {
    const indent = displayWidth(lead)
    const rows = wrapAnsi(text, Math.max(20, this.width - indent), { hard: true }).split('\n')
    for (const [at, row] of rows.entries()) this.line((at === 0 ? lead : ' '.repeat(indent)) + paint(row))
  }

  toString(): string {
    return `${this.#lines.join('\n')}\n`
  }
}

/** Columns that a text takes on a terminal. */
export function displayWidth(text: string): number {
  return stringWidth(text)
}

/** Fills up with spaces to a display width. */
export function padded(text: string, width: number): string {
  return text + ' '.repeat(Math.max(0, width - displayWidth(text)))
}

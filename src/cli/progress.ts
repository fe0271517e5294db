/**
 * One line of progress on standard error, on a terminal only, after half a second.
 */
import type { Terminal } from './terminal.js'

const DELAY_MS = 500
const EVERY_MS = 100

export class Progress {
  readonly #terminal: Terminal
  readonly #started = Date.now()
  #last = 0
  #shown = false

  constructor(terminal: Terminal) {
    this.#terminal = terminal
  }

  show(what: string, done: number, total: number | undefined): void {
    if (!this.#terminal.progress) return
    const now = Date.now()
    if (now - this.#started < DELAY_MS || now - this.#last < EVERY_MS) return
    this.#last = now
    this.#shown = true
    const share = total ? ` ${Math.floor((100 * done) / total)}%` : ''
    const left =
      total && done > 0 ? `, ${Math.ceil(((now - this.#started) * (total - done)) / done / 1000)} s left` : ''
    this.#terminal.err.write(`\r\u001b[K${what}${share}${left}`)
  }

  /** Removes the line. */
  clear(): void {
    if (this.#shown) this.#terminal.err.write('\r\u001b[K')
    this.#shown = false
  }
}

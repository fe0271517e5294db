/**
 * The input's own text of operations, fetched again for what is shown.
 */
import { fileOf, type History } from '../history/columns.js'
import { fetchLines, type LinePlace } from '../history/lines.js'
import type { ByteSource } from '../history/source.js'

/** The records of operations, as they stand in the input. */
export class Records {
  readonly #history: History
  readonly #sources: readonly ByteSource[]
  readonly #wanted = new Map<string, LinePlace>()
  readonly #texts = new Map<string, string>()

  constructor(history: History, sources: readonly ByteSource[]) {
    this.#history = history
    this.#sources = sources
  }

  want(operation: number): void {
    for (const place of this.#places(operation)) this.#wanted.set(`${place.file}:${place.line}`, place)
  }

  async fetch(): Promise<void> {
    const places = [...this.#wanted.values()].filter(({ file, line }) => !this.#texts.has(`${file}:${line}`))
    if (places.length === 0) return
    const texts = await fetchLines(this.#sources, places)
    for (const [i, { file, line }] of places.entries()) this.#texts.set(`${file}:${line}`, texts[i])
  }

  /** The opening (or only) record, and the closing half where there is one, with their places. */
  of(operation: number): { place: LinePlace; text: string }[] {
    return this.#places(operation).map((place) => ({
      place,
      text: this.#texts.get(`${place.file}:${place.line}`)!,
    }))
  }

  #places(i: number): LinePlace[] {
    const { line, closeLine, closeFile } = this.#history
    const file = fileOf(this.#history, i)
    const places = [{ file, line: line[i] }]
    if (closeLine && closeLine[i] > 0) {
      places.push({ file: closeFile && closeFile[i] >= 0 ? closeFile[i] : file, line: closeLine[i] })
    }
    return places
  }
}

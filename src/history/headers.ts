/**
 * What the headers of all files say together.
 */
export interface Header {
  readonly title: string | undefined
  readonly clockErrorNs: bigint
  readonly initialUnknown: boolean | undefined
  /** key → value id */
  readonly initial: ReadonlyMap<string, number>
}

/** Where a header stands. */
export interface HeaderPlace {
  readonly file: string
  readonly line: number
}

/** An initial value and the first header that states it. */
export interface InitialValue {
  readonly value: number
  readonly place: HeaderPlace
}

export class Headers {
  title: string | undefined
  /** the largest of all */
  clockErrorNs = 0n
  initialUnknown: boolean | undefined
  readonly initial = new Map<string, InitialValue>()
  /** the first header that states `initialUnknown` */
  #unknownPlace: HeaderPlace | undefined

  /** Joins a header to the others; what contradicts them, if anything (then nothing is joined). */
  add(header: Header, place: HeaderPlace): { found: string; expected: string } | undefined {
    for (const [key, value] of header.initial) {
      const known = this.initial.get(key)
      if (known !== undefined && known.value !== value) {
        return {
          found: `another initial value of ${JSON.stringify(key)} than ${nameOf(known.place)} states`,
          expected: 'one initial value a key',
        }
      }
    }
    const { initialUnknown } = header
    if (
      initialUnknown !== undefined &&
      this.initialUnknown !== undefined &&
      initialUnknown !== this.initialUnknown
    ) {
      return {
        found: `initialUnknown ${initialUnknown}`,
        expected: `${this.initialUnknown} as at ${nameOf(this.#unknownPlace!)}`,
      }
    }
    for (const [key, value] of header.initial) {
      if (!this.initial.has(key)) this.initial.set(key, { value, place })
    }
    if (initialUnknown !== undefined && this.initialUnknown === undefined) {
      this.initialUnknown = initialUnknown
      this.#unknownPlace = place
    }
    this.title ??= header.title
    if (header.clockErrorNs > this.clockErrorNs) this.clockErrorNs = header.clockErrorNs
    return undefined
  }
}

function nameOf({ file, line }: HeaderPlace): string {
  return `${file}:${line}`
}

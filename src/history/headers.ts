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

export class Headers {
  title: string | undefined
  /** the largest of all */
  clockErrorNs = 0n
  initialUnknown: boolean | undefined
  readonly initial = new Map<string, number>()

  /** Joins a header to the others; what contradicts them, if anything (then nothing is joined). */
  add(header: Header): { found: string; expected: string } | undefined {
    for (const [key, value] of header.initial) {
      const known = this.initial.get(key)
      if (known !== undefined && known !== value) {
        return {
          found: `another initial value of ${JSON.stringify(key)} than an earlier header states`,
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
        expected: `${this.initialUnknown} as in an earlier header`,
      }
    }
    for (const [key, value] of header.initial) this.initial.set(key, value)
    this.initialUnknown ??= initialUnknown
    this.title ??= header.title
    if (header.clockErrorNs > this.clockErrorNs) this.clockErrorNs = header.clockErrorNs
    return undefined
  }
}

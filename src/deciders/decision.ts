/** What a decider answers about one promise on one key. */
export type Decision =
  | {
      readonly verdict: 'holds'
      /** none of the pairs that the promise adds bound a read here: a check of nothing */
      readonly untested: boolean
    }
  | { readonly verdict: 'broken' }
  | {
      readonly verdict: 'undecided'
      /** why, in plain words */
      readonly reason: string
      /** how far the search came, where there was one */
      readonly progress?: string
    }
  /** the promise means nothing on a key of this kind */
  | { readonly verdict: 'left-out'; readonly reason: string }

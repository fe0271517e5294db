/**
 * What a broken promise is called (findings.md), worst first: the order in which the text tells them.
 */
export const FINDING_KINDS = [
  'lost-write',
  'lost-increment',
  'lost-update',
  'reverted-value',
  'torn-row',
  'unwritten-value',
  'refused-write-seen',
  'early-read',
  'repeated-increment',
  'backward-counter',
  'own-write-missed',
  'backward-read',
  'causal-inversion',
  'stale-read',
  'read-inversion',
  'order-conflict',
] as const
export type FindingKind = (typeof FINDING_KINDS)[number]

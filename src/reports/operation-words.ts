/**
 * What an operation did, in words: "read "vessel-40016"", "tried to increment by 2 (unsure)".
 */

import type { FindingOperation } from '../findings/result.js'
import { duration } from '../findings/telling.js'
import { cut } from './printable.js'

const VALUE_LENGTH = 40

export function whatItDid(operation: FindingOperation): string {
  const { outcome } = operation
  const words = VERBS[operation.op](operation)
  if (outcome === 'acked') return words.done
  return `${words.tried} (${outcome === 'refused' ? 'refused' : 'unsure'})`
}

/** "took 1.2 ms", "never came back". */
export function howLong({ startNs, endNs }: FindingOperation): string {
  if (endNs === undefined) return 'never came back'
  return `took ${duration(BigInt(endNs) - BigInt(startNs))}`
}

/** "drill.ndjson:81", both halves of a split record: "drill.ndjson:81,90". */
export function place({ file, line, closeFile, closeLine }: FindingOperation): string {
  const own = `${cut(file, 80)}:${line}`
  if (closeLine === undefined) return own
  return closeFile === undefined ? `${own},${closeLine}` : `${own}, ${cut(closeFile, 80)}:${closeLine}`
}

/** A value as its canonical JSON text, cut with its size said; absence in words. */
function shown(value: string | undefined): string {
  if (value === undefined) return '?'
  return value === 'null' ? 'nothing (absent)' : cut(value, VALUE_LENGTH)
}

interface Words {
  readonly done: string
  readonly tried: string
}

const VERBS: Record<FindingOperation['op'], (operation: FindingOperation) => Words> = {
  read: ({ value }) => ({ done: `read ${shown(value)}`, tried: 'tried to read' }),
  write: ({ value, basis }) => {
    const from = basis === undefined ? '' : ` computed from ${shown(basis)}`
    return { done: `wrote ${shown(value)}${from}`, tried: `tried to write ${shown(value)}${from}` }
  },
  delete: () => ({ done: 'deleted it', tried: 'tried to delete it' }),
  increment: ({ by = '1', value }) => {
    const size = by.startsWith('-') ? `decremented by ${by.slice(1)}` : `incremented by ${by}`
    const tried = by.startsWith('-') ? `decrement by ${by.slice(1)}` : `increment by ${by}`
    return {
      done: value === undefined ? size : `${size}, count after it ${shown(value)}`,
      tried: `tried to ${tried}`,
    }
  },
  cas: ({ value, expect, applied, saw }) => {
    const change = `${shown(expect)} to ${shown(value)}`
    const found = saw === undefined ? '' : `, found ${shown(saw)}`
    return {
      done: applied === false ? `cas ${change}: not applied${found}` : `cas ${change}: applied`,
      tried: `tried cas ${change}`,
    }
  },
}

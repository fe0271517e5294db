/**
 * What a verification found, for the terminal.
 */
import type { Verification } from '../certificates/verify/verify.js'
import { duration } from '../findings/telling.js'
import { Page } from './page.js'
import { counted, cut } from './printable.js'

/** Most refusals that are told. */
const TOLD = 20

/** The verification as text: what was refused and where, or what was proved and what was not. */
export function verifyText(
  { about, refusals, proved, unproved, undecided, leftOut }: Verification,
  { width, colour }: { width: number; colour: boolean },
): string {
  const page = new Page(width, colour)
  const { red, green, yellow, bold } = page.colours
  if (refusals.length > 0) {
    page.line(red(bold('refused')))
    for (const { line, key, promise, why } of refusals.slice(0, TOLD)) {
      const where = [
        line === undefined ? '' : `line ${line}`,
        key === undefined ? '' : `key ${cut(key, 60)}`,
        promise === undefined ? '' : cut(promise, 60),
      ].filter((text) => text !== '')
      page.prose(`${where.length > 0 ? `${where.join(', ')}: ` : ''}${cut(why, 300)}`, '  - ')
    }
    if (refusals.length > TOLD) page.prose(`and ${refusals.length - TOLD} more`, '  - ')
  } else {
    page.line(green(bold('accepted')))
  }
  page.prose(
    `Proved: ${counted(proved.holds, 'claim')} that a promise holds, ${counted(proved.broken, 'claim')} that one is broken.`,
  )
  if (unproved > 0) {
    page.prose(
      `Not proved: ${counted(unproved, 'claim')} of a broken promise whose counterexample is too large to try every order of.`,
      '',
      yellow,
    )
  }
  if (undecided > 0) page.prose(`Undecided, so nothing to prove: ${counted(undecided, 'claim')}.`, '', yellow)
  if (leftOut > 0) page.prose(`Left out, where the promise means nothing: ${counted(leftOut, 'claim')}.`)
  // Nobody can refuse what was never asked: the reader has to see what was.
  if (about) page.prose(`It is about ${subjectOf(about)}.`)
  return page.toString()
}

/** The promises with their keys, and the clock error that they were held to. */
function subjectOf({ promises, onlyKeys, clockErrorNs }: NonNullable<Verification['about']>): string {
  const named = promises
    .slice(0, TOLD)
    .map(({ name, keys }) => cut(keys === '**' ? name : `${name} on ${keys}`, 100))
  if (promises.length > TOLD) named.push(`${promises.length - TOLD} promises more`)
  const keys = onlyKeys ? `keys ${onlyKeys.map((glob) => cut(glob, 60)).join(', ')} alone` : 'every key'
  return `${named.join('; ')}; on ${keys}; with clocks at most ${duration(BigInt(clockErrorNs))} off`
}

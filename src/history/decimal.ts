/**
 * Decimal numbers as JSON writes them, exact: no number passes through a double.
 */

/** value = ±digits · 10^exponent; digits without leading or trailing zeros, '' for zero. */
export interface Decimal {
  readonly negative: boolean
  readonly digits: string
  readonly exponent: bigint
}

const NUMBER = /^(-?)(0|[1-9][0-9]*)(?:\.([0-9]+))?(?:[eE]([+-]?[0-9]+))?$/

/** Exponents with more digits than this are refused: no store holds such a number. */
const EXPONENT_DIGITS = 1000

/**
 * Parses a JSON number, or undefined when the text is none (or its exponent is out of all reason). O(length): long
 * runs of zeros are hostile to regular expressions.
 */
export function parseDecimal(text: string): Decimal | undefined {
  const match = NUMBER.exec(text)
  if (!match) return undefined
  const [, sign, whole, fraction = '', power = '0'] = match
  const all = whole + fraction
  let from = 0
  while (from < all.length && all.charCodeAt(from) === ZERO) from++
  if (from === all.length) return { negative: false, digits: '', exponent: 0n }
  let to = all.length
  while (all.charCodeAt(to - 1) === ZERO) to--
  const exponent = parseExponent(power)
  if (exponent === undefined) return undefined
  return {
    negative: sign === '-',
    digits: all.slice(from, to),
    exponent: exponent - BigInt(fraction.length) + BigInt(all.length - to),
  }
}

const ZERO = 0x30

function parseExponent(text: string): bigint | undefined {
  let from = text[0] === '-' || text[0] === '+' ? 1 : 0
  while (from < text.length - 1 && text.charCodeAt(from) === ZERO) from++
  if (text.length - from > EXPONENT_DIGITS) return undefined
  const size = BigInt(text.slice(from))
  return text[0] === '-' ? -size : size
}

/** The most digits that a number is written out with before it is written with an exponent. */
export const WRITTEN_OUT = 40

/** The one spelling of a decimal's value that canonical texts use; it is a JSON number itself. */
export function canonicalNumber({ negative, digits, exponent }: Decimal): string {
  if (digits === '') return '0'
  const sign = negative ? '-' : ''
  const most = BigInt(WRITTEN_OUT)
  const length = BigInt(digits.length)
  if (exponent >= 0n && length + exponent <= most) return sign + digits + '0'.repeat(Number(exponent))
  if (exponent < 0n && -exponent <= most && length <= most) {
    const places = Number(-exponent)
    const padded = digits.padStart(places + 1, '0')
    return `${sign}${padded.slice(0, -places)}.${padded.slice(-places)}`
  }
  return `${sign}${digits}e${exponent}`
}

/** Exponents beyond this are no counts that anybody means; they stay out of big integers. */
const LARGEST_EXPONENT = 1000n

/** The decimal times 10^shift as a whole number; 'fraction' or 'huge' when it is none of sane size. */
export function toInteger(decimal: Decimal, shift = 0): bigint | 'fraction' | 'huge' {
  if (decimal.digits === '') return 0n
  const exponent = decimal.exponent + BigInt(shift)
  if (exponent < 0n) return 'fraction'
  if (exponent > LARGEST_EXPONENT || decimal.digits.length > 4000) return 'huge'
  const size = BigInt(decimal.digits) * 10n ** exponent
  return decimal.negative ? -size : size
}

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
const EXPONENT_DIGITS = 18

/** Parses a JSON number, or undefined when the text is none (or its exponent is out of all reason). */
export function parseDecimal(text: string): Decimal | undefined {
  const match = NUMBER.exec(text)
  if (!match || (match[4] !== undefined && match[4].length > EXPONENT_DIGITS)) return undefined
  const [, sign, whole, fraction = '', power = '0'] = match
  const all = (whole + fraction).replace(/^0+/, '')
  const digits = all.replace(/0+$/, '')
  if (digits === '') return { negative: false, digits: '', exponent: 0n }
  const exponent = BigInt(power) - BigInt(fraction.length) + BigInt(all.length - digits.length)
  return { negative: sign === '-', digits, exponent }
}

/** The most digits that a number is written out with before it is written with an exponent. */
const WRITTEN_OUT = 40n

/** The one spelling of a decimal's value that canonical texts use; it is a JSON number itself. */
export function canonicalNumber({ negative, digits, exponent }: Decimal): string {
  if (digits === '') return '0'
  const sign = negative ? '-' : ''
  const length = BigInt(digits.length)
  if (exponent >= 0n && length + exponent <= WRITTEN_OUT) return sign + digits + '0'.repeat(Number(exponent))
  if (exponent < 0n && -exponent <= WRITTEN_OUT && length <= WRITTEN_OUT) {
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

import { Fault } from '../core'
import type { Json } from './workbook'

/** What a hash is taken of, part by part: a text, or numbers. */
export type HashPart = string | Float64Array

/** Below this a cell holds 0: workbooks know no subnormal numbers, and no zero with a sign. */
const SMALLEST_IN_A_CELL = 2.2250738585072014e-308

/** A number as a cell gives it back. */
export const inACell = (value: number): number => (Math.abs(value) < SMALLEST_IN_A_CELL ? 0 : value)

/**
 * SHA-256 of parts, in hexadecimal digits. The bytes, so that anyone can take the same hash with tools of their own, are those of the parts
 * one after another, all integers unsigned with the lowest byte first:
 *
 *   a text    the letter t, the length of its UTF-8 form in bytes (4 bytes), that form
 *   numbers   the letter n, how many they are (4 bytes), each as an IEEE 754 double (8 bytes, lowest first);
 *             a gap is 00 00 00 00 00 00 f8 7f, and what is nearer to 0 than 2^-1022 is 0 without a sign
 *
 * @throws Fault  "host" where the page was not loaded from a secure address: there is no such function then
 * @source        NIST FIPS 180-4 (2015), Secure Hash Standard, as implemented by the host's Web Cryptography
 * @cost          O(bytes)
 */
export async function hashOf(parts: readonly HashPart[]): Promise<string> {
  // present by its type alone: browsers leave it out where the page came over a plain connection
  const subtle = (globalThis.crypto as Crypto | undefined)?.subtle as SubtleCrypto | undefined
  if (!subtle)
    throw new Fault(
      'host',
      'this page was not loaded over a secure connection, so no hash can be taken',
      'an address that begins with https or localhost is needed',
    )
  const encoder = new TextEncoder()
  const encoded = parts.map((part) => (typeof part === 'string' ? encoder.encode(part) : part))
  const size = encoded.reduce((sum, part) => sum + 5 + part.byteLength, 0)
  const bytes = new DataView(new ArrayBuffer(size))
  let at = 0
  for (const part of encoded) {
    const isText = part instanceof Uint8Array
    bytes.setUint8(at, (isText ? 't' : 'n').charCodeAt(0))
    bytes.setUint32(at + 1, part.length, true)
    at += 5
    if (isText) new Uint8Array(bytes.buffer, at).set(part)
    else
      for (let k = 0; k < part.length; k++) {
        const value = part[k]!
        // the bits of a NaN are not otherwise the same everywhere
        if (Number.isNaN(value)) bytes.setUint32(at + 8 * k + 4, 0x7ff80000, true)
        else bytes.setFloat64(at + 8 * k, inACell(value), true)
      }
    at += part.byteLength
  }
  const digest = new Uint8Array(await subtle.digest('SHA-256', bytes.buffer))
  return Array.from(digest, (byte) => byte.toString(16).padStart(2, '0')).join('')
}

/**
 * JSON without spaces, the members of each object in the order of their names' UTF-16 code units, so that equal settings are equal texts.
 *
 * @example sortedJson({ b: [1, 'x'], a: null }) // '{"a":null,"b":[1,"x"]}'
 */
export function sortedJson(value: Json): string {
  if (typeof value !== 'object' || value === null) return JSON.stringify(value)
  if (Array.isArray(value)) return `[${(value as readonly Json[]).map(sortedJson).join(',')}]`
  const members = Object.entries(value as { readonly [key: string]: Json })
  return `{${members
    .sort(([a], [b]) => (a < b ? -1 : 1))
    .map(([key, inner]) => `${JSON.stringify(key)}:${sortedJson(inner)}`)
    .join(',')}}`
}

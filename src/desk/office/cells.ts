/** What a value written through the API becomes in a cell, and what a cell shows: the host's rules of entry and display. */
import { CellValueType, numfmt, type ICellData, type IStyleData } from '@univerjs/core'
import { NO_CONTENT, isErrorValue, type StoredCell } from './book'
import { OfficeError } from './error'

const isText = (pattern: string): boolean => /^(@+|text)$/i.test(pattern)

const stored = (v: string | number, t: CellValueType, s?: IStyleData): ICellData => ({
  ...NO_CONTENT,
  v,
  t,
  ...(s ? { s } : {}),
})

/**
 * Text that looks like something else is marked as text: when its style is changed later, the grid would otherwise read "42" anew as a
 * number, and when it is edited, "=1+1" as a formula.
 */
function text(v: string): ICellData {
  const looksOtherwise =
    /^[=+\-@']|^(true|false)$/i.test(v) || isErrorValue(v) || (v.trim() !== '' && !Number.isNaN(Number(v)))
  return stored(v, looksOtherwise ? CellValueType.FORCE_STRING : CellValueType.STRING)
}

const formula = (f: string): ICellData => ({ ...NO_CONTENT, f })

/**
 * What `value` becomes in a cell of number format `pattern`; undefined leaves the cell alone.
 *
 * @throws OfficeError InvalidArgument for what is no cell value: an object, a function, NaN
 */
export function entered(value: unknown, pattern: string): ICellData | undefined {
  if (value === null) return undefined
  if (typeof value === 'number' && Number.isFinite(value))
    return isText(pattern) ? text(String(value)) : stored(value, CellValueType.NUMBER)
  if (typeof value === 'boolean')
    return isText(pattern) ? text(String(value).toUpperCase()) : stored(value ? 1 : 0, CellValueType.BOOLEAN)
  if (typeof value !== 'string') throw new OfficeError('InvalidArgument', `${String(value)} is no cell value`)
  if (value === '') return NO_CONTENT
  if (value.startsWith("'")) return value === "'" ? NO_CONTENT : text(value.slice(1))
  if (isText(pattern)) return text(value)
  if (isErrorValue(value)) return stored(value, CellValueType.STRING)
  const general = pattern === 'General'
  const parsed = /^[\s$€£¥+\-(.\d]|^(true|false)$/i.test(value) ? numfmt.parseValue(value) : null
  if (typeof parsed?.v === 'boolean') return stored(parsed.v ? 1 : 0, CellValueType.BOOLEAN)
  if (typeof parsed?.v === 'number')
    return stored(
      parsed.v,
      CellValueType.NUMBER,
      general && parsed.z ? { n: { pattern: parsed.z } } : undefined,
    )
  if (/^=./.test(value)) return formula(value)
  if (/^[+\-@]./.test(value)) return formula(`=${value.replace(/^\+/, '')}`)
  return text(value)
}

/** The text a cell shows, in the culture's language. */
export function shown({ value, kind, pattern }: StoredCell, culture: string): string {
  if (kind === 'Boolean') return String(value).toUpperCase()
  if (kind === 'Error' || kind === 'Empty') return String(value)
  return numfmt.format(pattern === '' ? 'General' : pattern, value, { locale: culture, throws: false })
}

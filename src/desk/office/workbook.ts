/** The workbook and its collections: sheets, names, settings, tables; the application around it. */
import { rectAt } from './addresses'
import type { Book, NameRecord, Sheet } from './book'
import { OfficeError } from './error'
import { RANGE, RANGE_AREAS, fullAddress, placeOfReference, type Place, type Places } from './range'
import type { Find, Kind } from './request-context'
import { WORKSHEET } from './worksheet'

const range = () => RANGE

/** The two ways to ask for an item by its key. */
function item<T>(
  kind: () => Kind<never>,
  find: (target: T, key: string) => unknown,
): Record<string, Find<T>> {
  return { getItem: { kind, find }, getItemOrNullObject: { kind, find, orNull: true } }
}

const WORKSHEETS: Kind<Book> = {
  name: 'WorksheetCollection',
  list: { kind: () => WORKSHEET, read: (book) => book.sheets() },
  answers: { getCount: (book, visibleOnly = false) => shownOrAll(book, visibleOnly).length },
  finds: {
    ...item(
      () => WORKSHEET,
      (book: Book, key) => book.sheet(key),
    ),
    getActiveWorksheet: { kind: () => WORKSHEET, find: (book) => book.activeSheet },
    getFirst: {
      kind: () => WORKSHEET,
      find: (book, visibleOnly = false) => shownOrAll(book, visibleOnly)[0] ?? null,
    },
    getLast: {
      kind: () => WORKSHEET,
      find: (book, visibleOnly = false) => shownOrAll(book, visibleOnly).at(-1) ?? null,
    },
    add: { kind: () => WORKSHEET, writes: true, find: (book, name?: string) => book.addSheet(name) },
  },
  events: {
    onChanged: { topic: 'changed' },
    onCalculated: { topic: 'calculated' },
    onAdded: { topic: 'added' },
    onDeleted: { topic: 'deleted' },
    onNameChanged: { topic: 'renamed' },
    onActivated: { topic: 'activated' },
    onDeactivated: { topic: 'deactivated' },
    onSelectionChanged: { topic: 'sheetSelection' },
  },
}

const shownOrAll = (book: Book, visibleOnly: boolean) =>
  book.sheets().filter((sheet) => !visibleOnly || sheet.isShown)

/** A name is known by its text, so that the object follows it through changes of what it refers to. */
interface Name {
  readonly book: Book
  readonly name: string
}

function record({ book, name }: Name): NameRecord {
  const found = book.name(name)
  if (!found) throw new OfficeError('ItemNotFound', `there is no name "${name}"`)
  return found
}

const formulaOf = ({ formulaOrRefString }: NameRecord): string => `=${formulaOrRefString.replace(/^=/, '')}`

const placeOf = (name: Name): Place | null => placeOfReference(name, record(name).formulaOrRefString)

/** What a name stands for: the address of its cells, or its constant. */
function valueOf(name: Name): unknown {
  const place = placeOf(name)
  if (place) return fullAddress(place, true)
  const formula = formulaOf(record(name)).slice(1)
  if (/^#/.test(formula) || formula.includes('#REF!')) return '#REF!'
  const quoted = /^"(.*)"$/.exec(formula)
  if (quoted) return (quoted[1] ?? '').replaceAll('""', '"')
  if (/^(true|false)$/i.test(formula)) return /^true$/i.test(formula)
  if (formula.trim() !== '' && Number.isFinite(Number(formula))) return Number(formula)
  throw new OfficeError('NotImplemented', `the desk does not work out the name's formula ${formula}`)
}

function typeOf(name: Name): string {
  if (placeOf(name)) return 'Range'
  const value = valueOf(name)
  if (value === '#REF!') return 'Error'
  return { number: 'Double', boolean: 'Boolean' }[typeof value as 'number' | 'boolean'] ?? 'String'
}

const NAMED_ITEM: Kind<Name> = {
  name: 'NamedItem',
  check: (name) => void record(name),
  scalars: {
    name: { read: (name) => record(name).name },
    formula: {
      read: (name) => formulaOf(record(name)),
      write: (name: Name, formula: string) =>
        name.book.setName({ ...record(name), formulaOrRefString: referenceOf(formula) }),
    },
    value: { read: valueOf },
    type: { read: typeOf },
    scope: { read: () => 'Workbook' },
    visible: {
      read: (name) => !record(name).hidden,
      write: (name: Name, visible: boolean) => name.book.setName({ ...record(name), hidden: !visible }),
    },
    comment: {
      read: (name) => record(name).comment ?? '',
      write: (name: Name, comment: string) => name.book.setName({ ...record(name), comment }),
    },
  },
  finds: {
    getRange: {
      kind: range,
      find: (name) => {
        const place = placeOf(name)
        if (!place) throw new OfficeError('InvalidReference', `the name "${name.name}" refers to no range`)
        return place
      },
    },
    getRangeOrNullObject: { kind: range, orNull: true, find: placeOf },
  },
  acts: { delete: (name) => name.book.removeName(record(name)) },
}

/** How the grid stores what a name refers to: cells without the equals sign, anything else as a formula; plain text as a constant. */
function referenceOf(given: Place | string): string {
  if (typeof given !== 'string') return fullAddress(given, true)
  if (!given.startsWith('=')) return `="${given.replaceAll('"', '""')}"`
  return /^=.*![$\w:]+$/.test(given) ? given.slice(1) : given
}

function checkName(book: Book, name: string): void {
  const looksLikeCell = /^\$?[a-z]{1,3}\$?\d+$/i.test(name) || /^(r\d*)?(c\d*)?$/i.test(name)
  if (!/^[\p{L}_\\][\p{L}\p{N}_.\\]{0,254}$/u.test(name) || looksLikeCell)
    throw new OfficeError('InvalidArgument', `"${name}" cannot be a name`)
  if (book.name(name)) throw new OfficeError('ItemAlreadyExists', `the name "${name}" exists`)
}

const NAMES: Kind<Book> = {
  name: 'NamedItemCollection',
  list: { kind: () => NAMED_ITEM, read: (book) => book.names().map(({ name }): Name => ({ book, name })) },
  answers: { getCount: (book) => book.names().length },
  finds: {
    ...item(
      () => NAMED_ITEM,
      (book: Book, name): Name | null => (book.name(name) ? { book, name } : null),
    ),
    add: {
      kind: () => NAMED_ITEM,
      writes: true,
      find: (book, name: string, given: Place | string, comment = ''): Name => {
        checkName(book, name)
        const id = `name-${name.toLowerCase()}`
        book.setName({ id, name, formulaOrRefString: referenceOf(given), comment, hidden: false })
        return { book, name }
      },
    },
  },
}

interface Setting {
  readonly book: Book
  readonly key: string
}

/** What a setting's value is after it has been through the file. */
function jsonCopy(value: unknown): unknown {
  const text = JSON.stringify(value) as string | undefined
  if (text === undefined)
    throw new OfficeError('InvalidArgument', 'a setting needs a value that JSON can hold')
  return JSON.parse(text) as unknown
}

const SETTING: Kind<Setting> = {
  name: 'Setting',
  check: ({ book, key }) => {
    if (!book.settings.has(key)) throw new OfficeError('ItemNotFound', `there is no setting "${key}"`)
  },
  scalars: {
    key: { read: ({ key }) => key },
    value: {
      read: ({ book, key }) => jsonCopy(book.settings.get(key)),
      write: ({ book, key }: Setting, value: unknown) => void book.settings.set(key, jsonCopy(value)),
    },
  },
  acts: { delete: ({ book, key }) => void book.settings.delete(key) },
}

const SETTINGS: Kind<Book> = {
  name: 'SettingCollection',
  list: {
    kind: () => SETTING,
    read: (book) => [...book.settings.keys()].map((key): Setting => ({ book, key })),
  },
  answers: { getCount: (book) => book.settings.size },
  finds: {
    ...item(
      () => SETTING,
      (book: Book, key): Setting | null => (book.settings.has(key) ? { book, key } : null),
    ),
    add: {
      kind: () => SETTING,
      writes: true,
      find: (book, key: string, value: unknown): Setting => {
        book.settings.set(key, jsonCopy(value))
        return { book, key }
      },
    },
  },
}

interface Table {
  readonly book: Book
  readonly id: string
}

function table({ book, id }: Table) {
  const found = book.tables().find((known) => known.id === id)
  if (!found) throw new OfficeError('ItemNotFound', 'the table was deleted')
  return found
}

const TABLE: Kind<Table> = {
  name: 'Table',
  check: (target) => void table(target),
  scalars: { id: { read: ({ id }) => id }, name: { read: (target) => table(target).name } },
  parts: { worksheet: { kind: () => WORKSHEET, find: (target) => table(target).sheet } },
  finds: {
    getRange: { kind: range, find: (target) => ({ sheet: table(target).sheet, rect: table(target).rect }) },
    getHeaderRowRange: {
      kind: range,
      find: (target) => {
        const { sheet, rect } = table(target)
        return { sheet, rect: { ...rect, bottom: rect.top } }
      },
    },
    getDataBodyRange: {
      kind: range,
      find: (target) => {
        const { sheet, rect } = table(target)
        return { sheet, rect: { ...rect, top: rect.top + 1 } }
      },
    },
  },
}

const TABLES: Kind<Book> = {
  name: 'TableCollection',
  list: { kind: () => TABLE, read: (book) => book.tables().map(({ id }): Table => ({ book, id })) },
  answers: { getCount: (book) => book.tables().length },
  finds: item(
    () => TABLE,
    (book: Book, key): Table | null => {
      const found = book
        .tables()
        .find(({ id, name }) => id === key || name.toLowerCase() === key.toLowerCase())
      return found ? { book, id: found.id } : null
    },
  ),
}

const NUMBER_FORMAT: Kind<Book> = {
  name: 'NumberFormatInfo',
  scalars: {
    numberDecimalSeparator: { read: ({ culture }) => culture.numberDecimalSeparator },
    numberGroupSeparator: { read: ({ culture }) => culture.numberGroupSeparator },
  },
}

const DATETIME_FORMAT: Kind<Book> = {
  name: 'DatetimeFormatInfo',
  scalars: {
    dateSeparator: { read: ({ culture }) => culture.dateSeparator },
    shortDatePattern: { read: ({ culture }) => culture.shortDatePattern },
  },
}

const CULTURE: Kind<Book> = {
  name: 'CultureInfo',
  scalars: { name: { read: ({ culture }) => culture.name } },
  parts: {
    numberFormat: { kind: () => NUMBER_FORMAT, find: (book) => book },
    datetimeFormat: { kind: () => DATETIME_FORMAT, find: (book) => book },
  },
}

const APPLICATION: Kind<Book> = {
  name: 'Application',
  scalars: {
    calculationMode: {
      read: () => 'Automatic',
      write: (_: Book, mode: string) => {
        if (mode !== 'Automatic')
          throw new OfficeError('NotImplemented', 'the desk always calculates by itself')
      },
    },
    calculationState: { read: () => 'Done' },
    decimalSeparator: { read: ({ culture }) => culture.numberDecimalSeparator },
    thousandsSeparator: { read: ({ culture }) => culture.numberGroupSeparator },
    useSystemSeparators: { read: () => true },
  },
  parts: { cultureInfo: { kind: () => CULTURE, find: (book) => book } },
  acts: {
    calculate: (book) => book.recalculate(),
    // The grid redraws between tasks, never within a request: there is nothing to hold back.
    suspendScreenUpdatingUntilNextSync: () => undefined,
    suspendApiCalculationUntilNextSync: (book) => {
      book.calculationSuspended = true
    },
  },
}

function selected(book: Book): Places {
  const sheet: Sheet = book.activeSheet
  return { sheet, rects: book.selection() }
}

const WORKBOOK: Kind<Book> = {
  name: 'Workbook',
  scalars: { name: { read: (book) => book.workbook.getName() } },
  parts: {
    worksheets: { kind: () => WORKSHEETS, find: (book) => book },
    names: { kind: () => NAMES, find: (book) => book },
    settings: { kind: () => SETTINGS, find: (book) => book },
    tables: { kind: () => TABLES, find: (book) => book },
    application: { kind: () => APPLICATION, find: (book) => book },
  },
  finds: {
    getSelectedRange: {
      kind: range,
      find: (book) => {
        const { sheet, rects } = selected(book)
        const [rect, second] = rects
        if (second) throw new OfficeError('InvalidSelection', 'several areas are selected')
        return { sheet, rect: rect ?? rectAt(0, 0, 1, 1) }
      },
    },
    getSelectedRanges: { kind: () => RANGE_AREAS, find: selected },
    getActiveCell: {
      kind: range,
      find: (book) => {
        const { sheet, rects } = selected(book)
        const last = rects.at(-1)
        return { sheet, rect: rectAt(last?.top ?? 0, last?.left ?? 0, 1, 1) }
      },
    },
  },
  events: { onSelectionChanged: { topic: 'selection' } },
}

const RUNTIME: Kind<Book> = {
  name: 'Runtime',
  scalars: {
    enableEvents: {
      read: (book) => book.eventsEnabled,
      write: (book: Book, on: boolean) => {
        book.eventsEnabled = on
      },
    },
  },
}

/** What a context begins with. */
export const ROOT: Kind<Book> = {
  name: 'RequestContext',
  parts: {
    workbook: { kind: () => WORKBOOK, find: (book) => book },
    application: { kind: () => APPLICATION, find: (book) => book },
    runtime: { kind: () => RUNTIME, find: (book) => book },
  },
}

import type { Area, Block, CellValue, Culture } from './cells'
import { addressOf, cellOf, columnLetters, isBlank, isCellError, overlap } from './cells'
import type { Finding } from './findings'
import { byGravity, firstAndCount } from './findings'
import { numberInCell } from './numbers'
import type { Role, Settings } from './settings'
import { countOf, listOf, numberText, percentText, quote } from './wording'

export interface HoldingsColumn {
  /** as typed, or "Column C" where there is none */
  readonly header: string
  readonly role: Role
  /** the role its header and content suggest */
  readonly proposed: Role
  /** the first value below the header, as a reader recognises the column by */
  readonly sample: string
}

export interface Holding {
  readonly name: string
  /** decimals of capital, as it stands: never renormalised */
  readonly weight: number
  readonly amount: number | null
  /** one label a group column, '' where the cell is blank */
  readonly groups: readonly string[]
  /** the label of its currency, '' where the cell is blank or there is no such column */
  readonly currency: string
  readonly benchmark: number | null
  readonly limit: number | null
  /** expected return a year */
  readonly expected: number | null
  /** target share of risk; null where the cell is blank or there is no such column */
  readonly budget: number | null
  /** the cell of the weight, where faults about this holding point */
  readonly cell: Area
  /** absent for one that stands in no row of a sheet */
  readonly cells?: HoldingCells
}

/** The cells that hold what is known of a holding as it is used; null where that was typed as text, put together, or stands nowhere. */
export interface HoldingCells {
  readonly name: Area | null
  /** the weight, or what is divided by the capital to make one */
  readonly measure: Area | null
  readonly amount: Area | null
  readonly benchmark: Area | null
  /** one a group column */
  readonly groups: readonly (Area | null)[]
}

export interface HoldingsReading {
  readonly area: Area
  readonly columns: readonly HoldingsColumn[]
  readonly holdings: readonly Holding[]
  /** whether the block has a column of names; without one, holdings match the returns by place */
  readonly named: boolean
  /** columns that group the holdings; the one of the currency is among them */
  readonly groupHeaders: readonly string[]
  readonly currencyHeader: string | null
  readonly limitHeader: string | null
  /** what amounts were divided by to make weights of them; null where the block holds weights */
  readonly capital: number | null
  readonly net: number
  readonly gross: number
  readonly summary: string
  readonly findings: readonly Finding[]
}

/** Headers are matched in this order, so that "Limit on share of risk" is no weight and "Benchmark weight" no own weight. */
const HEADER_SIGNS: readonly (readonly [Role, RegExp])[] = [
  ['limit', /\b(limit|maximum|max|ceiling|cap)\b/i],
  ['ignore', /\b(active|change|trade|new|proposed|target|isin|sedol|cusip|id|code|price|quantity|units|shares held|date)\b/i],
  ['benchmark weight', /\b(benchmark|reference|index weight)\b/i],
  ['expected return', /\b(expected|forecast)\b/i],
  ['risk budget', /\bbudgets?\b/i],
  ['weight', /\b(weights?|wgt|allocation|share of (capital|assets|portfolio)|% of (capital|assets|portfolio|nav))\b|^%$/i],
  ['exposure', /\b(exposure|notional)\b/i],
  ['amount', /\b(amount|market value|value|balance|holding value|position value)\b/i],
  ['currency', /\b(currency|ccy)\b/i],
  ['group', /\b(class|region|sector|country|manager|industry|style|strategy|theme|group|type)\b/i],
  ['name', /\b(name|holdings?|asset|position|security|instrument|investment|fund)\b/i],
] // prettier-ignore

/** Roles that one column alone can have; a second candidate is left out (a second currency groups) and can be chosen by hand. */
const SINGLE: ReadonlySet<Role> = new Set([
  'name',
  'weight',
  'amount',
  'exposure',
  'currency',
  'benchmark weight',
  'limit',
  'expected return',
  'risk budget',
])

/** A currency is a label that holdings share, so its column groups them as well. */
const isGroup = (role: Role | undefined): boolean => role === 'group' || role === 'currency'

const TOTAL_WORD = /^(grand |sub-?\s?|over-?all )?(totals?|sum)\b/i
const TOTAL_ALONE = /^(grand |sub-?\s?|over-?all )?(totals?|sum)\s*:?$/i

/** A weight or an amount of money, with as many decimals as tell it from its neighbours. */
const plainText = (value: number): string => numberText(value, Math.abs(value) < 100 ? 4 : 2)

/** Sums that a person or a sheet rounded still count as the sum. */
const agrees = (shown: number, sum: number): boolean =>
  Math.abs(shown - sum) <= 1e-6 * Math.max(1, Math.abs(sum))

interface Layout {
  /** row of the headings, or -1 */
  readonly headerRow: number
  readonly firstRow: number
  readonly titleRows: number
}

/** So far down from where titles end headings are looked for. */
const MOST_ROWS_ABOVE = 10

const isKnownHeader = (value: CellValue): boolean =>
  typeof value === 'string' && HEADER_SIGNS.some(([, sign]) => sign.test(value))

/** Where titles end, whether there are headings and where the holdings begin. */
function layoutOf(block: Block, culture: Culture): Layout {
  const { values } = block
  const filled = (row: readonly CellValue[]): number => row.filter((value) => !isBlank(value)).length
  let row = 0
  let titleRows = 0
  for (; row < values.length; row++) {
    const cells = values[row] ?? []
    if (filled(cells) === 0) continue
    // a lone text above a wider block is a title
    if (
      cells.length > 1 &&
      filled(cells) === 1 &&
      row + 1 < values.length &&
      !cells.some((v) => typeof v === 'number')
    ) {
      titleRows++
      continue
    }
    break
  }
  const isHeading = (k: number): boolean => {
    const cells = values[k] ?? []
    return (
      k + 1 < values.length &&
      filled(cells) > 0 &&
      cells.every((value) => numberInCell(value, culture) === null && !isCellError(value))
    )
  }
  if (isHeading(row)) return { headerRow: row, firstRow: row + 1, titleRows }
  // figures of their own, such as the capital, may stand above the headings; they fill no more cells than these
  let above = 0
  let widest = 0
  for (let k = row; k < Math.min(values.length, row + MOST_ROWS_ABOVE); k++) {
    const cells = values[k] ?? []
    const width = filled(cells)
    if (isHeading(k) && width >= widest && cells.filter(isKnownHeader).length > 1)
      return { headerRow: k, firstRow: k + 1, titleRows: titleRows + above }
    widest = Math.max(widest, width)
    if (width > 0) above++
  }
  return { headerRow: -1, firstRow: row, titleRows }
}

function sampleOf(column: readonly CellValue[]): string {
  const first = column.find((value) => !isBlank(value))
  if (first === undefined) return ''
  return typeof first === 'number' ? String(Number(first.toPrecision(6))) : String(first)
}

/** Proposes a role for every column from its heading, then from its content. */
function proposeRoles(
  headers: readonly (string | null)[],
  columns: readonly (readonly CellValue[])[],
  culture: Culture,
): readonly Role[] {
  const contents = columns.map((column) => {
    const filled = column.filter((value) => !isBlank(value))
    const numbers = filled.map((value) => numberInCell(value, culture)).filter((value) => value !== null)
    return { filled, numbers, numeric: numbers.length > 0 && numbers.length * 2 >= filled.length }
  })
  const taken = new Set<Role>()
  const take = (role: Role): Role => {
    if (!SINGLE.has(role)) return role
    if (taken.has(role)) return role === 'currency' ? 'group' : 'ignore'
    taken.add(role)
    return role
  }
  const fromHeader = headers.map((header, k): Role | null => {
    const content = contents[k]
    const role = header === null ? null : (HEADER_SIGNS.find(([, sign]) => sign.test(header))?.[0] ?? null)
    if (role === null || role === 'ignore' || !content || content.filled.length === 0) return role
    const wantsText = role === 'name' || isGroup(role)
    return (wantsText ? !content.numeric : content.numbers.length > 0) ? take(role) : null
  })
  return fromHeader.map((role, k): Role => {
    const content = contents[k]
    if (role !== null || !content || content.filled.length === 0) return role ?? 'ignore'
    if (content.numeric) {
      if (['weight', 'amount', 'exposure'].some((measure) => taken.has(measure as Role))) return 'ignore'
      // no heading says what is held: weights when the numbers look like parts of a whole
      return take(content.numbers.every((value) => Math.abs(value) <= 20) ? 'weight' : 'amount')
    }
    if (!taken.has('name')) return take('name')
    // a label that no two rows share groups nothing
    return new Set(content.filled).size < content.filled.length ? 'group' : 'ignore'
  })
}

/** What a cell that is to hold a number turned out to hold. */
export type Read = { readonly value: number | null; readonly fault?: string; readonly fromText?: boolean }

export function readNumber(value: CellValue, culture: Culture): Read {
  if (typeof value === 'number') return { value }
  if (isBlank(value)) return { value: null }
  if (isCellError(value)) return { value: null, fault: `found the error ${String(value)}` }
  if (typeof value === 'boolean') return { value: null, fault: `found ${value ? 'TRUE' : 'FALSE'}` }
  const number = numberInCell(value, culture)
  return number === null ? { value: null, fault: `found ${quote(value)}` } : { value: number, fromText: true }
}

/**
 * Reads a holdings block: finds titles, headings, column roles, totals and blank rows, and every cell that is not what its column
 * needs. Nothing is repaired unsaid: what was left out or read another way is among the findings.
 *
 * @param block    as selected; any mix of columns, headings optional, with hiddenRows and merged areas where known
 * @param settings roles changed by the user, and the capital that amounts are divided by
 * @returns        weights as decimals of capital, in sheet order; findings that stop are told instead of thrown
 * @cost           O(rows x columns)
 */
export function readHoldings(
  block: Block,
  settings: Pick<Settings, 'roles' | 'capital'>,
  culture: Culture,
): HoldingsReading {
  const { area, values } = block
  const findings: Finding[] = []
  const find = (weight: Finding['weight'], sentence: string, place: Area | null = area): void => {
    findings.push({ weight, sentence, area: place })
  }
  const at = (row: number, column: number): Area => cellOf(area, row, column)
  const where = (row: number, column: number): string => addressOf(at(row, column))

  const layout = layoutOf(block, culture)
  const body = values.slice(layout.firstRow)
  const byColumn = Array.from({ length: area.columns }, (_, k) => body.map((row) => row[k] ?? ''))
  const typed = Array.from({ length: area.columns }, (_, k) => {
    const heading = layout.headerRow < 0 ? '' : (values[layout.headerRow]?.[k] ?? '')
    return isBlank(heading) ? null : String(heading).trim()
  })
  const proposed = proposeRoles(typed, byColumn, culture)
  const columns: HoldingsColumn[] = typed.map((heading, k) => {
    const header = heading ?? `Column ${columnLetters(area.column + k)}`
    const suggestion = proposed[k] ?? 'ignore'
    return {
      header,
      // a heading may be a word that every object knows, such as "constructor"
      role: (Object.hasOwn(settings.roles, header) ? settings.roles[header] : null) ?? suggestion,
      proposed: suggestion,
      sample: sampleOf(byColumn[k] ?? []),
    }
  })
  const columnOf = (role: Role): number => columns.findIndex((column) => column.role === role)
  const groupColumns = columns.flatMap((column, k) => (isGroup(column.role) ? [k] : []))
  for (const role of SINGLE) {
    const holders = columns.flatMap((column, k) => (column.role === role ? [k] : []))
    if (holders.length > 1)
      find(
        'stops',
        `${addressOf(area)}: ${countOf(holders.length, 'column')} have the role ${role}; one is needed.`,
      )
  }
  const nameColumn = columnOf('name')
  const weightColumn = columnOf('weight')
  const amountColumn = columnOf('amount')
  const exposureColumn = columnOf('exposure')
  const currencyColumn = columnOf('currency')
  const measureColumn = weightColumn >= 0 ? weightColumn : exposureColumn >= 0 ? exposureColumn : amountColumn
  if (measureColumn < 0)
    find(
      'stops',
      `${addressOf(area)}: no column of weights or amounts found; one is needed: give a column that role.`,
    )
  if (layout.titleRows > 0)
    find('notes', `${countOf(layout.titleRows, 'title row')} above the headings left out.`)

  // merged cells: a group label may span its members; anything else would hide or repeat a figure
  const filledDown = new Map<string, CellValue>()
  for (const merged of block.merged ?? []) {
    const shared = overlap(merged, area)
    if (!shared) continue
    const [row, column] = [shared.row - area.row, shared.column - area.column]
    if (row < layout.firstRow) continue
    if (shared.columns === 1 && isGroup(columns[column]?.role)) {
      for (let k = 1; k < shared.rows; k++)
        filledDown.set(`${row + k},${column}`, values[row]?.[column] ?? '')
    } else if (columns.slice(column, column + shared.columns).some(({ role }) => role !== 'ignore'))
      find(
        'stops',
        `${addressOf(shared)}: found merged cells; one cell a figure is needed: unmerge them.`,
        shared,
      )
  }
  if (filledDown.size > 0)
    find(
      'notes',
      `Group labels in merged cells count for all their ${countOf(filledDown.size, 'further row')}.`,
    )

  const faults: Finding[] = []
  const textNumbers: string[] = []
  const number = (row: number, column: number, need: string): number | null => {
    if (column < 0) return null
    const read = readNumber(values[row]?.[column] ?? '', culture)
    if (read.fault)
      faults.push({
        weight: 'stops',
        sentence: `${where(row, column)}: ${read.fault}; ${need} is needed.`,
        area: at(row, column),
      })
    if (read.fromText) textNumbers.push(where(row, column))
    return read.value
  }

  interface Row {
    readonly row: number
    readonly name: string
    readonly measure: number
    /** the column it stands in */
    readonly measuredIn: number
    readonly amount: number | null
    readonly exposure: number | null
    readonly benchmark: number | null
    readonly limit: number | null
    readonly expected: number | null
    readonly budget: number | null
  }
  const rows: Row[] = []
  const totals: number[] = []
  const headings: string[] = []
  const unheld: string[] = []
  let segment = 0
  let whole = 0
  let blankRows = 0
  let hidden = 0
  for (let row = layout.firstRow; row < values.length && measureColumn >= 0; row++) {
    const cells = values[row] ?? []
    const used = cells.filter((value, k) => !isBlank(value) && columns[k]?.role !== 'ignore')
    if (used.length === 0) {
      blankRows++
      continue
    }
    const nameCell = nameColumn < 0 ? '' : (cells[nameColumn] ?? '')
    const name = String(nameCell).trim()
    const shown = readNumber(cells[measureColumn] ?? '', culture)
    // a holding may be called "Total …" and happen to weigh what stands above it; a total has no group of its own
    const grouped = groupColumns.some((column) => !isBlank(cells[column]))
    if (
      nameColumn >= 0 &&
      shown.value !== null &&
      (name === '' || TOTAL_ALONE.test(name) || (TOTAL_WORD.test(name) && !grouped)) &&
      rows.length > 0
    ) {
      const sums = agrees(shown.value, segment) || agrees(shown.value, whole)
      if (sums || TOTAL_ALONE.test(name)) {
        totals.push(row)
        if (!sums)
          find(
            'warns',
            `${where(row, measureColumn)}: the total shows ${plainText(shown.value)} while the holdings above it sum to ${plainText(whole)}.`,
            at(row, measureColumn),
          )
        segment = 0
        continue
      }
    }
    if (nameColumn >= 0 && name !== '' && used.length === 1) {
      headings.push(quote(name))
      continue
    }
    const before = faults.length
    const benchmark = number(row, columnOf('benchmark weight'), 'a benchmark weight')
    const amount = number(row, amountColumn, 'an amount')
    const exposure = number(row, exposureColumn, 'an exposure')
    let measure =
      measureColumn === exposureColumn
        ? (exposure ?? amount)
        : measureColumn === amountColumn
          ? amount
          : number(row, measureColumn, 'a weight')
    if (measure === null && faults.length === before) {
      if (benchmark !== null && benchmark !== 0) {
        measure = 0
        unheld.push(quote(name))
      } else
        faults.push({
          weight: 'stops',
          sentence: `${where(row, measureColumn)}: found a blank; ${weightColumn >= 0 ? 'a weight' : 'an amount'} is needed (0 when ${name ? quote(name) : 'it'} is not held).`,
          area: at(row, measureColumn),
        })
    }
    if (nameColumn >= 0 && (name === '' || isCellError(nameCell)))
      faults.push({
        weight: 'stops',
        sentence: `${where(row, nameColumn)}: found ${name === '' ? 'a blank' : `the error ${name}`}; the name of the holding is needed.`,
        area: at(row, nameColumn),
      })
    if (block.hiddenRows?.has(row)) hidden++
    segment += measure ?? 0
    whole += measure ?? 0
    rows.push({
      row,
      name: nameColumn < 0 ? `Row ${area.row + row + 1}` : name,
      measure: measure ?? 0,
      measuredIn: measureColumn === exposureColumn && exposure === null ? amountColumn : measureColumn,
      amount,
      exposure,
      benchmark,
      limit: number(row, columnOf('limit'), 'a limit'),
      expected: number(row, columnOf('expected return'), 'an expected return'),
      budget: number(row, columnOf('risk budget'), 'a risk budget'),
    })
  }
  findings.push(...firstAndCount(faults, 'cells'))
  if (measureColumn >= 0 && rows.length === 0)
    find('stops', `${addressOf(area)}: found no holdings; at least one row is needed.`)

  const rowOf = new Map<string, number>()
  for (const { row, name } of rows) {
    if (nameColumn < 0 || name === '') continue
    const earlier = rowOf.get(name)
    if (earlier === undefined) rowOf.set(name, row)
    else
      find(
        'stops',
        `${where(row, nameColumn)}: found ${quote(name)} a second time (first in ${where(earlier, nameColumn)}); one row a holding is needed.`,
        at(row, nameColumn),
      )
  }

  const capital =
    weightColumn >= 0
      ? 1
      : capitalOf(
          rows.map(({ row, measure, amount }) => ({ row, part: amountColumn < 0 ? measure : (amount ?? 0) })),
          amountColumn < 0 && exposureColumn >= 0 ? 'exposure' : 'amount',
          settings.capital,
          area,
          amountColumn < 0 ? measureColumn : amountColumn,
          findings,
          at,
        )
  // without the capital there are no weights to speak of, and a finding has said so
  const isWeighed = capital !== null
  const divisor = capital ?? 1
  const label = (row: number, column: number): string =>
    String(filledDown.get(`${row},${column}`) ?? values[row]?.[column] ?? '').trim()
  const cellThat = (row: number, column: number, fits: (value: CellValue) => boolean): Area | null =>
    column >= 0 && fits(values[row]?.[column] ?? '') ? at(row, column) : null
  // a blank counts as 0 to a formula too
  const isNumber = (value: CellValue): boolean => typeof value === 'number' || value === ''
  const holdings: Holding[] = rows.map(
    ({ row, name, measure, measuredIn, amount, benchmark, limit, expected, budget }) => ({
      name,
      weight: measure / divisor,
      amount,
      groups: groupColumns.map((column) => label(row, column)),
      currency: currencyColumn < 0 ? '' : label(row, currencyColumn),
      benchmark,
      limit,
      expected,
      budget,
      cell: at(row, Math.max(measureColumn, 0)),
      cells: {
        name: cellThat(row, nameColumn, (value) => value === name),
        measure: cellThat(row, measuredIn, isNumber),
        amount: cellThat(row, amountColumn, isNumber),
        benchmark: cellThat(row, columnOf('benchmark weight'), isNumber),
        groups: groupColumns.map((column) => cellThat(row, column, (value) => value === label(row, column))),
      },
    }),
  )
  const net = holdings.reduce((sum, { weight }) => sum + weight, 0)
  const gross = holdings.reduce((sum, { weight }) => sum + Math.abs(weight), 0)

  if (textNumbers.length > 0)
    find(
      'notes',
      `${countOf(textNumbers.length, 'number')} typed as text read as numbers (${listOf(textNumbers, 2)}).`,
    )
  if (totals.length > 0)
    find(
      'notes',
      `${totals.length === 1 ? 'Row' : 'Rows'} ${listOf(totals.map((row) => String(area.row + row + 1)))} read as ${totals.length === 1 ? 'a total' : 'totals'} and left out.`,
      at(totals[0] ?? 0, measureColumn),
    )
  if (headings.length > 0)
    find(
      'notes',
      `${listOf(headings)} read as ${headings.length === 1 ? 'a heading' : 'headings'} within the block and left out.`,
    )
  if (blankRows > 0) find('notes', `${countOf(blankRows, 'blank row')} left out.`)
  if (hidden > 0)
    find(
      'warns',
      `${countOf(hidden, 'holding')} in hidden rows ${hidden === 1 ? 'is' : 'are'} counted like the others.`,
    )
  if (unheld.length > 0)
    find('notes', `${listOf(unheld)}: no weight but a benchmark weight; counted at weight 0.`)
  if (rows.length > 0 && weightColumn >= 0 && Math.abs(net) > 20)
    find(
      'warns',
      `Weights sum to ${numberText(net, 2)}: do they stand in percent points? They are used as they stand, as multiples of capital.`,
      at(layout.firstRow, weightColumn),
    )
  else if (rows.length > 0 && isWeighed && Math.abs(net - 1) > 1e-6)
    find(
      'notes',
      `Weights sum to ${percentText(net, 2)} (gross ${percentText(gross, 2)}); they are used as they stand.`,
    )

  const left = [
    totals.length > 0 ? countOf(totals.length, 'total row') : '',
    headings.length > 0 ? countOf(headings.length, 'heading row') : '',
    blankRows > 0 ? countOf(blankRows, 'blank row') : '',
  ].filter((part) => part !== '')
  return {
    area,
    columns,
    holdings,
    named: nameColumn >= 0,
    groupHeaders: groupColumns.map((column) => columns[column]?.header ?? ''),
    currencyHeader: columns[currencyColumn]?.header ?? null,
    limitHeader: columns[columnOf('limit')]?.header ?? null,
    capital: weightColumn >= 0 || measureColumn < 0 ? null : capital,
    net,
    gross,
    summary: `${countOf(holdings.length, 'holding')}, ${isWeighed ? `net ${percentText(net)}, gross ${percentText(gross)}` : 'weights unknown without the capital'}${left.length > 0 ? `; ${listOf(left)} left out` : ''}`,
    findings: byGravity(findings),
  }
}

/**
 * What amounts and exposures are divided by: the capital pointed at, else the sum of the amounts; tells when that sum cannot stand
 * for the capital, and is null then.
 */
function capitalOf(
  parts: readonly { readonly row: number; readonly part: number }[],
  measure: 'amount' | 'exposure',
  capital: number | null,
  area: Area,
  column: number,
  findings: Finding[],
  at: (row: number, column: number) => Area,
): number | null {
  if (capital !== null || parts.length === 0) return capital ?? 1
  const stop = (found: string, place: Area): null => {
    findings.push({
      weight: 'stops',
      sentence: `${addressOf(place)}: found ${found}; the capital figure is needed: point at its cell.`,
      area: place,
    })
    return null
  }
  if (measure === 'exposure') return stop('exposures without amounts', area)
  const negative = parts.find(({ part }) => part < 0)
  if (negative) return stop('a negative amount, so that the sum is not the capital', at(negative.row, column))
  const sum = parts.reduce((total, { part }) => total + part, 0)
  if (sum === 0) return stop('amounts that are all 0', area)
  findings.push({
    weight: 'notes',
    sentence: `Weights are amounts divided by their sum, ${numberText(sum, 2)}.`,
    area: null,
  })
  return sum
}

import { type Estimator, Fault, type FaultCode, MOST_LAGS, type TailMethod, type Where } from '../core'
import { isBlank, PLAIN_CULTURE, type CellValue } from './cells'
import { attempt } from './explain'
import { plainName } from './names'
import { dateInCell } from './numbers'
import { countOf, quote } from './wording'

/**
 * Arguments of worksheet functions -> numbers. A host hands over rows of raw cells; what is no number is named by argument, row and
 * column. A function has no culture, so text is never read as a number, and blanks are 0 on some hosts and null on others.
 */

/** A block of cells as a host hands it over. */
export type Cells = readonly (readonly unknown[])[]

const isText = (value: unknown): value is string => typeof value === 'string' && value.trim() !== ''

const dateOf = (value: unknown): number | null =>
  typeof value === 'number' || typeof value === 'string' ? dateInCell(value, PLAIN_CULTURE) : null

const isIsoDate = (value: unknown): boolean => typeof value === 'string' && dateOf(value) !== null

function foundCell(value: unknown): string {
  if (value === null || value === undefined || isBlank(value as CellValue)) return 'found a blank cell'
  if (typeof value === 'string') return `found ${quote(value)}`
  if (typeof value === 'boolean') return `found ${value ? 'TRUE' : 'FALSE'}`
  return typeof value === 'number' ? `found ${value}` : 'found something other than a plain value'
}

const codeOf = (value: unknown): FaultCode =>
  typeof value === 'string' && value.trim() !== ''
    ? 'text'
    : typeof value === 'number'
      ? 'not-a-number'
      : 'blank'

function numberOf(value: unknown, where: Where): number {
  if (typeof value === 'number' && Number.isFinite(value)) return value
  const looksLikeNumber = isText(value) && /^[-+(]?[\d.,\s\u00a0]*\d[\d.,\s\u00a0]*%?\)?$/.test(value)
  throw new Fault(
    typeof value === 'boolean' ? 'text' : codeOf(value),
    foundCell(value),
    looksLikeNumber
      ? 'a number is needed, and this cell holds text that only looks like one'
      : isIsoDate(value)
        ? 'a number is needed; a first column of dates needs a first row of names above it'
        : 'a number is needed',
    where,
  )
}

/** Rows of equal length of any argument that stands for cells; one value is a block of one. */
export function cellsOf(argument: string, given: unknown): Cells {
  if (given === null || given === undefined) {
    throw new Fault('blank', 'found nothing', 'a block of cells is needed', { argument })
  }
  if (!Array.isArray(given)) return [[given]]
  const cells = given as Cells
  const columns = cells[0]?.length ?? 0
  if (columns === 0 || !cells.every((row) => Array.isArray(row) && row.length === columns)) {
    throw new Fault('shape', 'found rows of unequal length', 'a rectangle of cells is needed', { argument })
  }
  return cells
}

/** One value of an argument that takes one; null where it was left out. */
function scalarOf(argument: string, given: unknown): unknown {
  if (!Array.isArray(given)) return given ?? null
  const cells = cellsOf(argument, given)
  if (cells.length > 1 || cells[0]!.length > 1) {
    throw new Fault('shape', `found ${cells.length} x ${cells[0]!.length} cells`, 'one value is needed', {
      argument,
    })
  }
  return cells[0]![0] ?? null
}

/** A row or column of cells, and where each lies within its argument. */
interface Line {
  readonly cells: readonly unknown[]
  /** it lies across, as one row; one cell counts as a column */
  readonly across: boolean
  readonly whereOf: (index: number) => Where
}

function lineOf(argument: string, given: unknown): Line {
  const cells = cellsOf(argument, given)
  const across = cells.length === 1 && cells[0]!.length > 1
  if (!across && cells[0]!.length > 1) {
    throw new Fault(
      'shape',
      `found ${cells.length} rows and ${cells[0]!.length} columns`,
      'one row or one column is needed',
      {
        argument,
      },
    )
  }
  return {
    cells: across ? cells[0]! : cells.map((row) => row[0]),
    across,
    whereOf: (index) => ({ argument, row: across ? 0 : index, column: across ? index : 0 }),
  }
}

/**
 * Weights, or any row or column of numbers.
 *
 * @throws Fault "blank" | "text" | "not-a-number" | "shape"
 */
export function vectorOf(argument: string, given: unknown): { values: Float64Array; across: boolean } {
  const { cells, across, whereOf } = lineOf(argument, given)
  return { values: Float64Array.from(cells, (cell, k) => numberOf(cell, whereOf(k))), across }
}

/** Names or groups; the label as typed without outer spaces, null where there is none. */
export function labelsOf(
  argument: string,
  given: unknown,
): { labels: (string | null)[]; whereOf: (index: number) => Where } {
  const { cells, whereOf } = lineOf(argument, given)
  // a blank is 0 on some hosts: among text labels 0 is no label
  const texts = cells.some(isText)
  const labels = cells.map((cell, k) => {
    if (isText(cell)) return cell.trim()
    if (cell === null || cell === undefined || cell === '' || (texts && cell === 0)) return null
    if (typeof cell === 'number' && Number.isFinite(cell)) return String(cell)
    throw new Fault('text', foundCell(cell), 'a name is needed', whereOf(k))
  })
  return { labels, whereOf }
}

/**
 * Finds each name among the headings of a block: to the letter first, else whatever the case and spacing.
 *
 * @returns the column of each name
 * @throws Fault "unmatched" | "twice", each naming the name
 */
export function columnsNamed(
  names: readonly string[],
  headings: readonly string[],
  whereOf: (index: number) => Where,
): Int32Array {
  const exact = positions(headings, (heading) => heading)
  const loose = positions(headings, plainName)
  const taken = new Map<number, number>()
  return Int32Array.from(names, (name, k) => {
    const columns = exact.get(name) ?? loose.get(plainName(name)) ?? []
    const [column] = columns
    if (column === undefined) {
      throw new Fault(
        'unmatched',
        `found ${quote(name)}, which is no heading of risk`,
        'a name in its first row is needed',
        whereOf(k),
      )
    }
    if (columns.length > 1) {
      throw new Fault(
        'twice',
        `found ${quote(name)} over ${columns.length} columns of risk`,
        'each name once in its first row is needed',
        whereOf(k),
      )
    }
    if (taken.has(column)) {
      throw new Fault('twice', `found ${quote(name)} a second time`, 'each name once is needed', whereOf(k))
    }
    taken.set(column, k)
    return column
  })
}

function positions(headings: readonly string[], keyOf: (heading: string) => string): Map<string, number[]> {
  const found = new Map<string, number[]>()
  headings.forEach((heading, column) => {
    const key = keyOf(heading)
    const columns = found.get(key)
    if (columns) columns.push(column)
    else found.set(key, [column])
  })
  return found
}

/**
 * Periods in a year; 1 where it was left out.
 *
 * @throws Fault "text" | "blank" | "not-a-number" | "out-of-range" | "shape"
 */
export function periodsOf(given: unknown): number {
  const argument = 'periods_per_year'
  const value = scalarOf(argument, given)
  if (value === null) return 1
  const periods = numberOf(value, { argument })
  if (periods > 0) return periods
  throw new Fault('out-of-range', `found ${periods}`, 'a number above 0 is needed, such as 52 or 252', {
    argument,
  })
}

function choiceOf(argument: string, given: unknown, needed: string): string | null {
  const value = scalarOf(argument, given)
  if (value === null) return null
  if (typeof value !== 'string') throw new Fault('unknown-choice', foundCell(value), needed, { argument })
  return value.trim().replace(/\s+/g, ' ').toLowerCase()
}

/**
 * How returns are formed from prices; simple where it was left out.
 *
 * @throws Fault "unknown-choice" | "shape"
 */
export function kindOf(given: unknown): 'simple' | 'log' {
  const needed = '“simple” or “log” is needed'
  const kind = choiceOf('kind', given, needed) ?? 'simple'
  if (kind === 'simple' || kind === 'log') return kind
  throw new Fault('unknown-choice', `found ${quote(kind)}`, needed, { argument: 'kind' })
}

/** Decay factor where none is given: J.P. Morgan/Reuters (1996), Technical Document, for daily data (from memory). */
const USUAL_DECAY = 0.94

const TARGETS = { identity: 'identity', correlation: 'correlation', oas: 'oas' } as const

/**
 * The estimator in words: "sample", "exponential" (decay factor 0.94), "exponential 0.97" (or "0,97"), "shrink identity", "shrink
 * correlation", "shrink oas", "lagged 1" to "lagged 10"; sample where it was left out.
 *
 * @throws Fault "unknown-choice" | "out-of-range" | "shape"
 * @example worksheetFunctions.VOLATILITY(1, [[.01], [.03], [.02]], 1, 'Exponential 0,5') // 0.0063888
 */
export function estimatorOf(given: unknown): Estimator {
  const argument = 'estimator'
  const needed =
    '“sample”, “exponential 0.97”, “shrink identity”, “shrink correlation”, “shrink oas” or “lagged 2” is needed'
  const text = choiceOf(argument, given, needed) ?? 'sample'
  const [word = '', choice = '', ...more] = text.split(' ')
  if (more.length === 0) {
    if (word === 'sample' && choice === '') return { kind: 'sample' }
    if (word === 'exponential') {
      const decay = choice === '' ? USUAL_DECAY : decimalOf(choice)
      if (decay > 0 && decay < 1) return { kind: 'exponential', decay }
      if (!Number.isNaN(decay))
        throw new Fault(
          'out-of-range',
          `found a decay factor of ${choice}`,
          'a number between 0 and 1 is needed, such as 0.94',
          { argument },
        )
    }
    if (word === 'shrink' && Object.hasOwn(TARGETS, choice))
      return { kind: 'shrinkage', target: TARGETS[choice as keyof typeof TARGETS] }
    if (word === 'lagged') {
      const lags = decimalOf(choice)
      if (Number.isInteger(lags) && lags >= 1 && lags <= MOST_LAGS) return { kind: 'lagged', lags }
      if (!Number.isNaN(lags))
        throw new Fault(
          'out-of-range',
          `found ${choice} lags`,
          `a whole number from 1 to ${MOST_LAGS} is needed`,
          {
            argument,
          },
        )
    }
  }
  throw new Fault('unknown-choice', `found ${quote(text)}`, needed, { argument })
}

/** A number with a point or a comma before its decimals; NaN for anything else. */
const decimalOf = (text: string): number =>
  /^[-+]?\d*[.,]?\d+$/.test(text) ? Number(text.replace(',', '.')) : NaN

/** A block of returns, prices or covariances as numbers, oldest row first, without its names and dates. */
export interface Panel {
  readonly kind: 'returns' | 'prices' | 'covariance'
  /** rows x columns, row-major */
  readonly values: Float64Array
  readonly rows: number
  readonly columns: number
  /** headings, one a column; null where the block has none */
  readonly names: readonly string[] | null
  /** where a number of `values` lies within the argument */
  readonly placeOf: (row: number, column: number) => { row: number; column: number }
}

/**
 * Reads a block of returns (or a covariance matrix in their place) or of prices. A first row of names, and then a first column of
 * dates, are told by their content; rows under dates are put in order, oldest first, else their order is the caller's word.
 *
 * @throws Fault "blank" | "text" | "not-a-number" | "shape" | "twice" (a date) | "too-few" | "out-of-range" (a price of 0 or less) |
 *               those of `classifySquare`
 * @cost         O(T n)
 */
export function panelOf(argument: string, cells: Cells, content: 'returns' | 'prices'): Panel {
  const names = namesRow(argument, cells)
  const top = names ? 1 : 0
  const side = names ? sideOf(argument, cells, content) : null
  const left = side ? 1 : 0
  const rows = cells.length - top
  const columns = cells[0]!.length - left
  if (rows === 0)
    throw new Fault('too-few', 'found names without numbers below', 'rows of numbers are needed', {
      argument,
    })

  const order = side?.kind === 'dates' ? inOrder(argument, side.dates, top) : null
  const placeOf = (row: number, column: number) => ({
    row: (order?.[row] ?? row) + top,
    column: column + left,
  })
  const values = new Float64Array(rows * columns)
  for (let r = 0, k = 0; r < rows; r++) {
    const row = cells[(order ? order[r]! : r) + top]!
    for (let c = 0; c < columns; c++, k++) {
      const value = row[c + left]
      // the door of numberOf would cost a call for each of what may be millions of cells
      values[k] =
        typeof value === 'number' && Number.isFinite(value)
          ? value
          : numberOf(value, { argument, ...placeOf(r, c) })
    }
  }
  if (!names) refuseBareDates(argument, values, rows, columns)
  const worthless = content === 'prices' ? values.findIndex((price) => price <= 0) : -1
  if (worthless >= 0) {
    const price = values[worthless]!
    throw new Fault(
      'out-of-range',
      price === 0 ? 'found 0, which is how a blank cell may arrive here' : `found ${price}`,
      'a price above 0 is needed',
      { argument, ...placeOf(Math.floor(worthless / columns), worthless % columns) },
    )
  }

  let kind: Panel['kind'] = content
  if (content === 'returns' && rows === columns && side?.kind !== 'dates') {
    const { value, fault } = attempt(() => classifySquare(values, columns))
    if (fault)
      throw new Fault(fault.code, fault.found, fault.needed, {
        argument,
        ...placeOf(fault.where.row!, fault.where.column!),
      })
    kind = value
  }
  if (side?.kind === 'names' && kind !== 'covariance') {
    throw new Fault('text', foundCell(cells[1]![0]), 'a date or a number is needed', {
      argument,
      row: 1,
      column: 0,
    })
  }
  if (kind !== 'covariance' && rows < 2) {
    throw new Fault('too-few', `found ${countOf(rows, 'row')} of ${kind}`, 'at least 2 are needed', {
      argument,
    })
  }
  return { kind, values, rows, columns, names: names && names.slice(left), placeOf }
}

/** The first row where it holds names; a corner above dates may be anything. */
function namesRow(argument: string, cells: Cells): string[] | null {
  const first = cells[0]!
  const side = first.length > 1 && isSide(cells)
  const counted = side ? first.slice(1) : first
  const named = counted.filter((cell) => isText(cell) && !isIsoDate(cell)).length
  if (2 * named <= counted.length) return null
  return first.map((cell, column) => {
    if (isText(cell)) return cell.trim()
    if (column === 0 && side) return ''
    throw new Fault(codeOf(cell), foundCell(cell), 'a name is needed, as in the rest of this row', {
      argument,
      row: 0,
      column,
    })
  })
}

const DATE_HEADING = /^(date|day|week|month|quarter|year|period|time)s?\b/i

/** Whether the cells below the corner are dates or names rather than numbers of the first position. */
function isSide(cells: Cells): boolean {
  for (let r = 1; r < cells.length; r++)
    if (isText(cells[r]![0]) || dateOf(cells[r]![0]) !== null) return true
  return false
}

type Side = { readonly kind: 'dates'; readonly dates: Float64Array } | { readonly kind: 'names' }

function sideOf(argument: string, cells: Cells, content: 'returns' | 'prices'): Side | null {
  const corner = cells[0]![0]
  const below = cells.slice(1).map((row) => row[0])
  if (cells[0]!.length === 1 || !isSide(cells)) return null
  const dates = below.map(dateOf)
  const headed = !isText(corner) || DATE_HEADING.test(corner)
  const named = below.every(
    (cell, r) =>
      isText(cell) && isText(cells[0]![r + 1]) && plainName(cell) === plainName(cells[0]![r + 1] as string),
  )
  if (named && below.length === cells[0]!.length - 1) return { kind: 'names' }
  if (dates.every((date) => date !== null)) {
    const serials = Float64Array.from(dates)
    // prices may lie in the range of serial numbers: they are dates where the heading says so or they run evenly one way
    const told = headed || below.some(isIsoDate) || content === 'returns' || runsLikeDates(serials)
    return told ? { kind: 'dates', dates: serials } : null
  }
  const bad = dates.indexOf(null)
  if (headed || below.some(isIsoDate)) {
    throw new Fault(
      codeOf(below[bad]),
      foundCell(below[bad]),
      'a date is needed, as in the rest of this column',
      {
        argument,
        row: bad + 1,
        column: 0,
      },
    )
  }
  return null
}

/** Whole numbers in the range of dates that rise or fall throughout by a year and a bit at most. */
function runsLikeDates(values: Float64Array): boolean {
  const way = Math.sign(values[1]! - values[0]!)
  return values.every((value, k) => {
    const step = k === 0 ? way : (value - values[k - 1]!) * way
    return Number.isInteger(value) && dateOf(value) !== null && step > 0 && step <= 400
  })
}

/** Dates without names above them would pass for a position: five in a row are no accident. */
function refuseBareDates(argument: string, values: Float64Array, rows: number, columns: number): void {
  if (columns < 2 || rows < 5) return
  if (!runsLikeDates(Float64Array.from({ length: rows }, (_, r) => values[r * columns]!))) return
  throw new Fault(
    'shape',
    'found what looks like a column of dates without a heading',
    'a first row of names above dates and numbers is needed',
    {
      argument,
      row: 0,
      column: 0,
    },
  )
}

/** The rows from the oldest date to the newest. */
function inOrder(argument: string, dates: Float64Array, top: number): Uint32Array | null {
  let sorted = true
  for (let k = 1; k < dates.length; k++) sorted &&= dates[k]! > dates[k - 1]!
  if (sorted) return null
  const order = Uint32Array.from(dates, (_, k) => k).sort((a, b) => dates[a]! - dates[b]! || a - b)
  for (let k = 1; k < order.length; k++) {
    if (dates[order[k]!] === dates[order[k - 1]!]) {
      throw new Fault('twice', 'found the same date a second time', 'each date once is needed', {
        argument,
        row: order[k]! + top,
        column: 0,
      })
    }
  }
  return order
}

/**
 * What a square block of numbers is. A covariance matrix has a diagonal of 0 or more and is symmetric within
 * 1e-8 sqrt(c_ii c_jj); what only nearly is one is a fault rather than a guess; anything else is returns, one row a date.
 *
 * @param values n x n row-major, finite
 * @throws Fault "correlation-matrix" (ones all down the diagonal) | "not-symmetric" (but within the bounds of covariances) |
 *               "out-of-range" (symmetric, but a covariance beyond its bound), with argument "risk", row and column
 * @source       |c_ij| <= sqrt(c_ii c_jj): Cauchy-Schwarz inequality; the rule of telling is this project's own
 * @cost         O(n^2)
 * @example      worksheetFunctions.COVARIANCE([[.04, .01], [.01, .09]]) // [[0.04, 0.01], [0.01, 0.09]]
 * @example      worksheetFunctions.COVARIANCE([[.01, -.02], [.03, -.01]]) // [[0.0002, 0.0001], [0.0001, 0.00005]]
 * @example      worksheetFunctions.COVARIANCE([[1, .5], [.5, 1]]) // Fault "correlation-matrix"
 */
export function classifySquare(values: Float64Array, n: number): 'covariance' | 'returns' {
  const deviations = Float64Array.from({ length: n }, (_, i) => Math.sqrt(values[i * n + i]!))
  if (deviations.every((deviation) => deviation === 1)) {
    throw new Fault(
      'correlation-matrix',
      'found ones all down the diagonal, which looks like a correlation matrix',
      'covariances (correlation times both volatilities) are needed',
      { argument: 'risk', row: 0, column: 0 },
    )
  }
  // a negative diagonal has no square root
  if (deviations.some(Number.isNaN)) return 'returns'
  let uneven: [number, number] | null = null
  let beyond: [number, number] | null = null
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < i; j++) {
      const below = values[i * n + j]!
      const above = values[j * n + i]!
      const bound = deviations[i]! * deviations[j]!
      if (Math.abs(below - above) > 1e-8 * bound) uneven ??= [i, j]
      if (Math.max(Math.abs(below), Math.abs(above)) > bound * (1 + 1e-8)) beyond ??= [i, j]
    }
  }
  if (uneven && beyond) return 'returns'
  const pair = uneven ?? beyond
  if (!pair) return 'covariance'
  const [i, j] = pair
  const where = { argument: 'risk', row: i, column: j }
  if (uneven) {
    throw new Fault(
      'not-symmetric',
      `found ${values[i * n + j]!} here but ${values[j * n + i]!} in row ${j + 1}, column ${i + 1} of the matrix`,
      'the same covariance is needed in both places, or a first row of names and a first column of dates if these are returns',
      where,
    )
  }
  throw new Fault(
    'out-of-range',
    `found a covariance of ${values[i * n + j]!} between variances of ${values[j * n + j]!} and ${values[i * n + i]!}`,
    'a covariance within the product of both volatilities is needed',
    where,
  )
}

/**
 * The first column that begins or ends with more than ten exact zeros although it moves otherwise: on some hosts that is how blanks
 * arrive, and a history that has not begun would pass for a riskless one.
 *
 * @param columns to look at; default: all
 * @throws Fault  "missing-data"
 */
export function refuseHiddenBlanks(argument: string, panel: Panel, columns?: Int32Array): void {
  if (panel.kind !== 'returns') return
  const looked = columns ?? Int32Array.from({ length: panel.columns }, (_, c) => c)
  for (const column of looked) {
    const zerosFrom = (start: number, step: 1 | -1): number => {
      let count = 0
      while (count < panel.rows && panel.values[(start + step * count) * panel.columns + column] === 0)
        count++
      return count
    }
    const leading = zerosFrom(0, 1)
    if (leading === panel.rows) continue
    const trailing = zerosFrom(panel.rows - 1, -1)
    const count = Math.max(leading, trailing)
    if (count <= 10) continue
    const named = panel.names ? ` of ${quote(panel.names[column])}` : ''
    throw new Fault(
      'missing-data',
      `found ${count} zeros in a row at the ${count === leading ? 'start' : 'end'}${named}, which is how blanks arrive here`,
      'returns for every date are needed',
      { argument, ...panel.placeOf(count === leading ? 0 : panel.rows - count, column) },
    )
  }
}

/**
 * How the tail of the return is taken to look, in words: "normal", "historical", "student" (degrees of freedom fitted), "student 5" (or
 * "student 4,5"), "cornish-fisher"; normal where it was left out.
 *
 * @throws Fault "unknown-choice" | "out-of-range" | "shape"
 * @example worksheetFunctions.VALUEATRISK(1, .04, .99, 1, 'Student 4,5') // 0.52578
 */
export function tailMethodOf(given: unknown): TailMethod {
  const argument = 'method'
  const needed = '“normal”, “historical”, “student”, “student 5” or “cornish-fisher” is needed'
  const text = choiceOf(argument, given, needed) ?? 'normal'
  if (text === 'normal' || text === 'historical' || text === 'cornish-fisher') return { kind: text }
  if (text === 'student') return { kind: 'student', degrees: null }
  const [word = '', choice = '', ...more] = text.split(' ')
  const degrees = decimalOf(choice)
  if (word !== 'student' || more.length > 0 || Number.isNaN(degrees)) {
    throw new Fault('unknown-choice', `found ${quote(text)}`, needed, { argument })
  }
  if (degrees > 2) return { kind: 'student', degrees }
  throw new Fault(
    'out-of-range',
    `found ${choice} degrees of freedom`,
    'more than 2 are needed to have a volatility',
    { argument },
  )
}

/**
 * The level of confidence of a tail figure; it cannot be left out.
 *
 * @throws Fault "text" | "blank" | "not-a-number" | "out-of-range" | "shape"
 */
export function confidenceOf(given: unknown): number {
  const argument = 'confidence'
  const confidence = numberOf(scalarOf(argument, given), { argument })
  if (confidence > 0.5 && confidence < 1) return confidence
  throw new Fault(
    'out-of-range',
    `found ${confidence}`,
    'a number above 0.5 and below 1 is needed, such as 0.99 or 99%',
    { argument },
  )
}

/**
 * How many periods ahead a tail figure looks; 1 where it was left out.
 *
 * @throws Fault "text" | "blank" | "not-a-number" | "out-of-range" | "shape"
 */
export function periodsAheadOf(given: unknown): number {
  const argument = 'periods'
  const value = scalarOf(argument, given)
  if (value === null) return 1
  const periods = numberOf(value, { argument })
  if (periods > 0) return periods
  throw new Fault('out-of-range', `found ${periods}`, 'a number above 0 is needed, such as 10', { argument })
}

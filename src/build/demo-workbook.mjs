/**
 * Writes assets/demo.xlsx: the book of an invented foundation, five years of invented weekly returns, and a small model that uses the
 * worksheet functions. Nothing in it is real: no company, fund, person or security, and no history.
 *
 *   node src/build/demo-workbook.mjs
 *
 * How the returns are made. Integers come from xorshift32 (Marsaglia 2003, "Xorshift RNGs", shifts 13, 17, 5; from memory), seeded below;
 * u = (x + 1/2) / 2^32; normals by Box and Muller; Student t with 5 degrees of freedom as a normal over the root of a chi-square over 5,
 * scaled to unit variance, for fat tails. Four common factors (shares, interest rates, real assets, young markets) have such returns; a
 * holding's weekly return is its average + loadings times factors + its own noise. Returns are rounded to six decimals.
 */
import { writeFileSync } from 'node:fs'
import { Workbook } from '@cj-tech-master/excelts'

export const SEED = 20_261_127
export const WEEKS = 260
/** The week a holding with a short history starts in. */
const LATE_START = 130
const LAST_FRIDAY = Date.UTC(2026, 10, 27)
const DAY = 86_400_000
const PER_YEAR = 52

/** Volatility a year of each factor. */
const FACTORS = { shares: 0.165, rates: 0.048, real: 0.1, young: 0.12 }

/**
 * load: loadings on the factors above; own: volatility a year of the holding's own noise; mean: average return a year.
 * weight, benchmark, limit (on the share of risk) and expected return are fractions.
 */
export const HOLDINGS = [
  holding(
    'Northern coast equities',
    'Equities',
    'North',
    [0.14, 0.12, 0.3, 0.064],
    { shares: 1 },
    0.05,
    0.062,
  ),
  holding(
    'Southern plains equities',
    'Equities',
    'South',
    [0.1, 0.1, 0.22, 0.066],
    { shares: 1.02, real: 0.12 },
    0.07,
    0.06,
  ),
  holding(
    'Inland dividend equities',
    'Equities',
    'Inland',
    [0.08, 0.08, 0.15, 0.058],
    { shares: 0.82, rates: 0.25 },
    0.06,
    0.055,
  ),
  holding(
    'Harbour small companies',
    'Equities',
    'North',
    [0.05, 0.05, 0.12, 0.075],
    { shares: 1.1, young: 0.2 },
    0.1,
    0.07,
  ),
  holding(
    'Island growth equities',
    'Equities',
    'Islands',
    [0.06, 0.05, 0.15, 0.078],
    { shares: 1.12, rates: 0.5 },
    0.09,
    0.08,
  ),
  holding(
    'Delta young-market equities',
    'Equities',
    'Delta',
    [0.09, 0.06, 0.15, 0.085],
    { shares: 0.85, young: 1 },
    0.1,
    0.07,
  ),
  holding('Harbour bonds 1-3y', 'Bonds', 'North', [0.08, 0.12, 0.05, 0.027], { rates: 0.32 }, 0.004, 0.025),
  holding('Harbour bonds 7-10y', 'Bonds', 'North', [0.14, 0.16, 0.1, 0.034], { rates: 1.12 }, 0.012, 0.03),
  holding(
    'Inland company bonds',
    'Bonds',
    'Inland',
    [0.08, 0.08, 0.1, 0.042],
    { rates: 0.75, shares: 0.14 },
    0.02,
    0.038,
  ),
  holding(
    'Delta government bonds',
    'Bonds',
    'Delta',
    [0.04, 0.04, 0.08, 0.055],
    { rates: 0.6, young: 0.35 },
    0.04,
    0.05,
  ),
  holding(
    'Timber and orchard land',
    'Real assets',
    'Inland',
    [0.06, 0.04, 0.1, 0.05],
    { real: 0.6, shares: 0.12 },
    0.06,
    0.048,
  ),
  holding(
    'Canal and bridge tolls',
    'Real assets',
    'South',
    [0.05, 0.04, 0.1, 0.056],
    { real: 0.5, shares: 0.4, rates: 0.3 },
    0.06,
    0.052,
  ),
  holding(
    'Grain and metals basket',
    'Real assets',
    'All regions',
    [0.03, 0.03, 0.08, 0.035],
    { real: 1.3 },
    0.07,
    0.03,
  ),
  holding(
    'Tidal power projects',
    'Real assets',
    'Islands',
    [0.04, 0, 0.1, 0.09],
    { shares: 0.7, real: 0.5, young: 0.25 },
    0.16,
    0.09,
  ),
  holding(
    'Northern coast index, short',
    'Hedge',
    'North',
    [-0.08, 0, 0.05, 0.06],
    { shares: 1.01 },
    0.012,
    0.058,
  ),
  holding('Cash', 'Cash', 'Home', [0.04, 0.03, 0.02, 0.022], {}, 0, 0.022),
]

function holding(name, assetClass, region, [weight, benchmark, limit, expected], load, own, mean) {
  return { name, assetClass, region, weight, benchmark, limit, expected, load, own, mean }
}

/**
 * Limits beside those on each share of risk: scope, name, measure, soft, hard. Of both together two are breached (the share of risk of Delta
 * young-market equities, of the holdings' own column, and that of the Islands) and one is over its soft limit alone; the volatility is within its
 * limits, but not by more than it may be off.
 */
export const LIMITS = [
  ['Total', null, 'Volatility', 0.09, 0.1],
  ['Total', null, 'Tracking error', 0.01, 0.015],
  ['Total', null, 'Value at risk', null, 0.025],
  ['Total', null, 'Expected shortfall', null, 0.04],
  ['Holding', 'Northern coast equities', 'Weight', 0.13, 0.15],
  ['Holding', 'Tidal power projects', 'Stand-alone risk', null, 0.012],
  ['Asset class', 'Equities', 'Contribution to risk', null, 0.1],
  ['Region', 'Islands', 'Share of risk', 0.15, 0.17],
  ['Region', 'Delta', 'Weight', null, 0.15],
]

function randomIntegers(seed) {
  let x = seed >>> 0
  return () => {
    x ^= x << 13
    x >>>= 0
    x ^= x >>> 17
    x ^= x << 5
    return (x >>>= 0)
  }
}

function fatTailed(seed) {
  const integer = randomIntegers(seed)
  const uniform = () => (integer() + 0.5) / 2 ** 32
  const normal = () => Math.sqrt(-2 * Math.log(uniform())) * Math.cos(2 * Math.PI * uniform())
  return () => {
    const z = normal()
    let chiSquare = 0
    for (let i = 0; i < 5; i++) chiSquare += normal() ** 2
    // A t with 5 degrees of freedom has variance 5/3.
    return (z / Math.sqrt(chiSquare / 5)) * Math.sqrt(3 / 5)
  }
}

/** WEEKS rows of one return for each holding, null where it has none. */
export const weeklyReturns = () => weeklyHistory().map(({ returns }) => returns)

/** WEEKS rows of one return for each factor. */
export const weeklyFactors = () => weeklyHistory().map(({ factors }) => Object.values(factors).map(rounded))

function weeklyHistory() {
  const draw = fatTailed(SEED)
  const weekly = (perYear) => perYear / Math.sqrt(PER_YEAR)
  const names = Object.keys(FACTORS)
  let unreported = 0
  return Array.from({ length: WEEKS }, (_, week) => {
    const factors = Object.fromEntries(names.map((name) => [name, weekly(FACTORS[name]) * draw()]))
    const returns = HOLDINGS.map(({ name, load, own, mean }) => {
      // Every holding draws every week, so that changing one leaves the others as they were.
      const noise = weekly(own) * draw()
      const common = names.reduce((sum, factor) => sum + (load[factor] ?? 0) * factors[factor], 0)
      const value = mean / PER_YEAR + common + noise
      if (name === 'Cash') return rounded(mean / PER_YEAR + 0.0001 * Math.sin(week / 20))
      if (name === 'Tidal power projects' && week < LATE_START) return null
      if (name === 'Timber and orchard land') {
        // Valued every fourth week: nothing moves in between, then all of it at once.
        unreported += value
        if (week % 4 !== 3) return 0
        const reported = rounded(unreported)
        unreported = 0
        return reported
      }
      return rounded(value)
    })
    return { factors, returns }
  })
}

const rounded = (value) => Math.round(value * 1e6) / 1e6

const FIRST = 5
const LAST = FIRST + HOLDINGS.length - 1
const INK = 'FF22394A'
const SHADE = { type: 'pattern', pattern: 'solid', fgColor: { argb: 'FFE9EFF2' } }
const LINE = { style: 'thin', color: { argb: 'FF8A9AA3' } }
const PERCENT = '0.0%'

export function demoWorkbook() {
  const workbook = new Workbook()
  workbook.creator = 'Counterpoise'
  workbook.created = workbook.modified = new Date(LAST_FRIDAY)
  workbook.calcProperties.fullCalcOnLoad = true
  writeBook(workbook.addWorksheet('Book'))
  writeReturns(workbook.addWorksheet('Returns'))
  writeFactors(workbook.addWorksheet('Factors'))
  writeLimits(workbook.addWorksheet('Limits'))
  writeModel(workbook.addWorksheet('Model'))
  writeReadMe(workbook.addWorksheet('Read me'))
  return workbook
}

function writeBook(sheet) {
  title(
    sheet,
    'Larkmoor Foundation: holdings',
    'Friday 27 November 2026. An invented book: see the sheet "Read me".',
  )
  header(sheet, 4, [
    'Holding',
    'Asset class',
    'Region',
    'Weight',
    'Benchmark weight',
    'Limit on share of risk',
    'Expected return',
  ])
  HOLDINGS.forEach(({ name, assetClass, region, weight, benchmark, limit, expected }, i) => {
    sheet.getRow(FIRST + i).values = [name, assetClass, region, weight, benchmark, limit, expected]
  })
  const total = sheet.getRow(LAST + 1)
  total.values = ['Total', null, null, sum('D', 1), sum('E', 1)]
  for (let column = 1; column <= 7; column++) {
    total.getCell(column).border = { top: LINE }
    total.getCell(column).font = { bold: true, color: { argb: INK } }
  }
  for (const column of [4, 5, 6, 7]) numbers(sheet, column, FIRST, LAST + 1, PERCENT)
  widths(sheet, [31, 14, 13, 12, 14, 16, 14])
  sheet.views = [{ state: 'frozen', ySplit: 4 }]
}

const sum = (column, result) => ({ formula: `SUM(${column}${FIRST}:${column}${LAST})`, result })

function writeReturns(sheet) {
  header(sheet, 1, ['Week ending', ...HOLDINGS.map(({ name }) => name)])
  weeklyReturns().forEach((returns, week) => {
    const row = sheet.getRow(week + 2)
    row.values = [new Date(LAST_FRIDAY - (WEEKS - 1 - week) * 7 * DAY), ...returns]
    row.getCell(1).numFmt = 'yyyy-mm-dd'
  })
  for (let column = 2; column <= HOLDINGS.length + 1; column++) numbers(sheet, column, 2, WEEKS + 1, '0.00%')
  sheet.getRow(1).height = 54
  widths(sheet, [13, ...HOLDINGS.map(() => 14)])
  sheet.views = [{ state: 'frozen', xSplit: 1, ySplit: 1 }]
}

const FACTOR_NAMES = ['World shares', 'Interest rates', 'Real assets', 'Young markets']

function writeFactors(sheet) {
  header(sheet, 1, ['Week ending', ...FACTOR_NAMES])
  weeklyFactors().forEach((returns, week) => {
    const row = sheet.getRow(week + 2)
    row.values = [new Date(LAST_FRIDAY - (WEEKS - 1 - week) * 7 * DAY), ...returns]
    row.getCell(1).numFmt = 'yyyy-mm-dd'
  })
  for (let column = 2; column <= FACTOR_NAMES.length + 1; column++)
    numbers(sheet, column, 2, WEEKS + 1, '0.00%')
  widths(sheet, [13, ...FACTOR_NAMES.map(() => 14)])
  sheet.views = [{ state: 'frozen', xSplit: 1, ySplit: 1 }]
}

function writeLimits(sheet) {
  title(
    sheet,
    'Larkmoor Foundation: limits',
    'Beside the limits on shares of risk in the sheet "Book". Invented, like everything here.',
  )
  header(sheet, 4, ['Scope', 'Name', 'Measure', 'Soft limit', 'Hard limit'])
  LIMITS.forEach((limit, i) => {
    sheet.getRow(FIRST + i).values = limit
  })
  for (const column of [4, 5]) numbers(sheet, column, FIRST, FIRST + LIMITS.length - 1, PERCENT)
  widths(sheet, [16, 28, 24, 12, 12])
  sheet.views = [{ state: 'frozen', ySplit: 4 }]
}

/** What the user had before: ordinary formulas, with the add-in's functions where the risk comes in. */
function writeModel(sheet) {
  const weights = `Book!D${FIRST}:D${LAST}`
  // The weeks in which every holding has a return.
  const returns = `Returns!B${LATE_START + 2}:Q${WEEKS + 1}`
  const add = (name, ...args) => `_xldudf_POISE_${name}(${args.join(',')})`
  title(
    sheet,
    'Larkmoor Foundation: risk in the cells',
    'From the weeks in which every holding has a return. An estimate from past returns, not advice.',
  )
  const lines = [
    ['Capital (thousands)', 48_000, '#,##0'],
    ['Weeks per year', PER_YEAR, '0'],
    ['Volatility a year', { formula: add('VOLATILITY', weights, returns, 'B5') }, '0.00%'],
    ['Volatility in money (thousands)', { formula: 'B4*B6' }, '#,##0'],
    ['Limit on volatility', 0.1, '0.0%'],
    ['Room under the limit', { formula: 'B8-B6' }, '0.00%'],
    ['Diversification ratio', { formula: add('DIVERSIFICATION', weights, returns) }, '0.00'],
    ['Effective number of positions (by risk)', { formula: add('EFFECTIVE', weights, returns) }, '0.0'],
  ]
  lines.forEach(([label, value, format], i) => {
    sheet.getCell(4 + i, 1).value = label
    sheet.getCell(4 + i, 2).value = value
    sheet.getCell(4 + i, 2).numFmt = format
  })
  const others = [
    ['Value at risk, 95%, one week', add('VALUEATRISK', weights, returns, 0.95, 1, '"historical"'), '0.00%'],
    ['Expected shortfall, the same', add('SHORTFALL', weights, returns, 0.95, 1, '"historical"'), '0.00%'],
    ['Volatility with 3 lagged terms', add('VOLATILITY', weights, returns, 'B5', '"lagged 3"'), '0.00%'],
    ['Volatility, newer weeks counting more', add('VOLATILITY', weights, returns, 'B5', '"exponential 0.97"'), '0.00%'],
    ['Volatility, covariance shrunk', add('VOLATILITY', weights, returns, 'B5', '"shrink correlation"'), '0.00%'],
  ] // prettier-ignore
  others.forEach(([label, formula, format], i) => {
    sheet.getCell(4 + i, 4).value = label
    sheet.getCell(4 + i, 7).value = { formula }
    sheet.getCell(4 + i, 7).numFmt = format
  })
  const top = 14
  const last = top + HOLDINGS.length - 1
  header(sheet, top - 1, [
    'Holding',
    'Weight',
    'Amount (thousands)',
    'Contribution to risk',
    'Share of risk',
    'Limit',
    'Over the limit',
    'Standard error of share',
    'Least-risk weight',
    'Equal risk contribution',
  ])
  HOLDINGS.forEach((_, i) => {
    const row = sheet.getRow(top + i)
    const source = FIRST + i
    row.getCell(1).value = { formula: `Book!A${source}` }
    row.getCell(2).value = { formula: `Book!D${source}` }
    row.getCell(3).value = { formula: `B${top + i}*$B$4` }
    row.getCell(6).value = { formula: `Book!F${source}` }
    row.getCell(7).value = { formula: `IF(E${top + i}>F${top + i},"over","")` }
    row.getCell(7).alignment = { horizontal: 'center' }
  })
  const spill = (column, formula) => {
    const ref = `${column}${top}:${column}${last}`
    sheet.getCell(`${column}${top}`).value = { formula, shareType: 'array', ref }
  }
  spill('D', add('CONTRIBUTION', weights, returns, 'B5'))
  spill('E', add('RISKSHARE', weights, returns))
  spill('H', add('RISKSHAREERROR', weights, returns))
  spill('I', add('LEASTRISKWEIGHT', weights, returns))
  spill('J', add('BUDGETWEIGHTS', returns))
  const total = sheet.getRow(last + 1)
  total.getCell(1).value = 'Total'
  for (const column of ['B', 'C', 'D', 'E', 'J']) {
    total.getCell(column).value = { formula: `SUM(${column}${top}:${column}${last})` }
  }
  for (let column = 1; column <= 10; column++) {
    total.getCell(column).border = { top: LINE }
    total.getCell(column).font = { bold: true, color: { argb: INK } }
  }
  sheet.getCell(`A${last + 2}`).value = 'Total less volatility'
  sheet.getCell(`D${last + 2}`).value = { formula: `D${last + 1}-B6` }
  for (const [column, format] of [
    [2, PERCENT],
    [3, '#,##0'],
    [4, '0.00%'],
    [5, PERCENT],
    [6, PERCENT],
    [8, PERCENT],
    [9, PERCENT],
    [10, PERCENT],
  ]) {
    numbers(sheet, column, top, last + 2, format)
  }
  numbers(sheet, 7, top, last, 'General')

  sheet.getCell(`L${top - 2}`).value = 'The same as one table'
  sheet.getCell(`L${top - 2}`).font = { bold: true, color: { argb: INK } }
  const [rows, columns] = BREAKDOWN_SIZE
  sheet.getCell(`L${top - 1}`).value = {
    formula: add('BREAKDOWN', `Book!A${FIRST}:A${LAST}`, weights, returns, 'B5'),
    shareType: 'array',
    ref: `L${top - 1}:${String.fromCharCode('L'.charCodeAt(0) + columns - 1)}${top - 2 + rows}`,
  }
  header(sheet, top - 1, Array(columns).fill(null), 12)
  ;[PERCENT, PERCENT, '0.000', '0.00%', PERCENT, '0.00', '0.00'].forEach((format, i) => {
    numbers(sheet, 13 + i, top, top - 2 + rows, format)
  })
  widths(sheet, [
    40,
    12,
    15,
    15,
    12,
    10,
    12,
    14,
    14,
    14,
    3,
    31,
    ...Array.from({ length: columns - 1 }, () => 15),
  ])
}

/** Rows and columns of BREAKDOWN's table for this book: headings, the holdings and a total; name and seven figures. */
const BREAKDOWN_SIZE = [HOLDINGS.length + 2, 8]

function writeReadMe(sheet) {
  title(sheet, 'What this workbook is', 'Everything in it is invented.')
  const lines = [
    'Larkmoor Foundation, its holdings and their returns do not exist. The returns come from a random generator with a fixed start,',
    'four common factors and fat tails, so the workbook is the same every time it is made.',
    '',
    'Book: sixteen holdings with weights that add up to 100% net and 116% gross (a short position hedges part of the shares), a benchmark, ',
    'a limit on each share of risk, and an expected return.',
    'Returns: 260 weekly returns, oldest first. "Tidal power projects" starts two and a half years in; the cells before are empty.',
    '"Timber and orchard land" is valued every fourth week and stands still in between, which makes it look calmer than it is.',
    'Factors: weekly returns of the four common factors, for whoever wants a factor model (A1:E261).',
    'Limits: a table of nine limits on the total, on holdings and on groups (A4:E13); two limits of the workbook are breached.',
    "Model: a small sheet that was there before, with the add-in's functions between ordinary formulas.",
    '',
    'To try: select the holdings with their header in Book (A4:G21) and choose "Use selection" in the pane; the same in Returns (A1:Q261);',
    'the limits are in Limits (A4:E13); compute; write the table; then change a weight in Book and watch pane, table and Model follow.',
    '',
    'An estimate from past returns, not advice. Local rules and licensed practice come first.',
  ]
  lines.forEach((line, i) => {
    if (line) sheet.getCell(4 + i, 1).value = line
  })
  widths(sheet, [120])
  sheet.views = [{ state: 'normal', showGridLines: false }]
}

function title(sheet, text, below) {
  sheet.getCell('A1').value = text
  sheet.getCell('A1').font = { name: 'Calibri', size: 14, bold: true, color: { argb: INK } }
  sheet.getRow(1).height = 24
  sheet.getCell('A2').value = below
  sheet.getCell('A2').font = { name: 'Calibri', size: 11, italic: true, color: { argb: 'FF5B6B75' } }
}

function header(sheet, row, labels, first = 1) {
  labels.forEach((label, i) => {
    const cell = sheet.getCell(row, first + i)
    if (label !== null) cell.value = label
    cell.font = { bold: true, color: { argb: INK } }
    cell.fill = SHADE
    cell.border = { bottom: LINE }
    cell.alignment = { wrapText: true, vertical: 'middle', horizontal: i === 0 ? 'left' : 'center' }
  })
  sheet.getRow(row).height = 36
}

function numbers(sheet, column, first, last, format) {
  for (let row = first; row <= last; row++) sheet.getCell(row, column).numFmt = format
}

const widths = (sheet, list) => list.forEach((width, i) => (sheet.getColumn(i + 1).width = width))

// As a program; the tests take the parts.
if (process.argv[1]?.endsWith('demo-workbook.mjs')) {
  void demoWorkbook()
    .xlsx.writeBuffer()
    .then((bytes) => writeFileSync('assets/demo.xlsx', bytes))
}

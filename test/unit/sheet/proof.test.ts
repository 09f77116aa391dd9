import type { Area, CellValue, Settings, Table } from '../../../src/sheet'
import {
  breakDown,
  columnLetters,
  DEFAULT_SETTINGS,
  matchHoldings,
  parseAddress,
  readHoldings,
  readReturns,
} from '../../../src/sheet'
import { proofTable } from '../../../src/sheet/proof'
import { ENGLISH, modelFor } from './blocks-of-cells'

// Every block here is typed for its test; what the formulas come to is tested with two formula engines (test/reference/proof.test.ts).

/** Off the corner of sheets whose names want quotes. */
const HOLDINGS: Area = { sheet: "Owner's book", row: 2, column: 1, rows: 0, columns: 0 }
const RETURNS: Area = { sheet: 'Weekly data', row: 4, column: 3, rows: 0, columns: 0 }
const CORNER: Area = { sheet: 'Proof', row: 1, column: 2, rows: 1, columns: 1 }

const areaOf = (corner: Area, rows: readonly (readonly CellValue[])[]): Area => ({
  ...corner,
  rows: rows.length,
  columns: rows[0]?.length ?? 0,
})

async function proofOf(
  holdings: CellValue[][],
  returns: CellValue[][],
  change: Partial<Settings> = {},
  capital: Area | null = null,
): Promise<Table> {
  const settings = { ...DEFAULT_SETTINGS, ...change }
  const blocks = {
    holdings: readHoldings({ area: areaOf(HOLDINGS, holdings), values: holdings }, settings, ENGLISH),
    returns: readReturns({ area: areaOf(RETURNS, returns), values: returns }, settings, ENGLISH),
    factors: null,
  }
  const match = matchHoldings(blocks.holdings, blocks.returns, settings.riskless, settings.currency)
  const whole = { ...blocks, match }
  const book = await modelFor(whole, settings)
  const breakdown = breakDown(whole, book, settings)
  return proofTable({ title: 'Orchard', blocks: whole, book, settings, breakdown, capital }, CORNER)
}

/** Friday, 3 January 2020 */
const FIRST = 43833
const returnOf = (t: number, i: number): number => 0.01 * Math.sin(3 * t + i * i) + 0.002 * i

const weekly = (names: readonly string[], dates: number): CellValue[][] => [
  ['Date', ...names],
  ...Array.from({ length: dates }, (_, t) => [FIRST + 7 * t, ...names.map((_name, i) => returnOf(t, i))]),
]
/** The same with some large moves: within the domain of the corrected normal quantile, by trial. */
const fatTailed = (names: readonly string[], dates: number): CellValue[][] =>
  weekly(names, dates).map((row, r) =>
    row.map((value, c) => (r > 0 && c > 0 && r % 9 === 4 ? 2.5 * Number(value) : value)),
  )
const held = (weights: readonly CellValue[], names: readonly string[]): CellValue[][] => [
  ['Holding', 'Weight'],
  ...weights.map((weight, i) => [names[i] ?? '', weight]),
]
const TREES = ['Alder', 'Beech', 'Cedar']
const turned = (rows: CellValue[][]): CellValue[][] =>
  rows[0]!.map((_, column) => rows.map((row) => row[column] ?? ''))

/** The formula or value in a row that begins so, by column. */
function rowOf(table: Table, label: string | RegExp): (string | number | boolean)[] {
  const row = table.cells.find(([first]) =>
    typeof label === 'string' ? first?.value === label : label.test(String(first?.formula ?? first?.value)),
  )
  if (!row) throw new Error(`no row “${String(label)}”`)
  return row.map(({ formula, value }) => formula ?? value)
}
const headsOf = (table: Table, first: string): string[] =>
  table.cells
    .find((row) => row[0]?.value === first && row[0].mark === 'head')!
    .map(({ value }) => String(value))
const formulasOf = (table: Table): string[] => table.cells.flat().flatMap(({ formula }) => formula ?? [])
const textsOf = (table: Table): string =>
  table.cells
    .flat()
    .map(({ value }) => value)
    .join('\n')

/** What a holding's row says under a heading. */
const under = (table: Table, head: string, holding: number): unknown => {
  const start = table.cells.findIndex((row) => row[0]?.value === 'Holding')
  const cell = table.cells[start + 1 + holding]?.[headsOf(table, 'Holding').indexOf(head)]
  return cell?.formula ?? cell?.value
}

test('figures come from the cells of the holdings and the returns, wherever these lie', async () => {
  const table = await proofOf(held([0.5, 0.3, 0.2], TREES), weekly(TREES, 30))
  expect(under(table, 'Holding', 0)).toBe("='Owner''s book'!$B$4")
  expect(under(table, 'Weight', 1)).toBe("='Owner''s book'!$C$5")
  expect(under(table, 'Variance', 2)).toBe("=VAR.S('Weekly data'!$G$6:$G$35)")
  // dates fill rows 6 to 35 there; here the column of the portfolio's returns has as many rows
  const covariance = under(table, 'Covariance with portfolio', 2)
  const [, from, to] =
    /^=COVARIANCE\.S\('Weekly data'!\$G\$6:\$G\$35,\$E\$(\d+):\$E\$(\d+)\)$/.exec(String(covariance)) ?? []
  expect(Number(to) - Number(from)).toBe(29)
  const last = table.cells.at(-1)!
  expect(last[0]?.formula).toBe("='Weekly data'!$D$35")
  expect(last[2]?.formula).toMatch(/^=MMULT\('Weekly data'!\$E\$35:\$G\$35,\$D\$\d+:\$D\$\d+\)$/)
  // that column is the one the last row fills
  expect(Number(to)).toBe(CORNER.row + table.cells.length)
})

test('series in another order, or not held, get their weights in the order of the sheet', async () => {
  const table = await proofOf(held([0.6, 0.4], ['Cedar', 'Alder']), weekly(TREES, 30))
  const start = table.cells.findIndex(([first]) => first?.value === 'Series')
  const rows = table.cells.slice(start + 1, start + 4).map((row) => row.map((c) => c.formula ?? c.value))
  const weight = (holding: number): string => {
    const at = table.cells.findIndex((row) => row[0]?.value === 'Holding') + 1 + holding
    return `=$${columnLetters(CORNER.column + 1)}$${CORNER.row + at + 1}`
  }
  expect(rows.map(([name, of]) => [name, of])).toEqual([
    ['Alder', weight(1)],
    ['Beech (not held)', 0],
    ['Cedar', weight(0)],
  ])
})

test('dates that run back in time or across are taken as they lie', async () => {
  const across = await proofOf(held([0.5, 0.3, 0.2], TREES), turned(weekly(TREES, 30)))
  expect(across.cells.at(-1)?.[2]?.formula).toMatch(
    /^=SUMPRODUCT\('Weekly data'!\$AH\$6:\$AH\$8,\$D\$\d+:\$D\$\d+\)$/,
  )
  expect(under(across, 'Covariance with portfolio', 1)).toMatch(
    /^=MMULT\('Weekly data'!\$E\$7:\$AH\$7,\$F\$\d+:\$F\$\d+\)$/,
  )
  const [head = [], ...dates] = weekly(TREES, 30)
  const back = await proofOf(held([0.5, 0.3, 0.2], TREES), [head, ...dates.reverse()], {
    estimator: { kind: 'exponential', decay: 0.9 },
  })
  const start = back.cells.findIndex(([first]) => first?.value === 'Date')
  // the newest stands first and weighs 1; each one below it the decay factor times the one above
  expect(back.cells[start + 1]?.[1]).toMatchObject({ value: 1 })
  expect(back.cells[start + 2]?.[1]?.formula).toBe(
    `=${String(/\$D\$\d+/.exec(back.cells[start + 2]![1]!.formula!)?.[0])}*$D$${CORNER.row + start + 2}`,
  )
})

test('a date left out for a gap weighs nothing, and ranges of prices stop at a gap', async () => {
  const gappy = weekly(TREES, 30)
  gappy[10]![2] = ''
  const table = await proofOf(held([0.5, 0.3, 0.2], TREES), gappy)
  const start = table.cells.findIndex(([first]) => first?.value === 'Date')
  expect(table.cells[start + 10]?.slice(1, 4).map((c) => c.formula ?? c.value)).toEqual([0, '', 0])
  const prices = weekly(TREES, 30).map((row, r) =>
    row.map((v, c) => (r === 0 || c === 0 ? v : 100 + 10 * Number(v))),
  )
  prices[10]![2] = ''
  const fromPrices = await proofOf(held([0.5, 0.3, 0.2], TREES), prices)
  expect(under(fromPrices, 'Covariance with portfolio', 1)).toMatch(
    /^=SUMPRODUCT\(\('Weekly data'!\$F\$7:\$F\$14\/'Weekly data'!\$F\$6:\$F\$13-1\),\$F\$\d+:\$F\$\d+\)\+SUMPRODUCT\(\('Weekly data'!\$F\$17:\$F\$35\/'Weekly data'!\$F\$16:\$F\$34-1\),/,
  )
})

test('amounts are divided by the capital, which is their sum or stands in the settings', async () => {
  const rows: CellValue[][] = [
    ['Holding', 'Amount'],
    ['Alder', 600],
    ['Beech', 400],
  ]
  const table = await proofOf(rows, weekly(['Alder', 'Beech'], 30))
  expect(under(table, 'Amount', 0)).toBe("='Owner''s book'!$C$4")
  expect(under(table, 'Weight', 0)).toMatch(/^=\$D\$\d+\/\$D\$\d+$/)
  expect(rowOf(table, 'Capital')[1]).toMatch(/^=SUM\(\$D\$\d+:\$D\$\d+\)$/)
  const given = await proofOf(rows, weekly(['Alder', 'Beech'], 30), { capital: 2000 })
  expect(rowOf(given, 'Capital')[1]).toBe(2000)
  const followed = await proofOf(
    rows,
    weekly(['Alder', 'Beech'], 30),
    { capital: 2000 },
    parseAddress("'Owner''s book'!H1"),
  )
  expect(rowOf(followed, 'Capital')[1]).toBe("='Owner''s book'!$H$1")
})

test('a weight typed as text stands as a constant, and it is said', async () => {
  const table = await proofOf(held(['50%', 0.5], TREES), weekly(['Alder', 'Beech'], 30))
  expect(under(table, 'Weight', 0)).toBe(0.5)
  expect(under(table, 'Note', 0)).toBe('typed as text: a constant here')
  expect(under(table, 'Note', 1)).toBe('')
})

test('what formulas cannot recompute is taken over, and the head says so', async () => {
  const gappy = weekly(TREES, 40)
  gappy[3]![1] = ''
  const paired = await proofOf(held([0.5, 0.3, 0.2], TREES), gappy, { gaps: 'own overlap' })
  const alert = paired.cells.slice(0, 6).flat().find(({ mark }) => mark === 'alert') // prettier-ignore
  expect(alert?.value).toMatch(/^NOT recomputed: the covariances\. .*“each pair’s own overlap”/)
  expect(typeof under(paired, 'Covariance with portfolio', 0)).toBe('number')
  expect(under(paired, 'Note', 0)).toBe('covariances taken over')
  expect(under(paired, 'Contribution to risk', 0)).toMatch(/^=\$D\$\d+\*/)

  const typed = weekly(TREES, 40)
  typed[3]![1] = '1.5%'
  expect(textsOf(await proofOf(held([0.5, 0.3, 0.2], TREES), typed))).toMatch(
    /NOT recomputed: .*numbers typed as text/,
  )
  const tails = { method: { kind: 'cornish-fisher' }, confidence: 0.95, periods: 1 } as const
  const fatAndTyped = fatTailed(TREES, 60)
  fatAndTyped[3]![1] = '1.5%'
  expect(textsOf(await proofOf(held([0.5, 0.3, 0.2], TREES), fatAndTyped, { tails }))).toMatch(
    /^Value at risk and expected shortfall: .*numbers typed as text/m,
  )
  const abroad = await proofOf(
    [['Holding', 'Weight', 'Currency'], ['Alder', 0.5, 'AAA'], ['Beech', 0.5, 'BBB']],
    weekly(['Alder', 'Beech', 'BBB'], 40),
    { currency: { base: 'AAA', returnsIn: 'local' } },
  ) // prettier-ignore
  expect(textsOf(abroad)).toMatch(/NOT recomputed: .*brought to AAA before anything is estimated/)
  const whole = await proofOf(held([0.5, 0.3, 0.2], TREES), weekly(TREES, 40))
  expect(textsOf(whole)).not.toMatch(/NOT recomputed/)
})

test('a riskless holding has covariance 0 and the word for it', async () => {
  const table = await proofOf(held([0.5, 0.3, 0.2], ['Alder', 'Beech', 'Cash']), weekly(TREES, 30), {
    riskless: ['Cash'],
  })
  expect(under(table, 'Covariance with portfolio', 2)).toBe(0)
  expect(under(table, 'Note', 2)).toBe('riskless: covariance 0')
  expect(under(table, 'Correlation with portfolio', 2)).toBe('not defined')
})

test('shares that are withheld are withheld here too, while contributions are recomputed', async () => {
  const twins = weekly(['Alder', 'Twin'], 30).map((row, r) =>
    r === 0 ? row : [row[0]!, row[1]!, Number(row[1]) + 1e-4 * ((r * 7) % 5)],
  )
  const table = await proofOf(held([1, -1], ['Alder', 'Twin']), twins)
  expect(textsOf(table)).toMatch(/Shares of risk are withheld/)
  expect(under(table, 'Share of risk', 0)).toBe('withheld')
  expect(under(table, 'Contribution to risk', 0)).toMatch(/^=\$D\$\d+\*/)
})

test('a book without risk has contributions of 0, and what divides by its risk is not defined', async () => {
  const table = await proofOf(held([0, 0, 0], TREES), weekly(TREES, 30))
  expect(under(table, 'Contribution to risk', 0)).toMatch(/^=IF\(\$D\$\d+=0,0,/)
  expect(under(table, 'Beta to portfolio', 0)).toBe('not defined')
})

const ESTIMATORS: readonly Settings['estimator'][] = [
  { kind: 'sample' },
  { kind: 'exponential', decay: 0.94 },
  { kind: 'shrinkage', target: 'identity' },
  { kind: 'shrinkage', target: 'correlation' },
  { kind: 'shrinkage', target: 'oas' },
  { kind: 'lagged', lags: 10 },
]
const METHODS: readonly Settings['tails']['method'][] = [
  { kind: 'historical' },
  { kind: 'normal' },
  { kind: 'student', degrees: 4.5 },
  { kind: 'student', degrees: null },
  { kind: 'cornish-fisher' },
]

/** Functions every spreadsheet of the last fifteen years has, and that give one number of one or two ranges without being entered as arrays. */
const PLAIN_FUNCTIONS = new Set([
  'ABS', 'AND', 'AVERAGE', 'BETA.DIST', 'COUNT', 'COUNTIF', 'COVARIANCE.P', 'COVARIANCE.S', 'EXP', 'GAMMALN', 'IF', 'ISNUMBER', 'LN', 'MAX',
  'MIN', 'MMULT', 'NORM.S.DIST', 'NORM.S.INV', 'PI', 'ROUND', 'ROUNDUP', 'SMALL', 'SQRT', 'STDEV.S', 'SUM', 'SUMPRODUCT', 'SUMSQ',
  'VAR.P', 'VAR.S',
]) // prettier-ignore

const withoutTexts = (formula: string): string => formula.replace(/'(?:[^']|'')*'!/g, '').replace(/"[^"]*"/g, '""') // prettier-ignore

test('formulas hold plain functions and addresses alone, no add-in and nothing that spills, and balance', async () => {
  const tables = [
    ...(await Promise.all(
      ESTIMATORS.map((estimator) =>
        proofOf(
          [['Holding', 'Class', 'Weight', 'Benchmark weight'], ['Alder', 'Leaf', 0.5, 0.4], ['Beech', '', 0.5, 0.6]],
          weekly(TREES, 60),
          { estimator, convention: 'benchmark-relative returns' },
        ),
      ), // prettier-ignore
    )),
    ...(await Promise.all(
      METHODS.map((method) =>
        proofOf(held([0.5, 0.3, 0.2], TREES), fatTailed(TREES, 60), {
          tails: { method, confidence: 0.95, periods: 1 },
        }),
      ),
    )),
  ]
  const formulas = tables.flatMap(formulasOf)
  expect(formulas.length).toBeGreaterThan(1000)
  // every one of them is met with
  expect([...PLAIN_FUNCTIONS].filter((name) => !formulas.some((one) => one.includes(`${name}(`)))).toEqual([])
  const wrong = formulas.filter((formula) => {
    const bare = withoutTexts(formula)
    const called = [...bare.matchAll(/([A-Z][A-Z0-9.]*)\(/g)].map(([, name]) => name!)
    // what is left of it besides functions are addresses and numbers
    const words = bare.replace(/[A-Z][A-Z0-9.]*\(/g, '').match(/[$A-Za-z][$A-Za-z0-9]*/g) ?? []
    return (
      called.some((name) => !PLAIN_FUNCTIONS.has(name)) ||
      /[#@[\]{};]|undefined|NaN|Infinity/.test(bare) ||
      bare.split('(').length !== bare.split(')').length ||
      words.some((word) => !/^(TRUE|FALSE|E|E\d*)$/.test(word) && parseAddress(word) === null)
    )
  })
  expect(wrong).toEqual([])
})

test('no cell of the proof refers to a blank place of its own', async () => {
  const blank: string[] = []
  let looked = 0
  for (const estimator of ESTIMATORS) {
    const table = await proofOf(held([0.5, 0.3, 0.2], TREES), weekly(TREES, 60), { estimator })
    for (const formula of formulasOf(table))
      for (const [word] of withoutTexts(formula).matchAll(/(?<![!:A-Z$])\$?[A-Z]{1,2}\$?\d+(?![\d(:])/g)) {
        // references to other sheets lost their sheet above and are left out by where they stand
        if (formula.includes(`!${word}`)) continue
        const { row, column } = parseAddress(word)!
        const cell = table.cells[row - CORNER.row]?.[column - CORNER.column]
        looked++
        if (cell === undefined || (cell.formula ?? cell.value) === '') blank.push(`${word} of ${formula}`)
      }
  }
  expect(looked).toBeGreaterThan(2000)
  expect(blank).toEqual([])
})

test('numbers that are no formulas are ours, under our name, or steps with a label', async () => {
  const table = await proofOf(held([0.5, 0.3, 0.2], TREES), weekly(TREES, 60), {
    estimator: { kind: 'exponential', decay: 0.94 },
  })
  const stray: unknown[] = []
  let heads: readonly string[] = []
  for (const row of table.cells) {
    if (row[0]?.mark === 'section') heads = []
    if (row[0]?.mark === 'head') heads = row.map(({ value }) => String(value))
    row.forEach(({ value, formula }, c) => {
      if (typeof value !== 'number' || formula !== undefined) return
      const isOurs = heads[c]?.endsWith('Counterpoise') === true
      const isStep = c === 1 && typeof row[0]?.value === 'string' && row[0].value !== ''
      const isNewest = heads[c] === 'Weight of the date' && value === 1
      if (!isOurs && !isStep && !isNewest) stray.push([row[0]?.value, heads[c], value])
    })
  }
  expect(stray).toEqual([])
  expect(
    [...table.cells].flatMap((row) =>
      typeof row[1]?.value === 'number' && row[1].formula === undefined && typeof row[0]?.value === 'string'
        ? [row[0].value]
        : [],
    ),
  ).toEqual(
    expect.arrayContaining(['Tolerance', 'Periods per year', 'Rounding', 'Decay factor', 'Confidence']),
  )
})

test('500 holdings and 1260 dates stay within what a sheet can take', async () => {
  const names = Array.from({ length: 500 }, (_, i) => `Tree ${i + 1}`)
  const table = await proofOf(
    [['Holding', 'Class', 'Weight'], ...names.map((name, i) => [name, `Class ${i % 7}`, 1 / 500])],
    weekly(names, 1260),
  )
  const formulas = formulasOf(table)
  expect(formulas.length).toBeLessThan(13_000)
  expect(formulas.reduce((sum, { length }) => sum + length, 0)).toBeLessThan(1_500_000)
  // the longest a cell of a workbook takes
  expect(Math.max(...formulas.map(({ length }) => length))).toBeLessThan(8192)
  expect(table.cells.every((row) => row.length === table.widths.length)).toBe(true)
  expect(table.numeric.length).toBe(table.widths.length)
}, 120_000)

test('the intensity of a shrinkage is derived where few holdings make it short, and said to be a constant elsewhere', async () => {
  const few = await proofOf(held([0.5, 0.3, 0.2], TREES), weekly(TREES, 60), {
    estimator: { kind: 'shrinkage', target: 'oas' },
  })
  const row = rowOf(few, 'Sum of squared covariances')
  expect(row[1]).toMatch(/^=SUM\(\$D\$\d+:\$D\$\d+\)$/)
  expect(textsOf(few)).not.toMatch(/The shrinkage intensity: a constant here/)
  const names = Array.from({ length: 13 }, (_, i) => `Tree ${i + 1}`)
  const many = await proofOf(held(names.map(() => 1 / 13), names), weekly(names, 60), {
    estimator: { kind: 'shrinkage', target: 'oas' },
  }) // prettier-ignore
  expect(textsOf(many)).toMatch(/The shrinkage intensity: a constant here/)
})

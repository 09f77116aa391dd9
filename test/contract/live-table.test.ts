/**
 * The table of worksheet functions, written over the port into a workbook of the desk and worked out there by the functions themselves: what its
 * cells show is held against what the pane would show of the same cells.
 *
 * No number is from outside: returns and weights are made up here, and the figures they are held against come from the breakdown, which has tests
 * of its own. Tolerance 1e-12 relative: the same doubles, at most added in another order.
 */
import { createCustomFunctions, type FunctionsMetadata } from '../../src/desk/functions'
import { describeFunctions } from '../../src/build/functions-metadata.cjs'
import { associateFunctions } from '../../src/excel'
import type { Area, CellValue, Settings, Table } from '../../src/sheet'
import { liveTable } from '../../src/sheet/live-table'
import type { ProofInput } from '../../src/sheet/proof'
import { worksheetFunctions } from '../../src/sheet'
import { computed, type BookCells } from '../recalculation'
import { closeAll, open } from './workbook-fixture'

afterAll(closeAll)

const NAMES = ['Alder', 'Birch', 'Cedar', 'Dogwood'] as const
const WEIGHTS = [0.4, 0.35, -0.15, 0.3] as const
const DATES = 40
const MONDAY = 45_999

/** Four series that move together in part, and each by itself. */
const RETURNS = Array.from({ length: DATES }, (_, t) =>
  NAMES.map((_, i) => 0.012 * Math.sin(1.7 * t) * (1 + 0.3 * i) + 0.008 * Math.cos(2.9 * t * (i + 1) + i)),
)

const HOLDINGS: CellValue[][] = [
  ['Holding', 'Weight', 'Region', 'Kind'],
  ...NAMES.map((name, i): CellValue[] => [name, WEIGHTS[i]!, i % 2 === 0 ? 'North' : 'South', i < 3 ? 'Soft' : '']),
] // prettier-ignore

const block = (names: readonly string[] = NAMES, dated = true): CellValue[][] => [
  [...(dated ? ['Date'] : []), ...names],
  ...RETURNS.map((row, t): CellValue[] => [...(dated ? [MONDAY + 7 * t] : []), ...row]),
]

const at: Area = { sheet: 'Risk, live', row: 2, column: 1, rows: 1, columns: 1 }

const plain = (cells: readonly (readonly CellValue[])[]): Table => ({
  cells: cells.map((row) => row.map((value) => ({ value, format: 'General' }))),
  widths: cells[0]!.map(() => 10),
  numeric: cells[0]!.map(() => false),
})

/** What the cells of live tables show once the workbook has worked them out; all of them in one workbook, which is slow to begin. */
async function shown(laid: readonly (readonly [BookCells, Table])[]): Promise<readonly CellValue[][][]> {
  const { grid, book: port, cells, settle } = open()
  const host = createCustomFunctions(grid)
  Object.assign(globalThis, { CustomFunctions: host })
  host.register(JSON.parse(await describeFunctions('src/sheet/functions.ts')) as FunctionsMetadata, 'POISE')
  associateFunctions(worksheetFunctions)
  try {
    const write = (sheet: string, row: number, column: number, table: Table) =>
      port.write({ sheet, patches: [{ at: { sheet, row, column }, table, over: 'blank' }] })
    for (const [book] of laid) {
      await write(`${book.name} book`, 3, 1, plain(book.holdings))
      await write(`${book.name} data`, 1, 2, plain(book.returns))
    }
    const calculated = grid.api.getFormula().onCalculationResultApplied()
    for (const [book, table] of laid) await write(`${book.name} live`, at.row, at.column, table)
    await calculated
    await settle()
    const all: CellValue[][][] = []
    for (const [book, table] of laid) {
      const { values } = await cells(`${book.name} live`, `B3:N${table.cells.length + 3}`)
      all.push(values as CellValue[][])
    }
    return all
  } finally {
    host.dispose()
  }
}

/** The row of a label, its first column. */
function rowOf(values: CellValue[][], label: string, from = 0): CellValue[] {
  const row = values.findIndex(([first], k) => k >= from && first === label)
  if (row < 0) throw new Error(`no row ${label}:\n${values.map((line) => line.join(' | ')).join('\n')}`)
  return values[row]!
}

const near = (shown: CellValue | undefined, figure: number | null | undefined): void => {
  expect(typeof shown).toBe('number')
  expect(Math.abs((shown as number) - figure!)).toBeLessThanOrEqual(1e-12 * Math.max(Math.abs(figure!), 1e-3))
}

function holdsAgainst({ breakdown }: ProofInput, values: CellValue[][], names: readonly string[] = NAMES): void {
  const { decomposition: d, tails } = breakdown
  near(rowOf(values, 'Volatility')[1], d.volatility)
  near(rowOf(values, 'Diversification ratio')[1], d.diversificationRatio)
  near(rowOf(values, 'Effective number of positions')[1], d.effectiveNumber)
  near(rowOf(values, 'Net weight')[1], breakdown.net)
  near(rowOf(values, 'Gross weight')[1], breakdown.gross)
  if (typeof tails !== 'string') {
    near(rowOf(values, 'Value at risk')[1], tails.risk.valueAtRisk)
    if (tails.risk.shortfall !== null) near(rowOf(values, 'Expected shortfall')[1], tails.risk.shortfall)
  }
  const positions = values.findIndex(([first]) => first === 'Positions')
  for (const name of names) {
    const i = breakdown.names.indexOf(name)
    const row = rowOf(values, name, positions)
    const figures = [d.weights, d.standAlone, d.marginal, d.contribution, d.share, d.beta, d.correlation]
    figures.forEach((figure, k) => near(row[k + 1], figure?.[i]))
  }
  near(rowOf(values, 'Sum of parts')[4], d.volatility)
  expect(Math.abs(rowOf(values, 'Difference')[4] as number)).toBeLessThan(1e-15)
  for (const { header, labels, parts } of breakdown.byGroup) {
    const section = values.findIndex(([first]) => first === `By ${header}`)
    labels.forEach((label, g) => {
      const row = rowOf(values, label, section)
      const figures = [parts.weight, parts.standAlone, parts.contribution, parts.share]
      figures.forEach((figure, k) => near(row[k + 1], figure?.[g]))
    })
  }
} // prettier-ignore

const formulasOf = (table: Table): string[] =>
  table.cells.flatMap((row) => row.flatMap(({ formula }) => (formula === undefined ? [] : [formula])))

const SETTINGS: Partial<Settings> = { periodsPerYear: 52 }

const tails = (method: Settings['tails']['method'], periods = 1): Pick<Settings, 'tails'> => ({
  tails: { method, confidence: 0.9, periods },
})

const prices: number[][] = [[100, 50, 20, 80]]
for (const row of RETURNS) prices.push(prices.at(-1)!.map((price, i) => price * (1 + row[i]!)))
const PRICED = [['Date', ...NAMES], ...prices.map((row, t): CellValue[] => [MONDAY + 7 * t, ...row])]
const DATED = block()
const COVARIANCE = [0, 1, 2, 3].map((i) => [0, 1, 2, 3].map((j) => (i === j ? 0.04 + 0.01 * i : 0.012)))

/** By name: what is typed in the cells of each book, and what is chosen for it. */
const BOOKS: { readonly [name: string]: Omit<BookCells, 'name' | 'holdings'> & Partial<BookCells> } = {
  Plain: { returns: block() },
  Exponential: {
    returns: block(),
    settings: { estimator: { kind: 'exponential', decay: 0.97 }, ...tails({ kind: 'normal' }, 4) },
  },
  Correlation: {
    returns: block(),
    settings: {
      estimator: { kind: 'shrinkage', target: 'correlation' },
      ...tails({ kind: 'student', degrees: 4.5 }),
    },
  },
  Identity: {
    returns: block(),
    settings: {
      estimator: { kind: 'shrinkage', target: 'identity' },
      ...tails({ kind: 'student', degrees: null }),
    },
  },
  Oas: { returns: block(), settings: { estimator: { kind: 'shrinkage', target: 'oas' } } },
  Lagged: {
    returns: block(NAMES, false),
    settings: {
      estimator: { kind: 'lagged', lags: 3 },
      ...tails({ kind: 'cornish-fisher' }),
      periodsPerYear: null,
    },
  },
  Turned: {
    returns: [
      ['Date', 'Cedar', 'Elm', 'Alder', 'Dogwood', 'Birch'],
      ...RETURNS.map((row, t): CellValue[] => [
        MONDAY + 7 * t,
        row[2]!,
        row[0]! / 2,
        row[0]!,
        row[3]!,
        row[1]!,
      ]).reverse(),
    ],
    settings: { lookBack: { kind: 'last', dates: 25 }, estimator: { kind: 'exponential', decay: 0.9 } },
  },
  Amounts: {
    holdings: [
      ['Holding', 'Amount', 'Region'],
      ['Alder', 400, 'North'],
      ['Birch', 300, 'South'],
      ['Subtotal', 700, ''],
      ['Cash', 200, ''],
      ['Cedar', 150, 'North'],
      ['Dogwood', 250, 'South'],
      ['Total', 1300, ''],
    ],
    returns: block(),
    settings: { riskless: ['Cash'] },
  },
  Prices: { returns: PRICED, settings: { content: 'prices' } },
  Logs: { returns: PRICED, settings: { content: 'prices', returnKind: 'log' } },
  Across: { returns: DATED[0]!.map((_, c) => DATED.map((row) => row[c]!)) },
  Matrix: {
    returns: [['', ...NAMES], ...COVARIANCE.map((row, i): CellValue[] => [NAMES[i]!, ...row])],
    settings: { periodsPerYear: null, ...tails({ kind: 'normal' }, 10) },
  },
}

describe('a table of worksheet functions gives the figures of the pane', () => {
  const seen = new Map<string, { input: ProofInput; table: Table; values: CellValue[][] }>()
  beforeAll(async () => {
    const laid: (readonly [BookCells, Table])[] = []
    const inputs: ProofInput[] = []
    for (const [name, cells] of Object.entries(BOOKS)) {
      const book = { holdings: HOLDINGS, ...cells, name, settings: { ...SETTINGS, ...cells.settings } }
      const input = await computed(book)
      const table = liveTable(input, at)
      if (typeof table === 'string') throw new Error(`${name}: ${table}`)
      inputs.push(input)
      laid.push([book, table])
    }
    const values = await shown(laid)
    laid.forEach(([{ name }, table], k) => seen.set(name, { input: inputs[k]!, table, values: values[k]! }))
  }, 120_000)

  const agrees = (name: string): { formulas: string[]; table: Table; values: CellValue[][] } => {
    const { input, table, values } = seen.get(name)!
    holdsAgainst(input, values)
    return { formulas: formulasOf(table), table, values }
  }

  test('from weights and returns as they lie, which it calls directly', () => {
    const { formulas, table } = agrees('Plain')
    expect(formulas[0]).toBe(`=POISE.VOLATILITY('Plain book'!$C$5:$C$8,'Plain data'!$D$3:$G$42,$C$18,$C$19)`)
    // what a formula will fill is left blank, with the format of its figures
    const top = table.cells.findIndex(([first]) => first?.formula?.startsWith('=POISE.BREAKDOWN('))
    expect(table.cells[top + 1]!.map(({ value, format }) => [value, format]).slice(0, 6)).toEqual([
      ['', 'General'],
      ['', '0.00%'],
      ['', '0.00%'],
      ['', '0.00%'],
      ['', '0.00%'],
      ['', '0.0%'],
    ])
  })

  test.each(['Exponential', 'Correlation', 'Identity', 'Oas', 'Lagged'])(
    'under an estimator and a method that have a word in cells: %s',
    (name) => {
      agrees(name)
    },
  )

  test('from part of the dates, newest first, with series in another order and one that is not held between', () => {
    const { formulas, table } = agrees('Turned')
    expect(formulas[0]).toMatch(/^=POISE\.VOLATILITY\(\$C\$\d+:\$C\$\d+,'Turned data'!\$C\$2:\$H\$27,/)
    expect(table.cells.flat().map(({ value }) => value)).toContain(
      '“Elm” is not held and stands with a weight of 0, as the functions take a block without gaps.',
    )
  })

  test('from amounts with totals in between, divided by their sum, and a riskless holding without returns', () => {
    const { input, table, values } = seen.get('Amounts')!
    const { decomposition: d, byGroup } = input.breakdown
    near(rowOf(values, 'Volatility')[1], d.volatility)
    near(rowOf(values, 'Diversification ratio')[1], d.diversificationRatio)
    near(rowOf(values, 'Value at risk')[1], (input.breakdown.tails as { risk: { valueAtRisk: number } }).risk.valueAtRisk) // prettier-ignore
    near(rowOf(values, 'Net weight')[1], 1)
    near(rowOf(values, 'Gross weight')[1], 1)
    near(rowOf(values, 'Capital')[1], 1300)
    near(rowOf(values, 'South')[3], byGroup[0]!.parts.contribution[byGroup[0]!.labels.indexOf('South')])
    const ordered = values.findIndex(([first]) => String(first).startsWith('Names, weights and groups'))
    near(rowOf(values, 'Dogwood', ordered)[1], 250 / 1300)
    near(rowOf(values, 'Cash', ordered)[1], 200 / 1300)
    expect(formulasOf(table)).toContain(
      `=SUM('Amounts book'!$C$5,'Amounts book'!$C$6,'Amounts book'!$C$8,'Amounts book'!$C$9,'Amounts book'!$C$10)`,
    )
  })

  test('from prices, from dates across and from a covariance matrix', () => {
    expect(agrees('Prices').formulas[0]).toContain("POISE.RETURNS('Prices data'!$D$3:$G$43)")
    expect(agrees('Logs').formulas[0]).toContain(`POISE.RETURNS('Logs data'!$D$3:$G$43,"log")`)
    expect(agrees('Across').formulas[0]).toContain("TRANSPOSE('Across data'!$D$3:$AQ$6)")
    expect(agrees('Matrix').formulas[0]).toContain("'Matrix data'!$D$3:$G$6")
  })
})

describe('a table of worksheet functions is refused', () => {
  const reason = async (settings: Partial<Settings>, cells: Partial<BookCells> = {}): Promise<string> => {
    const table = liveTable(
      await computed({ name: 'Not', holdings: HOLDINGS, returns: block(), ...cells, settings: { ...SETTINGS, ...settings } }),
      at,
    )
    return typeof table === 'string' ? table : 'laid out'
  } // prettier-ignore

  const changed = (row: number, column: number, value: CellValue): CellValue[][] =>
    block().map((line, r) => (r === row ? line.map((cell, c) => (c === column ? value : cell)) : line))

  test('where a date in between is left out for a gap, naming the cell', async () => {
    expect(await reason({}, { returns: changed(20, 2, '') })).toBe(
      "'Not data'!D23: dates before it are left out or lie elsewhere, and worksheet functions take rows without gaps.",
    )
  })

  test('for rules for gaps that keep such dates, and where a number is typed as text', async () => {
    expect(await reason({ gaps: 'own overlap' }, { returns: changed(20, 2, '') })).toBe(
      'Worksheet functions take dates that all holdings share: the rule chosen for gaps has no part in them.',
    )
    expect(await reason({}, { returns: changed(20, 2, '0.5%') })).toBe(
      "'Not data'!E22: worksheet functions read no number typed as text.",
    )
  })

  test('where zeros at the start of a series would pass for blanks', async () => {
    const still = block().map((line, r) =>
      r > 0 && r < 13 ? line.map((cell, c) => (c === 3 ? 0 : cell)) : line,
    )
    expect(await reason({}, { returns: still })).toMatch(
      /^Worksheet functions do not take these cells\. 'Not data'!F3: found 12 zeros in a row at the start, which is how blanks arrive here; /,
    )
  })

  test('where a series that is not held lies between and has a gap, or would be shrunk with the others', async () => {
    const more = block(['Alder', 'Elm', 'Birch', 'Cedar']).map((line, r) => [...line, r === 0 ? 'Dogwood' : (RETURNS[r - 1]![3]! * 0.9)]) // prettier-ignore
    const gap = more.map((line, r) => (r === 20 ? line.map((cell, c) => (c === 2 ? '' : cell)) : line))
    expect(await reason({}, { returns: gap })).toBe(
      "'Not data'!E22: a series that is not held lies between the others and has a gap, which worksheet functions do not pass over.",
    )
    expect(await reason({ estimator: { kind: 'shrinkage', target: 'correlation' } }, { returns: more })).toBe(
      '“Elm” lies between the series that are held, and would have a part in the shrinkage.',
    )
  })

  test('where a weight is typed as text', async () => {
    const holdings = HOLDINGS.map((row, r) => (r === 2 ? ['Birch', '35%', 'South', 'Soft'] : row))
    expect(await reason({}, { holdings })).toBe(
      'The weight of “Birch” is typed as text or stands in no cell, so that no formula can read it.',
    )
  })
})

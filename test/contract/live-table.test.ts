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

/** What the cells of a live table show once the workbook has worked them out. */
async function shown(book: BookCells, laid: Table) {
  const { grid, book: port, cells, settle } = open()
  const host = createCustomFunctions(grid)
  Object.assign(globalThis, { CustomFunctions: host })
  host.register(JSON.parse(await describeFunctions('src/sheet/functions.ts')) as FunctionsMetadata, 'POISE')
  associateFunctions(worksheetFunctions)
  try {
    const places = [
      [{ sheet: `${book.name} book`, row: 3, column: 1 }, book.holdings],
      [{ sheet: `${book.name} data`, row: 1, column: 2 }, book.returns],
    ] as const
    for (const [place, block] of places)
      await port.write({
        sheet: place.sheet,
        patches: [{ at: place, table: plain(block), over: 'blank' }],
      })
    const calculated = grid.api.getFormula().onCalculationResultApplied()
    await port.write({ sheet: at.sheet, patches: [{ at, table: laid, over: 'blank' }] })
    await calculated
    await settle()
    const { values } = await cells(at.sheet, `B3:N${laid.cells.length + 3}`)
    return values as CellValue[][]
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
  near(rowOf(values, 'Effective number of positions (by risk)')[1], d.effectiveNumber)
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

async function live(book: BookCells): Promise<readonly [ProofInput, Table]> {
  const input = await computed(book)
  const table = liveTable(input, at)
  if (typeof table === 'string') throw new Error(table)
  return [input, table]
}

async function agrees(book: BookCells, names?: readonly string[]): Promise<Table> {
  const [input, table] = await live(book)
  holdsAgainst(input, await shown(book, table), names)
  return table
}

const formulasOf = (table: Table): string[] =>
  table.cells.flatMap((row) => row.flatMap(({ formula }) => (formula === undefined ? [] : [formula])))

const SETTINGS: Partial<Settings> = { periodsPerYear: 52 }

describe('a table of worksheet functions gives the figures of the pane', () => {
  test('from weights and returns as they lie, which it calls directly', async () => {
    const table = await agrees({ name: 'Plain', holdings: HOLDINGS, returns: block(), settings: SETTINGS })
    expect(formulasOf(table)[0]).toBe(
      `=POISE.VOLATILITY('Plain book'!$C$5:$C$8,'Plain data'!$D$3:$G$42,$C$18,$C$19)`,
    )
  })
})

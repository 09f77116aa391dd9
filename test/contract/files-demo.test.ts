/**
 * The demo workbook: made by its generator, opened by the desk, calculated by the add-in's own functions.
 *
 * No number here is from outside: the data are invented, and what is asked of them was asked for when the demo was designed. The volatility
 * is worked out in the test from its definition, sqrt(w'Cw) with the sample covariance.
 */
import { readFileSync } from 'node:fs'
import { Workbook, type CellValue } from '@cj-tech-master/excelts/browser'
import { FormulaDataModel } from '@univerjs/engine-formula'
import { demoWorkbook, HOLDINGS, WEEKS, weeklyReturns } from '../../src/build/demo-workbook.mjs'
import { describeFunctions } from '../../src/build/functions-metadata.cjs'
import { openWorkbook, sentenceOf } from '../../src/desk/files'
import { unpack } from '../../src/desk/files/archive'
import { createCustomFunctions, type FunctionsMetadata } from '../../src/desk/functions'
import { headlessGrid } from '../../src/desk/grid'
import { associateFunctions } from '../../src/excel'
import { worksheetFunctions } from '../../src/sheet'

const committed = readFileSync('assets/demo.xlsx')

async function contents(bytes: Uint8Array): Promise<Record<string, CellValue>> {
  const workbook = new Workbook()
  await workbook.xlsx.loadFromFiles(await unpack(bytes))
  const cells: Record<string, CellValue> = {}
  for (const sheet of workbook.worksheets) {
    sheet.eachRow((row) => row.eachCell((cell) => (cells[`${sheet.name}!${cell.address}`] = cell.value)))
  }
  return cells
}

it('the committed demo workbook is what its generator makes', async () => {
  const made = await contents(new Uint8Array(await demoWorkbook().xlsx.writeBuffer()))
  expect(Object.keys(made).length).toBeGreaterThan(WEEKS * (HOLDINGS.length - 1))
  expect(await contents(committed)).toEqual(made)
})

it('the weights add up to 100% net and 116% gross, with one short position', () => {
  const weights = HOLDINGS.map(({ weight }) => weight)
  const sum = (values: number[]) => values.reduce((total, value) => total + value, 0)
  expect(sum(weights)).toBeCloseTo(1, 12)
  expect(sum(weights.map(Math.abs))).toBeCloseTo(1.16, 12)
  expect(sum(HOLDINGS.map(({ benchmark }) => benchmark))).toBeCloseTo(1, 12)
  expect(weights.filter((weight) => weight < 0)).toHaveLength(1)
})

it('the returns have one late start and one holding that stands still for weeks, but not for long enough to look like a gap', () => {
  const returns = weeklyReturns()
  const missing = HOLDINGS.map((_, i) => returns.filter((row) => row[i] === null).length)
  expect(missing.filter((count) => count > 0)).toEqual([130])
  const stale = HOLDINGS.findIndex(({ name }) => name === 'Timber and orchard land')
  const runs =
    returns
      .map((row) => (row[stale] === 0 ? '0' : '.'))
      .join('')
      .match(/0+/g) ?? []
  expect(Math.max(...runs.map(({ length }) => length))).toBe(3)
})

it('the desk opens it whole, and the functions in its model agree with the definition', async () => {
  const grid = headlessGrid()
  const host = createCustomFunctions(grid)
  Object.assign(globalThis, { CustomFunctions: host })
  try {
    host.register(JSON.parse(await describeFunctions('src/sheet/functions.ts')) as FunctionsMetadata, 'POISE')
    associateFunctions(worksheetFunctions)
    const report = await openWorkbook(grid, committed, new Map(), 'demo.xlsx')
    expect(sentenceOf(report)).toBe('Opened 6 sheets.')

    const sheet = grid.api.getActiveWorkbook()?.getSheetByName('Model')
    const spilled = grid.univer.__getInjector().get(FormulaDataModel).getArrayFormulaCellData()
    const value = (row: number, column: number) =>
      sheet
        ?.getSheet()
        .getCellMatrix()
        .getValue(row - 1, column - 1)?.v ??
      spilled[grid.api.getActiveWorkbook()?.getId() ?? '']?.[sheet?.getSheetId() ?? '']?.[row - 1]?.[
        column - 1
      ]?.v
    const volatility = volatilityByDefinition()
    expect(volatility).toBeGreaterThan(0.08)
    expect(volatility).toBeLessThan(0.09)
    // Tolerance 1e-12 relative: two ways of adding the same doubles.
    expect(Number(value(6, 2)) / volatility).toBeCloseTo(1, 12)
    const column = (number: number) => HOLDINGS.map((_, i) => Number(value(14 + i, number)))
    const total = (values: number[]) => values.reduce((sum, part) => sum + part, 0)
    expect(total(column(4)) / volatility).toBeCloseTo(1, 12)
    expect(total(column(5))).toBeCloseTo(1, 12)
    // every error is a number, and none so large that nothing could be said
    for (const error of column(8)) expect(error).toBeGreaterThanOrEqual(0)
    expect(Math.max(...column(8))).toBeLessThan(0.1)
    // a mean of the worst losses is no smaller than where they begin; both and the estimators stand in the model
    expect(Number(value(5, 7))).toBeGreaterThanOrEqual(Number(value(4, 7)))
    for (const row of [6, 7, 8]) expect(Math.abs(Number(value(row, 7)) / volatility - 1)).toBeLessThan(0.3)
    // defined for every position, as each of them moves
    expect(column(9).every(Number.isFinite)).toBe(true)
    // long-only weights of equal risk contribution: more of the calm, less of the lively
    expect(total(column(10))).toBeCloseTo(1, 12)
    expect(Math.min(...column(10))).toBeGreaterThan(0)
    // The table of BREAKDOWN, in the place the file keeps free for it.
    expect(value(13, 12)).toBe('Holding')
    expect(value(30, 12)).toBe('Total')
    expect(value(14, 16)).toBe(value(14, 4))
    expect(HOLDINGS.filter((_, i) => value(14 + i, 7) === 'over').map(({ name }) => name)).toEqual([
      'Delta young-market equities',
    ])
  } finally {
    host.dispose()
    grid.dispose()
    Reflect.deleteProperty(globalThis, 'CustomFunctions')
  }
})

function volatilityByDefinition(): number {
  const rows = weeklyReturns().filter((row): row is number[] => row.every((value) => value !== null))
  const weights = HOLDINGS.map(({ weight }) => weight)
  const mean = weights.map((_, i) => rows.reduce((sum, row) => sum + (row[i] ?? 0), 0) / rows.length)
  const covariance = (i: number, j: number) =>
    rows.reduce((sum, row) => sum + ((row[i] ?? 0) - (mean[i] ?? 0)) * ((row[j] ?? 0) - (mean[j] ?? 0)), 0) /
    (rows.length - 1)
  const variance = weights.reduce(
    (sum, w, i) => sum + weights.reduce((inner, v, j) => inner + w * v * covariance(i, j), 0),
    0,
  )
  return Math.sqrt(52 * variance)
}

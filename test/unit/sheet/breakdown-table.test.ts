/** How a breakdown is laid out to be written: what stands where, and what is withheld. Every block here is typed for its test. */
import type { CellValue, Settings, Table } from '../../../src/sheet'
import {
  breakDown,
  breakdownTable,
  DEFAULT_SETTINGS,
  matchHoldings,
  readHoldings,
  readReturns,
} from '../../../src/sheet'
import { looksOf } from '../../../src/excel/looks'
import { blockOf, ENGLISH, modelFor } from './blocks-of-cells'

/** Thirty dates of three series; the second is the first but for a trifle, the third is a third of both and moves of its own. */
const common = (t: number): number => 0.01 * Math.sin(t * 1.7)
const RETURNS: CellValue[][] = [
  ['Meadow', 'Orchard', 'Heath'],
  ...Array.from({ length: 30 }, (_, t) => [
    common(t),
    common(t) + 0.0002 * Math.cos(t * 2.9),
    common(t) / 3 + 0.004 * Math.sin(t * t),
  ]),
]
const FACTORS: CellValue[][] = [['Common'], ...Array.from({ length: 30 }, (_, t) => [common(t)])]

async function tableOf(weights: readonly number[], change: Partial<Settings> = {}): Promise<Table> {
  const settings = { ...DEFAULT_SETTINGS, ...change }
  const rows = [
    ['Holding', 'Weight'],
    ...['Meadow', 'Orchard', 'Heath'].map((name, i) => [name, weights[i]!]),
  ]
  const holdings = readHoldings(blockOf(rows), settings, ENGLISH)
  const returns = readReturns(blockOf(RETURNS, 'Returns'), settings, ENGLISH)
  const factors = readReturns(blockOf(FACTORS, 'Factors'), settings, ENGLISH)
  const blocks = { holdings, returns, match: matchHoldings(holdings, returns, settings.riskless), factors }
  return breakdownTable('Book', breakDown(blocks, await modelFor(blocks, settings), settings))
}

/** The cells of the row of a label, the first at or after another label's. */
function rowOf({ cells }: Table, label: string, after: string): readonly CellValue[] {
  const from = cells.findIndex(([first]) => first?.value === after)
  const found = cells.slice(from).find(([first]) => first?.value === label)
  if (from < 0 || !found) throw new Error(`no row ${label} after ${after}`)
  return found.map(({ value }) => value)
}

const BY_FACTORS: Partial<Settings> = { estimator: { kind: 'factors' } }

test('factors have no shares either while the shares of the positions are withheld', async () => {
  const cancelling = await tableOf([1, -0.9, 0], BY_FACTORS)
  expect(rowOf(cancelling, 'Meadow', 'Holding')).toContain('withheld')
  expect(rowOf(cancelling, 'Common', 'Factors')).toContain('withheld')
  expect(rowOf(cancelling, 'Meadow, specific', 'Factors')).toContain('withheld')
  const plain = await tableOf([0.4, 0.3, 0.3], BY_FACTORS)
  expect(rowOf(plain, 'Common', 'Factors')).not.toContain('withheld')
})

test('a rank that is not certain names the position it is not told apart from', async () => {
  const table = await tableOf([0.5, 0.5, 0.1])
  const notes = ['Meadow', 'Orchard', 'Heath'].map((name) => rowOf(table, name, 'Holding').at(-1))
  expect(
    notes.filter((note) => /^Rank 1, not told apart from rank 2, “(Meadow|Orchard)”$/.test(String(note))),
  ).toHaveLength(1)
})

test('the heading of a part stays on one line, however long; headings of columns are wrapped', async () => {
  const table = await tableOf([0.4, 0.3, 0.3])
  const area = { sheet: 'Risk', row: 0, column: 0, rows: table.cells.length, columns: table.widths.length }
  const looks = looksOf(table, area)
  const wrapOf = (label: string): readonly boolean[] => {
    const row = table.cells.findIndex(([first]) => String(first?.value).startsWith(label))
    return looks.filter((look) => look.area.row === row).map(({ wrap }) => wrap)
  }
  expect(wrapOf('Large losses: ')).toEqual([false])
  expect(wrapOf('Settings')).toEqual([false])
  expect(new Set(wrapOf('Holding'))).toEqual(new Set([true]))
})

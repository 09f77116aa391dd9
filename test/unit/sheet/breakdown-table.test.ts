/** How a breakdown is laid out to be written: what stands where, and what is withheld. Every block here is typed for its test. */
import type { CellValue, Settings, Table } from '../../../src/sheet'
import {
  breakDown,
  breakdownTable,
  DEFAULT_SETTINGS,
  matchHoldings,
  readHoldings,
  readLimits,
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

async function tableOf(
  weights: readonly number[],
  change: Partial<Settings> = {},
  { limits = [], groups = false }: { limits?: CellValue[][]; groups?: boolean } = {},
): Promise<Table> {
  const settings = { ...DEFAULT_SETTINGS, ...change }
  const rows = [
    ['Holding', 'Weight', ...(groups ? ['Region'] : [])],
    ...['Meadow', 'Orchard', 'Heath'].map((name, i) => [
      name,
      weights[i]!,
      ...(groups ? [['North', 'North', 'South'][i]!] : []),
    ]),
  ]
  const holdings = readHoldings(blockOf(rows), settings, ENGLISH)
  const returns = readReturns(blockOf(RETURNS, 'Returns'), settings, ENGLISH)
  const factors = readReturns(blockOf(FACTORS, 'Factors'), settings, ENGLISH)
  const blocks = {
    holdings,
    returns,
    match: matchHoldings(holdings, returns, settings.riskless),
    factors,
    limits:
      limits.length === 0
        ? null
        : readLimits(
            blockOf([['Scope', 'Name', 'Measure', 'Soft limit', 'Hard limit'], ...limits], 'Limits'),
            holdings,
            ENGLISH,
          ),
  }
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

describe('limits', () => {
  const LIMITS: CellValue[][] = [
    ['Total', '', 'Volatility', '', 0.5],
    ['Holding', 'Meadow', 'Weight', 0.3, 0.5],
    ['Holding', 'Orchard', 'Weight', '', 0.2],
    ['Total', '', 'Tracking error', '', 0.1],
  ]
  const linesOf = ({ cells }: Table, from: string): string[] => {
    const first = cells.findIndex(([cell]) => cell?.value === from)
    return cells.slice(first).map((row) =>
      row
        .map(({ value }) => value)
        .filter((value) => value !== '')
        .join(' | '),
    )
  }

  test('stand in a section of their own, each with its figure, its limits, a mark and a word', async () => {
    const table = await tableOf([0.4, 0.3, 0.3], { periodsPerYear: 12 }, { limits: LIMITS, groups: true })
    const lines = linesOf(table, 'Limits')
    expect(lines.slice(0, 6)).toEqual([
      'Limits',
      '4 limits: 1 breached, 1 over the soft limit only, 1 not measured and 1 within.',
      'The status follows the figure alone. Headroom and use are counted to the hard limit, or to the soft one where there is no other.',
      'Within estimation error: the 95% band of the figure holds one of its limits, so that the status might be another.',
      'Weights are taken without their signs; that of a group is its net weight.',
      'Volatility, tracking error, contributions and stand-alone risk are by the year.',
    ])
    expect(lines[6]).toBe(
      'Limit on | Measure | Figure | Soft limit | Hard limit | Status | Headroom | Used | Within estimation error | Note',
    )
    expect(lines[7]).toMatch(
      /^Total \| Volatility \| 0\.0\d+ \| 0\.5 \| ○ Within \| 0\.4\d+ \| 0\.0\d+ \| no$/,
    )
    // 0.5 - 0.4 and 0.4 / 0.5, 0.2 - 0.3 and 0.3 / 0.2
    expect(lines[8]).toBe(
      `Meadow | Weight | 0.4 | 0.3 | 0.5 | ◐ Over soft limit | ${0.5 - 0.4} | ${0.4 / 0.5}`,
    )
    expect(lines[9]).toBe(`Orchard | Weight | 0.3 | 0.2 | ● Breach | ${0.2 - 0.3} | ${0.3 / 0.2}`)
    expect(lines[10]).toBe('Total | Tracking error | 0.1 | – Not measured | There is no benchmark.')
    // what is exceeded is said at the head of the table as well
    expect(linesOf(table, 'Contributions to risk: Book')[3]).toMatch(
      /^4 limits: 1 breached, 1 over the soft limit only, 1 not measured and 1 within\./,
    )
  })

  test('lead to the cell they were typed in, and have bars behind what is used of them', async () => {
    for (const groups of [true, false]) {
      const table = await tableOf([0.4, 0.3, 0.3], {}, { limits: LIMITS, groups })
      const head = table.cells.findIndex((row) => row.some(({ value }) => value === 'Used'))
      const used = table.cells[head]!.findIndex(({ value }) => value === 'Used')
      expect(table.bars).toEqual([{ column: used, row: head + 1, rows: 4, full: 1 }])
      expect(table.cells[head + 3]![0]).toMatchObject({
        value: groups ? 'Orchard' : 'Orchard: Weight',
        link: { sheet: 'Limits', row: 3, column: 4 },
      })
    }
  })

  test('that are kept are not announced at the head, and without limits there is no section', async () => {
    const kept = await tableOf([0.4, 0.3, 0.3], {}, { limits: LIMITS.slice(0, 1) })
    expect(linesOf(kept, 'Contributions to risk: Book')[3]).not.toMatch(/limit/)
    const none = await tableOf([0.4, 0.3, 0.3])
    expect(none.bars).toBeUndefined()
    expect(none.cells.some(([cell]) => cell?.value === 'Limits')).toBe(false)
  })

  test('keep their rows whatever the weights, so that a refresh fills the same cells', async () => {
    const shape = async (weights: readonly number[]) => {
      const { cells } = await tableOf(weights, {}, { limits: LIMITS, groups: true })
      return cells.findIndex(([cell]) => cell?.value === 'Settings')
    }
    expect(await shape([0.4, 0.3, 0.3])).toBe(await shape([0.1, 0.1, 0.8]))
  })
})

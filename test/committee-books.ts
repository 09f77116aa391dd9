/** Books to lay a committee's page out for: made up, from one of five positions to one of five hundred. */
import { HOLDINGS, LIMITS, weeklyReturns } from '../src/build/demo-workbook.mjs'
import { breakDown, readLimits } from '../src/sheet'
import type { Breakdown, CellValue, RiskChange, Settings, SnapshotHead } from '../src/sheet'
import { PLAIN_CULTURE } from '../src/sheet/cells'
import type { CommitteeInput } from '../src/sheet/committee-page'
import { computed } from './recalculation'

/** Friday, 27 November 2026. */
export const LAST_DAY = 46_353

const blankForNull = (row: readonly (CellValue | null)[]): CellValue[] => row.map((value) => value ?? '')

/** The book of the demo workbook, with its limits or without any. */
export async function demoBook(withLimits: boolean): Promise<Breakdown> {
  const weeks = weeklyReturns()
  const { blocks, book, settings } = await computed({
    name: 'Demo',
    holdings: [
      ['Holding', 'Asset class', 'Region', 'Weight', 'Benchmark weight', ...(withLimits ? ['Limit on share of risk'] : [])],
      ...HOLDINGS.map(({ name, assetClass, region, weight, benchmark, limit }) => [name, assetClass, region, weight, benchmark, ...(withLimits ? [limit] : [])]),
    ],
    returns: [
      ['Week ending', ...HOLDINGS.map(({ name }) => name)],
      ...weeks.map((row, k) => [LAST_DAY - 7 * (weeks.length - 1 - k), ...blankForNull(row)]),
    ],
  }) // prettier-ignore
  const rows = [['Scope', 'Name', 'Measure', 'Soft limit', 'Hard limit'], ...LIMITS.map(blankForNull)]
  const area = { sheet: 'Limits', row: 0, column: 0, rows: rows.length, columns: 5 }
  const limits = withLimits ? readLimits({ area, values: rows }, blocks.holdings, PLAIN_CULTURE) : null
  return breakDown({ ...blocks, limits }, book, settings)
}

export interface Making {
  readonly positions: number
  readonly weight: (k: number) => number
  /** columns of groups, each with a few labels more than the one before */
  readonly groups?: number
  readonly areNamesLong?: boolean
  readonly isMatrix?: boolean
  readonly settings?: Partial<Settings>
}

const GROUPS = ['Sector', 'Region', 'Manager', 'Style', 'Theme', 'Country']
const QUARTERS = ['northern', 'southern', 'western', 'eastern']

/** A book of so many positions that move together in part. */
export async function madeBook({ positions, weight, groups = 0, ...rest }: Making): Promise<Breakdown> {
  const each = <T>(make: (k: number) => T): T[] => Array.from({ length: positions }, (_, k) => make(k))
  const name = (k: number): string =>
    rest.areNamesLong
      ? `The long-lasting mutual society of the ${QUARTERS[k % 4]} valleys, class ${k + 1}, accumulation units`
      : `Position ${k + 1}`
  const label = (k: number, g: number): string =>
    `${rest.areNamesLong ? 'A rather long label of group' : 'Group'} ${String.fromCharCode(65 + ((k * (g + 3)) % (4 + 3 * g)))}`
  const dates = 120
  const { breakdown } = await computed({
    name: 'Made',
    holdings: [
      ['Holding', 'Weight', ...GROUPS.slice(0, groups)],
      ...each((k) => [name(k), weight(k), ...Array.from({ length: groups }, (_, g) => label(k, g))]),
    ],
    returns: rest.isMatrix
      ? [['', ...each(name)], ...each((i) => [name(i), ...each((j) => (i === j ? 0.04 + 0.001 * i : 0.01))])]
      : [
          ['Date', ...each(name)],
          ...Array.from({ length: dates }, (_, t): CellValue[] => [
            LAST_DAY - 7 * (dates - 1 - t),
            ...each(
              (k) => 0.012 * Math.sin(1.7 * t) * (0.5 + (k % 5) / 4) + 0.01 * Math.sin((t + 1) * (k + 2.3)),
            ),
          ]),
        ],
    ...(rest.settings ? { settings: rest.settings } : {}),
  })
  return breakdown
}

/** So many kept results, four weeks apart, the last of them four weeks before the data end. */
export const keptResults = (
  count: number,
  volatility: number,
  trackingError: number | null,
): SnapshotHead[] =>
  Array.from({ length: count }, (_, k) => ({
    id: String(k + 1),
    title: 'Larkmoor Foundation',
    note: k % 3 === 0 ? 'For the autumn meeting' : '',
    keptOn: LAST_DAY - 28 * (count - k) + 3,
    dataDate: LAST_DAY - 28 * (count - k),
    volatility: volatility * (0.9 + 0.02 * ((7 * k) % 5)),
    trackingError: trackingError && trackingError * (0.9 + 0.01 * k),
    periodsPerYear: 52,
    positions: 16,
    inputsHash: `${k}`,
  }))

/** A change since the last of the kept results whose parts are half, four fifths and minus three tenths of it. */
export function changeSince(from: SnapshotHead, breakdown: Breakdown): RiskChange {
  const { decomposition: d, names } = breakdown
  const change = d.volatility - from.volatility
  return {
    from,
    to: { ...from, id: 'now', volatility: d.volatility, isNow: true },
    horizon: breakdown.horizon,
    change,
    settings: null,
    total: { positions: change / 2, volatilities: 0.8 * change, correlations: -0.3 * change, drift: null, trades: null },
    holdings: names.map((label, i) => {
      const move = 0.03 * d.contribution[i]!
      return { label, presence: 'both', weightFrom: d.weights[i]!, weightTo: d.weights[i]!, volatilityFrom: 0.1, volatilityTo: 0.1, contributionFrom: d.contribution[i]! - move, contributionTo: d.contribution[i]!, settings: 0, positions: 0, volatilities: move, correlations: 0, drift: null, trades: null }
    }),
    groups: [],
    settingLines: { from: [], to: [] },
    sum: change,
    difference: 0,
    notes: ['Drift is not told: the returns do not reach back.'],
  } // prettier-ignore
}

export const inputOf = (breakdown: Breakdown, rest: Partial<CommitteeInput> = {}): CommitteeInput => ({
  title: 'Larkmoor Foundation',
  preparedBy: 'R. Hollis',
  paper: 'A4',
  today: LAST_DAY + 4,
  breakdown,
  checks: null,
  history: [],
  change: null,
  ...rest,
})

/**
 * The limits of the demo workbook: those in its sheet "Limits" and in the limit column of its holdings, held against the book as the desk would.
 *
 * No number is from outside: the data are invented, and how the limits stand was asked for when the demo was designed. That the committed
 * workbook holds what is read here is tested beside its generator.
 */
import { HOLDINGS, LIMITS, weeklyReturns } from '../../src/build/demo-workbook.mjs'
import {
  breakDown,
  DEFAULT_SETTINGS,
  LIMIT_STATUS,
  limitText,
  matchHoldings,
  readHoldings,
  readLimits,
  readReturns,
} from '../../src/sheet'
import type { Breakdown, CellValue } from '../../src/sheet'
import { textbookCovariance, textbookDecomposition } from '../textbook'
import { blockOf, ENGLISH, modelFor } from '../unit/sheet/blocks-of-cells'

const blankForNull = (row: readonly (CellValue | null)[]): CellValue[] => row.map((value) => value ?? '')

let breakdown: Breakdown
beforeAll(async () => {
  const settings = { ...DEFAULT_SETTINGS, periodsPerYear: 52 }
  const heads = ['Holding', 'Asset class', 'Region', 'Weight', 'Benchmark weight', 'Limit on share of risk']
  const holdings = readHoldings(
    blockOf([
      heads,
      ...HOLDINGS.map(({ name, assetClass, region, weight, benchmark, limit }) => [
        name,
        assetClass,
        region,
        weight,
        benchmark,
        limit,
      ]),
    ]),
    settings,
    ENGLISH,
  )
  const returns = readReturns(
    blockOf([HOLDINGS.map(({ name }) => name), ...weeklyReturns().map(blankForNull)], 'Returns'),
    settings,
    ENGLISH,
  )
  const limits = readLimits(
    blockOf(
      [['Scope', 'Name', 'Measure', 'Soft limit', 'Hard limit'], ...LIMITS.map(blankForNull)],
      'Limits',
    ),
    holdings,
    ENGLISH,
  )
  expect([limits.summary, limits.findings]).toEqual([
    '9 limits: 4 on the total, 2 on holdings and 3 on groups',
    [],
  ])
  const match = matchHoldings(holdings, returns, settings.riskless)
  const blocks = { holdings, returns, match, factors: null, limits }
  breakdown = breakDown(blocks, await modelFor(blocks, settings), settings)
})

const named = (status: Breakdown['limits'][number]['status']): string[] =>
  breakdown.limits.filter((state) => state.status === status).map(({ limit }) => limitText(limit))

test('two limits are breached, of a holding and of a group, and one is over its soft limit alone', () => {
  expect(breakdown.limits).toHaveLength(LIMITS.length + HOLDINGS.length)
  expect(named('breach')).toEqual([
    'share of risk of “Region: Islands”',
    'share of risk of “Delta young-market equities”',
  ])
  expect(named('over soft')).toEqual(['weight of “Northern coast equities”'])
  expect(named('not measured')).toEqual([])
})

test('two stand so close to a limit that the estimate does not tell: the volatility and the breach of one holding', () => {
  expect(
    breakdown.limits.filter(({ withinError }) => withinError).map(({ limit }) => limitText(limit)),
  ).toEqual(['volatility of the book', 'share of risk of “Delta young-market equities”'])
})

test('the figures that are breached are those of the plain formulas', () => {
  const rows = weeklyReturns().filter((row): row is number[] => row.every((value) => value !== null))
  const { share } = textbookDecomposition(
    textbookCovariance(rows),
    HOLDINGS.map(({ weight }) => weight),
  )
  const sum = (of: (holding: (typeof HOLDINGS)[number]) => boolean): number =>
    HOLDINGS.reduce((total, holding, i) => total + (of(holding) ? share[i]! : 0), 0)
  const [islands, delta] = breakdown.limits.filter(({ status }) => status === 'breach')
  // two ways of adding the same doubles
  expect(islands?.figure).toBeCloseTo(
    sum(({ region }) => region === 'Islands'),
    12,
  )
  expect(delta?.figure).toBeCloseTo(
    sum(({ name }) => name === 'Delta young-market equities'),
    12,
  )
  expect(LIMIT_STATUS[islands!.status].word).toBe('Breach')
})

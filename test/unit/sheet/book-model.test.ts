import { Fault } from '../../../src/core'
import type { CellValue } from '../../../src/sheet'
import { DEFAULT_SETTINGS, matchHoldings, readHoldings, readReturns } from '../../../src/sheet'
import { blockOf, ENGLISH, modelFor } from './blocks-of-cells'

// Every block here is typed for its test.

const found = { content: null, orientation: null, returnKind: 'simple' } as const
const holdingsOf = (rows: CellValue[][]) => readHoldings(blockOf(rows), { roles: {}, capital: null }, ENGLISH)
const returnsOf = (rows: CellValue[][]) => readReturns(blockOf(rows, 'Returns'), found, ENGLISH)
const held = (...names: string[]) =>
  holdingsOf([['Holding', 'Weight'], ...names.map((name) => [name, 1 / names.length])])
const series = (...names: string[]) =>
  returnsOf([names, ...[0.01, -0.02, 0.015, -0.005].map((r, t) => names.map((_, i) => r * (1 + i * t)))])
const told = (
  match: { findings: readonly { sentence: string; weight: string }[] },
  weight: string,
): string[] => match.findings.filter((finding) => finding.weight === weight).map(({ sentence }) => sentence)

test('a holding marked riskless has zero variance and needs no series', async () => {
  const holdings = held('A', 'Cash')
  const returns = series('A', 'B')
  const { model } = await modelFor(
    { match: matchHoldings(holdings, returns, ['cash']), holdings, returns },
    DEFAULT_SETTINGS,
  )
  expect(model.variances()[1]).toBe(0)
  expect(model.variances()[0]).toBeGreaterThan(0)
})

test('a series that never moves counts as riskless, with a warning at its heading', async () => {
  const holdings = held('A', 'Cash')
  const returns = returnsOf([['A', 'Cash'], [0.01, 0], [-0.02, 0], [0.03, 0]]) // prettier-ignore
  const book = await modelFor(
    { match: matchHoldings(holdings, returns, []), holdings, returns },
    DEFAULT_SETTINGS,
  )
  expect(told(book, 'warns')).toEqual([
    'Returns!B1: the returns of “Cash” never change, so it counts as riskless.',
  ])
})

test('as many holdings as dates is warned of', async () => {
  const holdings = held('A', 'B', 'C', 'D', 'E')
  const returns = series('A', 'B', 'C', 'D', 'E')
  const book = await modelFor(
    { match: matchHoldings(holdings, returns, []), holdings, returns },
    DEFAULT_SETTINGS,
  )
  expect(told(book, 'warns')[0]).toMatch(
    /^4 dates for 5 holdings: too few to tell all the correlations apart/,
  )
})

test('a look-back by date wants dates, one longer than the data is told', async () => {
  const [holdings, returns] = [held('A', 'B'), series('A', 'B')]
  const match = matchHoldings(holdings, returns, [])
  const since = { ...DEFAULT_SETTINGS, lookBack: { kind: 'since', date: 46000 } } as const
  await expect(modelFor({ match, holdings, returns }, since)).rejects.toThrow(Fault)
  const longer = { ...DEFAULT_SETTINGS, lookBack: { kind: 'last', dates: 99 } } as const
  expect(told(await modelFor({ match, holdings, returns }, longer), 'warns')[0]).toBe(
    'The look-back of 99 dates reaches further than the 4 there are.',
  )
})

test('a look-back that leaves no returns says so at its own field, with the dates there are', async () => {
  const holdings = held('A', 'B')
  const returns = returnsOf([
    ['Month', 'A', 'B'],
    [46022, 0.01, 0.02],
    [46053, -0.02, 0.01],
    [46081, 0.03, -0.01],
  ])
  const settings = { ...DEFAULT_SETTINGS, lookBack: { kind: 'since', date: 47484 } } as const
  const compute = () => modelFor({ match: matchHoldings(holdings, returns, []), holdings, returns }, settings)
  await expect(compute()).rejects.toThrow(
    expect.objectContaining({
      found: 'found 0 dates of returns within the look-back',
      needed: 'at least 2 of the 3 there are, 31 Dec 2025 to 28 Feb 2026, are needed',
      where: { argument: 'look-back' },
    }),
  )
})

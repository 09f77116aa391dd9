import {
  inOneGo,
  jarqueBera,
  logReturns,
  mardia,
  returnsModel,
  simpleReturns,
  type BlockNormality,
} from '../../src/core'
import { relativeGap } from '../closeness'
import { generatedReturns, readCsv, readJson } from './data'

const FIGURES = [
  'skewness',
  'skewnessStatistic',
  'skewnessDegrees',
  'skewnessPValue',
  'kurtosis',
  'kurtosisStatistic',
  'kurtosisPValue',
] as const
type Block = Record<(typeof FIGURES)[number], number>
interface Series {
  readonly statistic: number
  readonly pValue: number
}

// Iris setosa, Fisher (1936). Expected: printed by R's package MVN in the course slides "Multivariate Probability Distributions in R" by
// S. Ray (read): skewness 25.6643445196298, p 0.177185884467652; kurtosis 1.29499223711605, p 0.195322907441935. Tolerance: half a unit
// of the 14th digit printed, and as much again for rounding.
test('the multivariate skewness and kurtosis of Iris setosa are those printed', () => {
  const { rows } = readCsv('iris_setosa.csv')
  const model = returnsModel(Float64Array.from(rows.flat()), 50, 4)
  const m = inOneGo(mardia(model))
  expect(relativeGap(m.skewnessStatistic!, 25.6643445196298)).toBeLessThan(1e-13)
  expect(relativeGap(m.skewnessPValue!, 0.177185884467652)).toBeLessThan(1e-13)
  expect(relativeGap(m.kurtosisStatistic!, 1.29499223711605)).toBeLessThan(1e-13)
  expect(relativeGap(m.kurtosisPValue!, 0.195322907441935)).toBeLessThan(1e-13)
  expect(m.verdict).toBe('consistent')
})

// Printed for statsmodels' jarque_bera on a page that shows it at work (read): 0.28125, p 0.8688150562628432; 0.5625, p 0.7548396019890072.
test.each([
  [[1, 2, 3], 0.28125, 0.8688150562628432, 1.5],
  [[1, 2, 3, -1, -2, -3], 0.5625, 0.7548396019890072, 1.5],
])('the Jarque-Bera statistic of %j is the one printed', (values, statistic, pValue, kurtosis) => {
  const t = jarqueBera(Float64Array.from(values))
  expect(relativeGap(t.statistic!, statistic)).toBeLessThan(1e-14)
  expect(relativeGap(t.pValue!, pValue)).toBeLessThan(1e-14)
  expect(relativeGap(t.excessKurtosis!, kurtosis - 3)).toBeLessThan(1e-14)
})

// Expected: normality.json, computed with numpy 2.4.6 / scipy 1.17.1. Tolerance 1e-11; where p-values come from thousands of degrees of
// freedom, 0.1 of the p-value (both are expansions out there).
describe.each(['eu_log', 'eu_simple', 'lcg60', 'lcg120'])('normality of %s', (name) => {
  const expected =
    readJson<Record<string, { first: Series; second: Series; long: Series; block?: Block; last100?: Block }>>(
      'normality.json',
    )[name]!
  const { about } = readJson<{
    readonly about: {
      readonly T: number
      readonly n: number
      readonly weights: { readonly long: number[] }
      readonly generator?: { readonly seed: number }
    }
  }>(`${name}.json`)
  const { T, n, generator } = about
  const { names, rows } = readCsv('eustockmarkets_close.csv')
  const first = names.indexOf('DAX')
  const closes = Float64Array.from(rows.flatMap((row) => row.slice(first, first + 4)))
  const returns = generator
    ? generatedReturns(generator.seed, n, T).returns
    : (name === 'eu_log' ? logReturns : simpleReturns)(closes, T + 1, n)
  const model = returnsModel(returns, T, n)

  test('each series and the book', () => {
    const column = (i: number) => Float64Array.from({ length: T }, (_, t) => returns[t * n + i]!)
    const long = model.portfolioReturns(Float64Array.from(about.weights.long))
    for (const [values, { statistic, pValue }] of [
      [column(0), expected.first],
      [column(1), expected.second],
      [long, expected.long],
    ] as const) {
      const t = jarqueBera(values)
      expect(relativeGap(t.statistic!, statistic)).toBeLessThan(1e-11)
      // exp(-statistic / 2): digits of the exponent are lost to its size
      expect(relativeGap(t.pValue!, pValue)).toBeLessThan(1e-10)
    }
  })

  const compare = (m: BlockNormality, block: Block) => {
    for (const key of FIGURES) {
      const rough = key === 'skewnessPValue' && block.skewnessDegrees > 1000
      expect([key, relativeGap(m[key]!, block[key]) < (rough ? 0.1 : 1e-10)]).toEqual([key, true])
    }
  }
  test('the block', () => {
    const m = inOneGo(mardia(model))
    if (!expected.block)
      return expect(m).toMatchObject({ verdict: 'too-few-dates', skewness: null, kurtosis: null })
    compare(m, expected.block)
    expect(m.verdict).toBe('heavy-tailed')
    compare(inOneGo(mardia(returnsModel(returns.slice((T - 100) * n), 100, n))), expected.last100!)
  })

  test('the weighting of dates does not matter to the block', () => {
    if (!expected.block) return
    const weighted = returnsModel(returns, T, n, { kind: 'exponential', decay: 0.97 })
    compare(inOneGo(mardia(weighted)), expected.block)
  })
})

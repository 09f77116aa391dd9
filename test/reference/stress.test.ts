import { decompose, matrixModel, moveCorrelations, scaleVolatilities } from '../../src/core'
import { absoluteGap, relativeGap } from '../closeness'
import { covarianceOf } from '../textbook'
import { readJson } from './data'

// Published figures of one covariance, reached from that of another by bending it. Citation and status of each: data/published.json.

interface Check {
  readonly id: string
  readonly inputs: {
    readonly weights: number[]
    readonly values: number[]
    readonly vol: number[]
    readonly corr: number[][]
    readonly constantCorr: number
    readonly z: number
  }
  readonly outputs: Readonly<Record<string, number | number[]>>
  readonly tolerance: Readonly<Record<string, number>>
}

const { checks } = readJson<{ readonly checks: readonly Check[] }>('published.json')
function example(id: string): Check {
  const found = checks.find((check) => check.id === id)
  if (!found) throw new Error(`no example ${id}`)
  return found
}

const uncorrelated = (vol: readonly number[]) =>
  matrixModel(
    covarianceOf(
      vol,
      vol.map((_, i) => vol.map((_, j) => (i === j ? 1 : 0))),
    ),
    vol.length,
  )

test('two uncorrelated currencies with their correlation moved to 1 lose the undiversified value at risk (Jorion, Value at Risk, ch. 7; from memory)', () => {
  const { inputs, outputs, tolerance } = example('jorion-2ccy-printed')
  const d = decompose(moveCorrelations(uncorrelated(inputs.vol), 1), Float64Array.from(inputs.values))
  expect(absoluteGap(inputs.z * d.volatility, outputs['undiversifiedVaR']!)).toBeLessThanOrEqual(
    tolerance['undiversifiedVaR']!,
  )
  const parts = d.contribution.map((c) => inputs.z * c)
  expect(absoluteGap(parts, outputs['individualVaR']!)).toBeLessThanOrEqual(tolerance['individualVaR']!)
})

test('uncorrelated volatilities with correlations moved 30% toward 1 have the equal contributions of a constant correlation of 0.3 (Maillard, Roncalli & Teiletche 2010; from memory)', () => {
  const { inputs, outputs } = example('mrt-const-corr-0.3')
  const model = moveCorrelations(uncorrelated(inputs.vol), inputs.constantCorr)
  const { share } = decompose(model, Float64Array.from(outputs['erc'] as number[]))
  expect(absoluteGap(share!, [0.25, 0.25, 0.25, 0.25])).toBeLessThanOrEqual(1e-12)
})

test('half the volatilities doubled are the risk and the contributions of the whole (Roncalli 2013, table 2.2; read)', () => {
  const { inputs, outputs, tolerance } = example('roncalli-t2.2-vol')
  const half = matrixModel(
    covarianceOf(
      inputs.vol.map((v) => v / 2),
      inputs.corr,
    ),
    3,
  )
  const d = decompose(scaleVolatilities(half, Float64Array.of(2, 2, 2)), Float64Array.from(inputs.weights))
  expect(absoluteGap(100 * d.volatility, outputs['risk']!)).toBeLessThanOrEqual(tolerance['risk']!)
  expect(
    absoluteGap(
      d.contribution.map((c) => 100 * c),
      outputs['contribution']!,
    ),
  ).toBeLessThanOrEqual(tolerance['contribution']!)
})

test('a position whose own volatility is what was scaled has the figures of its new volatility (Jorion, ch. 7; from memory)', () => {
  const { inputs, outputs, tolerance } = example('jorion-2ccy-printed')
  const [first, second] = inputs.vol as [number, number]
  const calmer = uncorrelated([first, second / 3])
  const d = decompose(scaleVolatilities(calmer, Float64Array.of(1, 3)), Float64Array.from(inputs.values))
  expect(absoluteGap(d.volatility, outputs['portfolioStdDev']!)).toBeLessThanOrEqual(
    tolerance['portfolioStdDev']!,
  )
  const percent = d.share!
  expect(absoluteGap(percent, outputs['percent']!)).toBeLessThanOrEqual(tolerance['percent']!)
  // variances add up where nothing correlates: (2m x 5%)^2 + (1m x 12%)^2
  expect(relativeGap(d.variance, 100000 ** 2 + 120000 ** 2)).toBeLessThanOrEqual(1e-14)
})

import { splitChange, type RiskState } from '../../src/core'
import { absoluteGap } from '../closeness'
import { readJson } from './data'

// change.json, computed with numpy 2.4.6: a walk along every order of the causes, full covariance matrices at each step (the route is in its
// `about`). Method: Shorrocks (2013), J. Econ. Inequality 11(1), 99-126; Owen (1977) for drift and trades (both from memory). Tolerance: 1e-14,
// about a hundred roundings of volatilities near 0.1.

interface Plain {
  readonly weights: number[]
  readonly volatilities: number[]
  readonly correlations: number[]
}
interface Case {
  readonly name: string
  readonly from: Plain
  readonly to: Plain
  readonly drifted: number[]
  readonly volatilityFrom: number
  readonly volatilityTo: number
  readonly parts: Record<'positions' | 'volatilities' | 'correlations' | 'drift' | 'trades', number[]>
  readonly totals: Record<string, number>
}
const { cases } = readJson<{ readonly cases: readonly Case[] }>('change.json')

const stateOf = ({ weights, volatilities, correlations }: Plain): RiskState => ({
  weights: Float64Array.from(weights),
  volatilities: Float64Array.from(volatilities),
  correlations: Float64Array.from(correlations),
})

test.each(cases)('parts of the change by position agree with the walk along all orders: $name', (set) => {
  const split = splitChange(stateOf(set.from), stateOf(set.to), Float64Array.from(set.drifted))
  expect(Math.abs(split.from - set.volatilityFrom)).toBeLessThanOrEqual(1e-14)
  expect(Math.abs(split.to - set.volatilityTo)).toBeLessThanOrEqual(1e-14)
  for (const cause of ['positions', 'volatilities', 'correlations', 'drift', 'trades'] as const) {
    expect(absoluteGap(split[cause]!, set.parts[cause])).toBeLessThanOrEqual(1e-14)
    const total = split[cause]!.reduce((sum, part) => sum + part, 0)
    expect(Math.abs(total - set.totals[cause]!)).toBeLessThanOrEqual(1e-14)
  }
})

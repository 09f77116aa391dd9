/**
 * Limits on value at risk as fund rules set them, held by the limits of a book. Sources and status stand with each example in data/published.json; the
 * equivalents at other levels and horizons are derived there, under a normal distribution and the square root of time.
 */
import { matrixModel, tailRisk } from '../../src/core'
import { judgeLimits, type Limit, type LimitState } from '../../src/sheet'
import type { Profile } from '../../src/sheet/profile'
import { readJson } from './data'

interface Example {
  readonly id: string
  readonly inputs: { readonly [name: string]: number }
  readonly outputs: { readonly [name: string]: number | boolean }
  readonly tolerance: { readonly [name: string]: number | 'exact' }
}
const { checks } = readJson<{ readonly checks: readonly Example[] }>('published.json')
const example = (id: string): Example => checks.find((check) => check.id === id)!

/** One position of volatility 1 a day, at a weight that makes the value at risk what it is to be. */
const model = matrixModel(Float64Array.of(1), 1)
const valueAtRisk = (weight: number, confidence: number, periods: number): number =>
  tailRisk(model, Float64Array.of(weight), { method: { kind: 'normal' }, confidence, periods }, null)
    .valueAtRisk

const most = (hard: number): Limit => ({
  scope: 'total',
  header: null,
  name: '',
  measure: 'value at risk',
  soft: null,
  hard,
  cell: null,
  members: null,
})

/** How a book of that value at risk stands against a limit; of a profile no more is looked at. */
function stateOf(figure: number, hard: number): LimitState {
  const tails = () => ({ valueAtRisk: figure, shortfall: null, standardError: null })
  const decomposition = { share: Float64Array.of(1), contribution: Float64Array.of(1), volatility: 1 }
  const profile = { decomposition, groups: [], tails } as unknown as Profile
  return judgeLimits([most(hard)], profile, null)[0]!
}

test('an absolute limit of 20% at 99% and 20 days is as tight as its equivalents at other levels and horizons', () => {
  const { inputs, outputs, tolerance } = example('ucits-var-limits')
  const limit = Number(outputs['absoluteLimit']) / inputs['nav']!
  const weight = limit / valueAtRisk(1, inputs['confidence']!, inputs['days']!)
  const atLimit = (of: number, confidence: number, days: number): LimitState =>
    stateOf(of * valueAtRisk(weight, confidence, days), limit)
  expect(atLimit(1, 0.99, 20)).toMatchObject({ status: 'within' })
  expect(atLimit(1.001, 0.99, 20)).toMatchObject({ status: 'breach' })
  for (const [name, confidence, days] of [
    ['equivalentAt95_20d', 0.95, 20],
    ['equivalentAt99_10d', 0.99, 10],
    ['equivalentAt99_1d', 0.99, 1],
  ] as const) {
    const equivalent = valueAtRisk(weight, confidence, days)
    expect(Math.abs(100 * equivalent - Number(outputs[name]))).toBeLessThanOrEqual(Number(tolerance[name]))
    expect(stateOf(equivalent, equivalent).used).toBe(1)
  }
})

test('a relative limit of twice the reference is half used by a book like the reference', () => {
  const { outputs } = example('ucits-var-limits')
  const reference = 0.085
  const { used, status } = stateOf(reference, Number(outputs['relativeLimitRatio']) * reference)
  expect([used, status]).toEqual([0.5, 'within'])
})

test('a fund may breach the relative limit and keep the absolute one', () => {
  const { inputs, outputs, tolerance } = example('us-derivatives-rule-limits')
  // the rule as cited with the example: 200% of the reference, 20% of net assets
  const relative = stateOf(inputs['fundVaR']!, 2 * inputs['referenceVaR']!)
  const absolute = stateOf(inputs['fundVaR']!, 0.2)
  expect(Math.abs(2 * relative.used! - Number(outputs['relativeRatio']))).toBeLessThanOrEqual(
    Number(tolerance['relativeRatio']),
  )
  expect(relative.status === 'breach').toBe(outputs['relativeBreach'])
  expect(absolute.status === 'breach').toBe(outputs['absoluteBreach'])
})

import {
  decompose,
  groupErrors,
  returnsModel,
  RISK_BAND,
  shareDifferences,
  standAloneErrors,
  standardErrors,
  type Weighting,
} from '../../../src/core'
import { faultOf } from '../../fault-of'
import { relativeGap } from '../../closeness'
import { errorOf, influences, influencesByDefinition } from '../../influences'

// Any numbers will do: expected values come from the plain forms in test/influences.ts, or are worked out by hand.
const dates = 30
const rows = Array.from({ length: dates }, (_, t) => [
  Math.sin(t * t) / 50,
  Math.cos(3 * t * t) / 30 + Math.sin(t * t) / 90,
  Math.sin(7 * t + 1) ** 3 / 20,
])
const block = Float64Array.from(rows.flat())
const weights = Float64Array.of(0.6, 0.5, -0.2)
const exponential: Weighting = { kind: 'exponential', decay: 0.93 }

const modelOf = (weighting?: Weighting) => returnsModel(block, dates, 3, weighting)

const weightings: [string, Weighting, number][] = [
  ['equal weights', { kind: 'sample' }, 0],
  ['equal weights, divisor T', { kind: 'population' }, 0],
  ['exponential weights', exponential, 0],
  ['one lag', { kind: 'population' }, 1],
  ['six lags', { kind: 'sample' }, 6],
  ['as many lags as there can be', { kind: 'population' }, dates - 1],
]

describe.each(weightings)('standard errors with %s', (_name, weighting, lags) => {
  const model = modelOf(weighting)
  // figures with lagged terms have divisor T, whichever the block has
  const correction = lags > 0 ? 1 : model.correction
  const plain = influences(rows, weights, { omega: model.rowWeights, correction, lags })
  const errors = standardErrors(model, weights, lags)
  const expected = (values: readonly (readonly number[])[]) =>
    values.map((u) => errorOf(u, model.rowWeights, lags))

  it('are those of the influence values worked out date by date', () => {
    expect(relativeGap(errors.volatility, errorOf(plain.volatility, model.rowWeights, lags))).toBeLessThan(
      1e-12,
    )
    expect(relativeGap(errors.contribution, expected(plain.contribution))).toBeLessThan(1e-12)
    expect(relativeGap(errors.share!, expected(plain.share))).toBeLessThan(1e-12)
  })

  it('of differences of shares take into account that shares move together', () => {
    const pairs = Int32Array.of(0, 1, 2, 0, 1, 1)
    const difference = (i: number, j: number) => plain.share[i]!.map((u, t) => u - plain.share[j]![t]!)
    const actual = shareDifferences(model, weights, pairs, lags)!
    expect(
      relativeGap(actual, expected([difference(0, 1), difference(2, 0), difference(1, 1)])),
    ).toBeLessThan(1e-12)
    expect(actual[2]).toBe(0)
  })

  it('are the same bits on both forms of the kernel', () => {
    const other = returnsModel(block, dates, 3, weighting, 'plain')
    expect(standardErrors(other, weights, lags)).toEqual(errors)
  })
})

describe.each(weightings.slice(0, 3))('influence values with %s', (_name, weighting) => {
  it('are by how much the figures change as one date gains weight (Hampel 1974, the definition)', () => {
    const { rowWeights, correction } = modelOf(weighting)
    const plain = influences(rows, weights, { omega: rowWeights, correction })
    const defined = influencesByDefinition(rows, Array.from(weights), rowWeights, correction)
    // a central difference with a step of 1e-5: good to about 1e-8
    expect(relativeGap(plain.volatility, defined.volatility)).toBeLessThan(1e-7)
    expect(relativeGap(plain.share.flat(), defined.share.flat())).toBeLessThan(1e-7)
    expect(relativeGap(plain.contribution.flat(), defined.contribution.flat())).toBeLessThan(1e-7)
  })
})

describe('standard errors', () => {
  it('come out as by hand for three dates', () => {
    // z_1 = (.01, -.02, .01), y = (.005, -.005, 0), v = 5e-5 / 3, p_1 = 1.5: v u = (-1, 1, 0) 1.25e-5, se = sqrt(2)/3 x .75
    const model = returnsModel(Float64Array.of(0.01, 0, -0.02, 0.01, 0.01, -0.01), 3, 2)
    const { share, effectiveDates } = standardErrors(model, Float64Array.of(0.5, 0.5))
    expect(relativeGap(share!, [Math.SQRT1_2 / 2, Math.SQRT1_2 / 2])).toBeLessThan(1e-14)
    expect(effectiveDates).toBeCloseTo(3, 13)
  })

  it('count the dates that exponential weights are worth: (1 + d) / (1 - d) of them in a long history', () => {
    const model = returnsModel(
      Float64Array.from({ length: 2000 }, (_, t) => Math.sin(t)),
      2000,
      1,
      {
        kind: 'exponential',
        decay: 0.94,
      },
    )
    // geometric series: sum of omega^2 = (1 - d)^2 / (1 - d^2)
    expect(standardErrors(model, Float64Array.of(1)).effectiveDates).toBeCloseTo(1.94 / 0.06, 9)
  })

  it.each([0, 4])('leave no doubt about the share of an only position, with %d lags', (lags) => {
    for (const only of [0, 1, 2]) {
      const alone = Float64Array.of(0, 0, 0)
      alone[only] = 1.7
      const { volatility, contribution, share } = standardErrors(modelOf(), alone, lags)
      expect(Array.from(share!)).toEqual([0, 0, 0])
      expect(volatility).toBeGreaterThan(0)
      expect(relativeGap(contribution[only]!, volatility)).toBeLessThan(1e-12)
      expect(Array.from(contribution).filter((c) => c === 0)).toHaveLength(2)
    }
  })

  it.each([0, 3])('are 0 for shares of positions that move as one, with %d lags', (lags) => {
    const twins = returnsModel(Float64Array.from(rows.flatMap(([a]) => [a!, 3 * a! + 0.01, a!])), dates, 3)
    const held = Float64Array.of(0.5, 0.1, 0.3)
    expect(Array.from(standardErrors(twins, held, lags).share!)).toEqual([0, 0, 0])
    const pairs = Int32Array.of(0, 1, 1, 2, 0, 2)
    expect(Array.from(shareDifferences(twins, held, pairs, lags)!)).toEqual([0, 0, 0])
  })

  it('are 0 for a volatility that every date confirms: returns of one size', () => {
    const sizes = returnsModel(
      Float64Array.from({ length: 40 }, (_, t) => (t % 2 ? 0.01 : -0.01)),
      40,
      1,
    )
    const { volatility, contribution } = standardErrors(sizes, Float64Array.of(1))
    expect([volatility, contribution[0]]).toEqual([0, 0])
  })

  it('have no shares to speak of where there is no risk', () => {
    const still = returnsModel(Float64Array.from(rows.flatMap(([a]) => [a!, a!])), dates, 2)
    for (const hedged of [Float64Array.of(1, -1), Float64Array.of(0, 0)]) {
      expect(decompose(still, hedged).share).toBeNull()
      expect(standardErrors(still, hedged)).toMatchObject({ volatility: 0, share: null })
      expect(Array.from(standardErrors(still, hedged).contribution)).toEqual([0, 0])
      expect(shareDifferences(still, hedged, Int32Array.of(0, 1))).toBeNull()
    }
  })

  it.each(weightings)(
    'of groups are those of the sums of their members’ influence values, with %s',
    (_name, weighting, lags) => {
      const model = modelOf(weighting)
      const correction = lags > 0 ? 1 : model.correction
      const omega = model.rowWeights
      const plain = influences(rows, weights, { omega, correction, lags })
      const together = (of: number[][]) => of[0]!.map((u, t) => u + of[2]![t]!)
      const errors = groupErrors(model, weights, Int32Array.of(1, 0, 1), 2, lags)
      const expected = {
        share: [plain.share[1]!, together(plain.share)],
        contribution: [plain.contribution[1]!, together(plain.contribution)],
      }
      // 1e-9: two ways of adding the same doubles, which cancel more the more lags there are
      for (const figure of ['share', 'contribution'] as const) {
        const oracle = expected[figure].map((u) => errorOf(u, omega, lags))
        expect(relativeGap(errors[figure]!, oracle)).toBeLessThan(1e-9)
      }
      expect(errors.volatility / errorOf(plain.volatility, omega, lags)).toBeCloseTo(1, 9)
    },
  )

  it.each(weightings)(
    'of stand-alone risks are those of the volatility of each position alone, with %s',
    (_name, weighting, lags) => {
      const model = modelOf(weighting)
      const alone = Array.from(weights, (w, i) => {
        const omega = model.rowWeights
        const correction = lags > 0 ? 1 : model.correction
        const only = weights.map((_w, k) => (k === i ? w : 0))
        return errorOf(influences(rows, only, { omega, correction, lags }).volatility, omega, lags)
      })
      // 1e-9: two ways of adding the same doubles, which cancel more the more lags there are
      expect(relativeGap(standAloneErrors(model, weights, lags), alone)).toBeLessThan(1e-9)
    },
  )

  it('of a group of everything are that of the volatility, and a certain share; of an empty group they are 0', () => {
    const { contribution, share } = groupErrors(modelOf(), weights, Int32Array.of(1, 1, 1), 2)
    expect(contribution[1]! / standardErrors(modelOf(), weights).volatility).toBeCloseTo(1, 12)
    expect(share![1]).toBe(0)
    expect([contribution[0], share![0]]).toEqual([0, 0])
  })

  it.each([2 ** 300, 2 ** -300])('of shares hold at any size of returns, such as times %d', (factor) => {
    const { share, volatility } = standardErrors(modelOf(), weights)
    const scaled = returnsModel(
      block.map((x) => x * factor),
      dates,
      3,
    )
    // powers of two: no digit changes
    const errors = standardErrors(scaled, weights)
    expect(errors.share).toEqual(share)
    expect(errors.volatility).toBe(volatility * factor)
  })

  it('make bands of 95%: the 97.5% quantile of the normal distribution', () => {
    // 1.959963984540054: computed with scipy 1.10.1, norm.ppf(0.975)
    expect(Math.abs(RISK_BAND - 1.959963984540054)).toBeLessThan(5e-7)
  })
})

describe('standard errors refuse', () => {
  it.each([-1, 0.5, dates, NaN])('%d lags', (lags) => {
    expect(faultOf(() => standardErrors(modelOf(), weights, lags))).toMatchObject({
      code: 'out-of-range',
      found: `lags: ${lags}`,
      where: { argument: 'lags' },
    })
  })

  it('lags where dates weigh exponentially', () => {
    expect(faultOf(() => standardErrors(modelOf(exponential), weights, 1))).toMatchObject({
      code: 'unknown-choice',
      where: { argument: 'lags' },
    })
  })

  it('a pair of one, and a pair with a stranger', () => {
    expect(faultOf(() => shareDifferences(modelOf(), weights, Int32Array.of(0, 1, 2)))).toMatchObject({
      code: 'shape',
      found: 'pairs: 3 positions',
    })
    expect(faultOf(() => shareDifferences(modelOf(), weights, Int32Array.of(0, 1, 2, 3)))).toMatchObject({
      code: 'out-of-range',
      found: 'pairs: position 3',
      where: { argument: 'pairs', row: 1, column: 1 },
    })
  })

  it('a position in a group that is not there', () => {
    expect(faultOf(() => groupErrors(modelOf(), weights, Int32Array.of(0, 2, 1), 2))).toMatchObject({
      code: 'out-of-range',
      found: 'groups: number 2',
      where: { argument: 'groups', row: 1 },
    })
    expect(faultOf(() => groupErrors(modelOf(), weights, Int32Array.of(0, 0), 1)).code).toBe('shape')
  })

  it('weights that do not fit and figures too large', () => {
    expect(faultOf(() => standardErrors(modelOf(), Float64Array.of(1))).code).toBe('shape')
    const huge = returnsModel(Float64Array.of(1e200, -1e200), 2, 1)
    expect(faultOf(() => standardErrors(huge, Float64Array.of(1))).code).toBe('out-of-range')
  })
})

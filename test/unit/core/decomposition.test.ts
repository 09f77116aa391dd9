import {
  annualise,
  decompose,
  groupDecomposition,
  logReturns,
  matrixModel,
  returnsModel,
  simpleReturns,
  type Decomposition,
} from '../../../src/core'
import { absoluteGap, relativeGap } from '../../closeness'
import { textbookCovariance, textbookDecomposition } from '../../textbook'

// Any numbers will do: the expected figures come from the textbook forms in test/textbook.ts, or are worked out by hand.
const rows = Array.from({ length: 40 }, (_, t) =>
  Array.from({ length: 7 }, (_, i) => Math.sin(3 * t + i * i) / (20 + i) + Math.cos(t * t) / 50),
)
const returns = Float64Array.from(rows.flat())
const weights = [0.3, -0.1, 0.25, 0.2, 0.15, 0.4, -0.2]

const figures = [
  'variance',
  'volatility',
  'standAlone',
  'marginal',
  'contribution',
  'share',
  'beta',
  'correlation',
  'diversificationRatio',
  'diversificationBenefit',
  'effectiveNumber',
] as const

describe('the decomposition', () => {
  const expected = textbookDecomposition(textbookCovariance(rows), weights)

  it.each(figures)('of a block of returns agrees with the textbook in %s', (figure) => {
    const d = decompose(returnsModel(returns, 40, 7), Float64Array.from(weights))
    expect(relativeGap(d[figure]!, expected[figure])).toBeLessThan(1e-13)
  })

  it.each(figures)('of a matrix agrees with the textbook in %s', (figure) => {
    const C = Float64Array.from(textbookCovariance(rows).flat())
    const d = decompose(matrixModel(C, 7), Float64Array.from(weights))
    expect(relativeGap(d[figure]!, expected[figure])).toBeLessThan(1e-13)
  })

  it('shows its sum and the difference from the volatility', () => {
    const d = decompose(returnsModel(returns, 40, 7), Float64Array.from(weights))
    const sum = d.contribution.reduce((a, c) => a + c, 0)
    expect(d.sumOfContributions).toBe(sum)
    expect(d.difference).toBe(sum - d.volatility)
    expect(Math.abs(d.difference)).toBeLessThan(1e-15)
  })

  it('keeps the weights as they were given, and a copy of them', () => {
    const given = Float64Array.from(weights)
    const d = decompose(returnsModel(returns, 40, 7), given)
    given.fill(0)
    expect(Array.from(d.weights)).toEqual(weights)
  })

  it('gives a riskless position no contribution, no share and no correlation', () => {
    const d = decompose(matrixModel(Float64Array.of(0.04, 0, 0, 0), 2), Float64Array.of(0.5, 0.5))
    expect(Array.from(d.contribution)).toEqual([0.1, 0])
    expect(Array.from(d.share!)).toEqual([1, 0])
    expect(Array.from(d.correlation!)).toEqual([1, NaN])
    expect(d.effectiveNumber).toBe(1)
  })
})

describe('a portfolio without risk', () => {
  const nothing = {
    volatility: 0,
    variance: 0,
    marginal: null,
    share: null,
    beta: null,
    correlation: null,
    diversificationRatio: null,
    effectiveNumber: null,
    sumOfContributions: 0,
    difference: 0,
  }

  it.each<[string, Decomposition, number]>([
    ['no weights', decompose(returnsModel(returns, 40, 7), new Float64Array(7)), 0],
    [
      'returns that never change',
      decompose(returnsModel(Float64Array.of(0.1, 0.2, 0.1, 0.2, 0.1, 0.2), 3, 2), Float64Array.of(1, 1)),
      0,
    ],
    [
      'a position held against itself, to rounding',
      // one series three times; 0.1 + 0.2 - 0.3 is 5.6e-17 in doubles; gross is 0.6 x its deviation 0.01
      decompose(
        returnsModel(Float64Array.from([0.01, 0.02, 0.03].flatMap((r) => [r, r, r])), 3, 3),
        Float64Array.of(0.1, 0.2, -0.3),
      ),
      0.006,
    ],
    [
      'a perfect hedge in a matrix',
      decompose(matrixModel(Float64Array.of(0.04, 0.02, 0.02, 0.01), 2), Float64Array.of(0.1, -0.2)),
      0.04,
    ],
  ])('has contributions of 0, and nothing where risk would divide: %s', (_name, d, benefit) => {
    expect(d).toMatchObject(nothing)
    expect(Array.from(d.contribution).every((c) => c === 0)).toBe(true)
    expect(d.diversificationBenefit).toBeCloseTo(benefit, 15)
  })

  it('is not one with little risk: a hedge good to six digits still splits', () => {
    const r = [0.01, 0.02, -0.03, 0.005]
    const nearly = Float64Array.from(r.flatMap((x, t) => [x, x * (1 + 1e-6 * (t % 2))]))
    const d = decompose(returnsModel(nearly, 4, 2), Float64Array.of(1, -1))
    expect(d.volatility).toBeGreaterThan(0)
    expect(
      absoluteGap(
        d.share!.reduce((a, p) => a + p, 0),
        1,
      ),
    ).toBeLessThan(1e-9)
  })
})

describe('annualising', () => {
  const d = decompose(returnsModel(returns, 40, 7), Float64Array.from(weights))

  it('multiplies risk by the square root of the periods, variance by the periods, and leaves ratios alone', () => {
    const a = annualise(d, 52)
    const root = Math.sqrt(52)
    for (const figure of [
      'volatility',
      'standAlone',
      'marginal',
      'contribution',
      'diversificationBenefit',
    ] as const) {
      const before = d[figure]!
      expect(
        relativeGap(a[figure]!, typeof before === 'number' ? before * root : before.map((x) => x * root)),
      ).toBe(0)
    }
    expect(a.variance).toBe(d.variance * 52)
    for (const figure of [
      'share',
      'beta',
      'correlation',
      'diversificationRatio',
      'effectiveNumber',
    ] as const) {
      expect(a[figure]).toBe(d[figure])
    }
  })

  it('remembers the scale, so that it can be changed again and led back', () => {
    const back = annualise(annualise(d, 252), 1)
    expect(relativeGap(back.contribution, d.contribution)).toBeLessThan(1e-15)
    expect(annualise(annualise(d, 12), 252).volatility).toBeCloseTo(annualise(d, 252).volatility, 15)
  })

  it('leaves a portfolio without risk without shares', () => {
    const none = annualise(decompose(returnsModel(returns, 40, 7), new Float64Array(7)), 252)
    expect(none.share).toBeNull()
    expect(none.marginal).toBeNull()
  })
})

describe('groups', () => {
  const model = returnsModel(returns, 40, 7)
  const d = annualise(decompose(model, Float64Array.from(weights)), 252)
  const groupOf = Int32Array.of(0, 2, 0, 2, 2, 0, 2)
  const g = groupDecomposition(model, d, groupOf, 3)

  it('add up their members', () => {
    expect(relativeGap(g.weight, [0.3 + 0.25 + 0.4, 0, -0.1 + 0.2 + 0.15 - 0.2])).toBeLessThan(1e-15)
    const of = (group: number, values: Float64Array) =>
      values.reduce((a, x, i) => (groupOf[i] === group ? a + x : a), 0)
    expect(
      relativeGap(
        g.contribution,
        [0, 1, 2].map((k) => of(k, d.contribution)),
      ),
    ).toBeLessThan(1e-14)
    expect(
      relativeGap(
        g.share!,
        [0, 1, 2].map((k) => of(k, d.share!)),
      ),
    ).toBeLessThan(1e-14)
  })

  it('have the volatility of the sub-portfolio as their stand-alone risk, scaled as the whole is', () => {
    const sub = textbookDecomposition(
      textbookCovariance(rows),
      weights.map((w, i) => (groupOf[i] === 0 ? w : 0)),
    )
    expect(relativeGap(g.standAlone[0]!, sub.volatility * Math.sqrt(252))).toBeLessThan(1e-13)
  })

  it('may be empty', () => {
    expect([g.weight[1], g.standAlone[1], g.contribution[1], g.share![1]]).toEqual([0, 0, 0, 0])
  })
})

describe('returns from prices', () => {
  const prices = Float64Array.of(100, 50, 110, 45, 99, 54)

  it('are relative changes, or their logarithms, one row fewer than prices', () => {
    // by hand: 10/100, -5/50, -11/110, 9/45
    expect(relativeGap(simpleReturns(prices, 3, 2), [0.1, -0.1, -0.1, 0.2])).toBeLessThan(1e-15)
    expect(relativeGap(logReturns(prices, 3, 2), [1.1, 0.9, 0.9, 1.2].map(Math.log))).toBeLessThan(1e-15)
  })

  it('keep the digits of changes far below the price', () => {
    const small = Float64Array.of(1e6, 1e6 + 2 ** -20)
    // exact: the change is a power of two over 1e6
    expect(simpleReturns(small, 2, 1)[0]).toBe(2 ** -20 / 1e6)
    // ln(1 + x) = x to the digits of a double at this size
    expect(relativeGap(logReturns(small, 2, 1), 2 ** -20 / 1e6)).toBeLessThan(1e-12)
  })
})

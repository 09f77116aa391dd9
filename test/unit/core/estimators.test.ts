import { EigenvalueDecomposition, Matrix, solve } from 'ml-matrix'
import {
  conditionOf,
  correlation,
  decompose,
  estimateModel,
  factorModel,
  type Fault,
  matrixModel,
  returnsModel,
  shrinkageOf,
  type Estimator,
  type RiskModel,
} from '../../../src/core'
import { faultOf } from '../../fault-of'
import { absoluteGap, relativeGap } from '../../closeness'
import { textbookLagged, textbookShrinkage } from '../../textbook'

// Any numbers will do where nothing else is said: the expected values are worked out by the textbook forms in test/textbook.ts, or by hand.
const pattern = (count: number, seed = 1) => {
  let state = seed
  return Array.from({ length: count }, () => (state = (state * 16807) % 2147483647) / 2147483647 - 0.5)
}

/** Columns of unequal size that have something in common. */
const blockOf = (dates: number, size: number) => {
  const own = pattern(dates * size)
  const common = pattern(dates, 7)
  return common.map((f, t) =>
    Array.from({ length: size }, (_, i) => 0.02 * f + 0.01 * (1 + (i % 3)) * own[t * size + i]! + 0.001 * i),
  )
}

const flat = (rows: readonly (readonly number[])[]) => Float64Array.from(rows.flat())
const estimated = (rows: readonly (readonly number[])[], estimator: Estimator) =>
  estimateModel(flat(rows), rows.length, rows[0]!.length, estimator)

/** With a column that never changes put in before the given one. */
const withRiskless = (rows: readonly (readonly number[])[], before: number) =>
  rows.map((row) => [...row.slice(0, before), 0.1, ...row.slice(before)])

function toEnd<Result>(steps: Generator<number, Result>): { result: Result; shares: number[] } {
  const shares: number[] = []
  for (;;) {
    const step = steps.next()
    if (step.done) return { result: step.value, shares }
    shares.push(step.value)
  }
}

const conditionIn = (model: RiskModel) => toEnd(conditionOf(model)).result

/** The operator's own answers agree with each other. */
function expectConsistent(model: RiskModel) {
  const { size } = model
  const matrix = model.matrix()
  const weights = Float64Array.from(pattern(size, 3))
  const { marginals, variance } = model.apply(weights)
  const product = weights.map((_, i) => weights.reduce((sum, w, j) => sum + matrix[i * size + j]! * w, 0))
  expect(relativeGap(marginals, product)).toBeLessThan(1e-13)
  expect(
    relativeGap(
      variance,
      product.reduce((sum, c, i) => sum + c * weights[i]!, 0),
    ),
  ).toBeLessThan(1e-13)
  expect(
    relativeGap(
      model.variances(),
      model.variances().map((_, i) => matrix[i * (size + 1)]!),
    ),
  ).toBeLessThan(1e-14)
  for (let i = 0; i < size; i++)
    for (let j = 0; j < i; j++) expect(matrix[i * size + j]).toBe(matrix[j * size + i])
  // room that is given is used
  const room = new Float64Array(size)
  expect(model.apply(weights, room).marginals).toBe(room)
  expect(room).toEqual(marginals)
}

const targets = ['identity', 'oas', 'correlation'] as const

describe.each(targets)('shrinkage toward “%s”', (target) => {
  const estimator = { kind: 'shrinkage', target } as const

  it.each([
    [40, 3],
    [41, 9],
    [10, 10],
    [9, 10],
    [7, 25],
    [2, 4],
  ])('is that of the double loops for %i dates and %i positions', (dates, size) => {
    const rows = blockOf(dates, size)
    const model = estimated(rows, estimator)
    const expected = textbookShrinkage(rows, target)
    expect(absoluteGap(model.shrinkage!.intensity, expected.intensity)).toBeLessThan(1e-12)
    expect(relativeGap(model.matrix(), expected.C.flat())).toBeLessThan(1e-12)
    expectConsistent(model)
  })

  it.each([12, 4])('leaves a column that never changes outside and riskless (%i dates)', (dates) => {
    const rows = blockOf(dates, 5)
    const alone = estimated(rows, estimator)
    const model = estimated(withRiskless(rows, 2), estimator)
    expect(model.shrinkage).toEqual({ ...alone.shrinkage, excluded: 1 })
    expect(model.variances()[2]).toBe(0)
    const { marginals, variance } = model.apply(Float64Array.of(1, -2, 7, 0.5, 1, -1))
    expect(marginals[2]).toBe(0)
    expect(relativeGap(variance, alone.apply(Float64Array.of(1, -2, 0.5, 1, -1)).variance)).toBeLessThan(
      1e-14,
    )
    expectConsistent(model)
  })

  it('makes no difference to a single position, and says so by an intensity of 0', () => {
    const model = estimated(blockOf(12, 1), estimator)
    expect(model.shrinkage!.intensity).toBe(0)
    expect(model.variances()).toEqual(estimated(blockOf(12, 1), { kind: 'population' }).variances())
  })

  it('finds nothing to shrink where nothing moves', () => {
    const model = estimated(
      [
        [1, 2],
        [1, 2],
      ],
      estimator,
    )
    expect(model.shrinkage).toMatchObject({ intensity: 0, moving: 0, excluded: 2, volatilityRatio: 1 })
    expect(model.apply(Float64Array.of(1, 1)).variance).toBe(0)
    expect(decompose(model, Float64Array.of(1, 1)).share).toBeNull()
  })

  it('tells how far it is, in rising shares, and can be left', () => {
    const steps = shrinkageOf(returnsModel(flat(blockOf(60, 30)), 60, 30), target)
    const { shares } = toEnd(steps)
    expect(shares.length).toBeGreaterThan(10)
    shares.forEach((share, k) => {
      expect(share).toBeGreaterThanOrEqual(shares[k - 1] ?? 0)
      expect(share).toBeLessThan(1)
    })
    const left = shrinkageOf(returnsModel(flat(blockOf(60, 30)), 60, 30), target)
    left.next()
    expect(left.return(undefined as never).done).toBe(true)
  })

  it('does not depend on the divisor of the model it is asked of', () => {
    const block = flat(blockOf(30, 6))
    const of = (kind: 'sample' | 'population') =>
      toEnd(shrinkageOf(returnsModel(block, 30, 6, { kind }), target)).result.intensity
    expect(relativeGap(of('sample'), of('population'))).toBeLessThan(1e-13)
  })

  it('takes an intensity that was computed before', () => {
    const rows = blockOf(20, 4)
    const { shrinkage } = estimated(rows, estimator)
    const again = estimateModel(flat(rows), 20, 4, estimator, shrinkage!)
    expect(again.shrinkage).toBe(shrinkage)
    expect(again.matrix()).toEqual(estimated(rows, estimator).matrix())
  })
})

describe('shrinkage', () => {
  it('tells how far volatilities lie apart', () => {
    // by hand: the second column is minus four times the first
    const { shrinkage } = estimated(
      [
        [1, -4],
        [3, -12],
        [-1, 4],
      ],
      { kind: 'shrinkage', target: 'identity' },
    )
    expect(shrinkage!.volatilityRatio).toBeCloseTo(4, 14)
    expect(shrinkage!.meanCorrelation).toBeCloseTo(-1, 14)
  })

  it('toward one correlation is 0 where all pairs are correlated alike already', () => {
    const rows = pattern(30).map((x) => [x, 2 * x, 3 * x])
    const { shrinkage } = estimated(rows, { kind: 'shrinkage', target: 'correlation' })
    expect(shrinkage!.intensity).toBe(0)
    expect(shrinkage!.meanCorrelation).toBeCloseTo(1, 14)
  })

  it('keeps the model of the returns themselves at hand', () => {
    const rows = blockOf(20, 4)
    const model = estimated(rows, { kind: 'shrinkage', target: 'oas' })
    expect(model.returns.weighting).toEqual({ kind: 'population' })
    expect(model.returns.matrix()).toEqual(returnsModel(flat(rows), 20, 4, { kind: 'population' }).matrix())
  })
})

describe('lagged terms', () => {
  it.each([
    [30, 4, 1],
    [30, 4, 3],
    [30, 4, 10],
    [12, 20, 5],
    [11, 2, 10],
    [2, 3, 1],
  ])('are those of the double loops for %i dates, %i positions and %i lags', (dates, size, lags) => {
    const rows = blockOf(dates, size)
    const model = estimated(rows, { kind: 'lagged', lags })
    expect(relativeGap(model.matrix(), textbookLagged(rows, lags).flat())).toBeLessThan(1e-13)
    expect(model.shrinkage).toBeNull()
    expectConsistent(model)
  })

  it('leave a column that never changes riskless', () => {
    const model = estimated(withRiskless(blockOf(12, 3), 1), { kind: 'lagged', lags: 2 })
    expect(model.variances()[1]).toBe(0)
    expect(model.apply(Float64Array.of(1, 5, 1, 1)).marginals[1]).toBe(0)
  })

  it('find no risk in a book that is hedged date by date, also where lags make volatilities small', () => {
    // returns that alternate: lagged terms take most of their variance away
    const rows = pattern(200).map((x, t) => {
      const r = (t % 2 === 0 ? 0.1 : -0.1) + 1e-4 * x
      return [r, 0.7 * r, 1.7 * r]
    })
    const model = estimated(rows, { kind: 'lagged', lags: 1 })
    expect(model.variances()[0]! / model.returns.variances()[0]!).toBeLessThan(0.01)
    expect(decompose(model, Float64Array.of(1, 1, -1)).volatility).toBe(0)
    // proportions whose products round this way and that
    for (let k = 1; k < 40; k++) {
      const a = 0.0371 * k
      const hedged = rows.map(([r]) => [r!, a * r!, (1 + a) * r!])
      const { volatility } = decompose(
        estimated(hedged, { kind: 'lagged', lags: 1 }),
        Float64Array.of(1, 1, -1),
      )
      expect([k, volatility]).toEqual([k, 0])
    }
  })
})

describe('the plain estimators', () => {
  it.each([{ kind: 'sample' }, { kind: 'population' }, { kind: 'exponential', decay: 0.9 }] as const)(
    'are the models of returns: %o',
    (estimator) => {
      const rows = blockOf(20, 3)
      const model = estimated(rows, estimator)
      expect(model.matrix()).toEqual(returnsModel(flat(rows), 20, 3, estimator).matrix())
      expect(model.estimator).toBe(estimator)
      expect(model.returns.weighting).toBe(estimator)
    },
  )

  it('differ in their divisor: T-1 or T', () => {
    // variance of 1 and 3: 2 with divisor 1, 1 with divisor 2
    expect(estimated([[1], [3]], { kind: 'sample' }).variances()[0]).toBe(2)
    expect(estimated([[1], [3]], { kind: 'population' }).variances()[0]).toBe(1)
  })
})

describe('the condition number', () => {
  it('is the quotient of the extreme eigenvalues', () => {
    // eigenvalues of [[2, 1], [1, 2]] are 1 and 3
    const c = conditionIn(matrixModel(Float64Array.of(2, 1, 1, 2), 2))
    expect(relativeGap([c.condition!, c.smallest, c.largest!], [3, 1, 3])).toBeLessThan(1e-14)
    expect(c).toMatchObject({ rank: 2, moving: 2 })
  })

  it('is exact for a diagonal however far its entries lie apart', () => {
    const c = conditionIn(matrixModel(Float64Array.of(4, 0, 0, 0, 1e-12, 0, 0, 0, 1), 3))
    expect(relativeGap(c.condition!, 4e12)).toBeLessThan(1e-9)
  })

  it.each([3, 4, 5, 17, 60])('agrees with a library that finds all eigenvalues, for %i positions', (size) => {
    const model = returnsModel(flat(blockOf(80, size)), 80, size)
    const all = new EigenvalueDecomposition(Matrix.from1DArray(size, size, model.matrix())).realEigenvalues
    const c = conditionIn(model)
    expect(relativeGap(c.largest!, Math.max(...all))).toBeLessThan(1e-13)
    // eigenvalues are good to rounding of the largest
    expect(Math.abs(c.smallest - Math.min(...all))).toBeLessThan(1e-14 * c.largest!)
    expect(c.rank).toBe(size)
  })

  it('is infinite where dates are too few, without a question to the model', () => {
    const model = estimated(blockOf(5, 5), { kind: 'sample' })
    const silent = {
      ...model,
      apply: () => {
        throw new Error('asked')
      },
    }
    expect(conditionIn(silent)).toEqual({
      condition: Infinity,
      smallest: 0,
      largest: null,
      rank: null,
      moving: 5,
    })
    const lagged = estimated(blockOf(5, 5), { kind: 'lagged', lags: 1 })
    expect(conditionIn(lagged).largest).toBeNull()
    expect(conditionIn(returnsModel(flat(blockOf(5, 5)), 5, 5)).condition).toBe(Infinity)
    // one date more is enough
    expect(conditionIn(estimated(blockOf(6, 5), { kind: 'sample' })).rank).toBe(5)
  })

  it('is finite for shrunk returns of few dates: the smallest eigenvalue is the share of the mean variance', () => {
    const model = estimated(blockOf(5, 9), { kind: 'shrinkage', target: 'identity' })
    const { intensity, meanVariance } = model.shrinkage!
    expect(intensity).toBeGreaterThan(0)
    expect(relativeGap(conditionIn(model).smallest, intensity * meanVariance)).toBeLessThan(1e-12)
  })

  it('leaves riskless positions out', () => {
    const rows = blockOf(30, 4)
    const alone = conditionIn(estimated(rows, { kind: 'sample' }))
    const c = conditionIn(estimated(withRiskless(rows, 1), { kind: 'sample' }))
    expect(c.moving).toBe(4)
    expect(relativeGap(c.condition!, alone.condition!)).toBeLessThan(1e-12)
    expect(conditionIn(matrixModel(new Float64Array(4), 2)).condition).toBeNull()
  })

  it('is infinite for two positions that are one, and counts what is left', () => {
    const rows = blockOf(30, 4).map((row) => [...row, row[1]!])
    const c = conditionIn(estimated(rows, { kind: 'sample' }))
    expect(c).toMatchObject({ condition: Infinity, smallest: 0, rank: 4, moving: 5 })
  })

  it('is infinite for a matrix with a negative eigenvalue, which is shown', () => {
    // eigenvalues 0.09 and -0.01; no unit weight meets the negative one
    const c = conditionIn(matrixModel(Float64Array.of(0.04, 0.05, 0.05, 0.04), 2))
    expect(c.condition).toBe(Infinity)
    expect(relativeGap(c.smallest, -0.01)).toBeLessThan(1e-13)
    expect(c.rank).toBe(1)
  })

  it('is 1 for a single position, and tells how far it is', () => {
    expect(conditionIn(matrixModel(Float64Array.of(0.04), 1)).condition).toBe(1)
    const { shares } = toEnd(conditionOf(returnsModel(flat(blockOf(60, 20)), 60, 20)))
    shares.forEach((share, k) => expect(share).toBeGreaterThanOrEqual(shares[k - 1] ?? 0))
    expect(shares.at(-1)).toBeLessThanOrEqual(1)
  })
})

describe('a factor model', () => {
  const T = 40
  const factorRows = blockOf(T, 3).map((row, t) => [
    row[0]! + 0.01,
    row[1]! * 2,
    0.3 * row[2]! + pattern(T, 5)[t]! * 0.02,
  ])
  const rows = blockOf(T, 6).map((row, t) => row.map((x, i) => x + (1 - 0.3 * i) * factorRows[t]![i % 3]!))
  const model = factorModel(flat(rows), T, 6, flat(factorRows), 3)

  it('has the coefficients of the normal equations', () => {
    const design = new Matrix(factorRows.map((row) => [1, ...row]))
    const normal = design.transpose().mmul(design)
    const B = solve(normal, design.transpose().mmul(new Matrix(rows)))
    expect(relativeGap(model.intercepts, B.getRow(0))).toBeLessThan(1e-11)
    for (let j = 0; j < 3; j++) {
      const slopes = rows[0]!.map((_, i) => model.exposures[i * 3 + j]!)
      expect(relativeGap(slopes, B.getRow(j + 1))).toBeLessThan(1e-11)
    }
  })

  it('is B F B´ with the specific variances on the diagonal', () => {
    const B = Matrix.from1DArray(6, 3, model.exposures)
    const C = B.mmul(Matrix.from1DArray(3, 3, model.factorCovariance)).mmul(B.transpose())
    model.specificVariances.forEach((d, i) => C.set(i, i, C.get(i, i) + d))
    expect(relativeGap(model.matrix(), C.to1DArray())).toBeLessThan(1e-13)
    expect(relativeGap(model.factorCovariance, returnsModel(flat(factorRows), T, 3).matrix())).toBeLessThan(
      1e-13,
    )
    expectConsistent(model)
  })

  it('splits the volatility into factors and what is specific, and parts add up', () => {
    const weights = Float64Array.of(0.5, -0.3, 0.4, 0.2, -0.1, 0.3)
    const split = model.split(weights)
    const { volatility } = decompose(model, weights)
    expect(split.volatility).toBe(volatility)
    const parts = [...split.systematic, ...split.specific]
    expect(
      relativeGap(
        parts.reduce((a, x) => a + x, 0),
        volatility,
      ),
    ).toBeLessThan(1e-13)
    split.exposures.forEach((x, j) =>
      expect(x).toBeCloseTo(
        weights.reduce((a, w, i) => a + w * model.exposures[i * 3 + j]!, 0),
        14,
      ),
    )
    split.specific.forEach((s, i) =>
      expect(s).toBeCloseTo((weights[i]! ** 2 * model.specificVariances[i]!) / volatility, 16),
    )
  })

  it('explains a riskless position by nothing', () => {
    const riskless = factorModel(flat(withRiskless(rows, 1)), T, 7, flat(factorRows), 3)
    expect(Array.from(riskless.exposures.subarray(3, 6))).toEqual([0, 0, 0])
    expect(riskless.intercepts[1]).toBe(0.1)
    expect(riskless.variances()[1]).toBe(0)
    expect(riskless.rSquared[1]).toBeNaN()
    expect(riskless.adjustedRSquared[1]).toBeNaN()
    expect(riskless.split(Float64Array.of(0, 3, 0, 0, 0, 0, 0))).toMatchObject({
      volatility: 0,
      systematic: new Float64Array(3),
      specific: new Float64Array(7),
    })
  })

  it('explains a position that is a factor wholly', () => {
    const one = factorModel(flat(factorRows.map((row) => [row[0]! - row[1]!])), T, 1, flat(factorRows), 3)
    expect(relativeGap(one.exposures, [1, -1, 0])).toBeLessThan(1e-13)
    expect(one.rSquared[0]).toBeCloseTo(1, 14)
  })

  it('keeps the returns themselves at hand', () => {
    expect(model.returns.matrix()).toEqual(returnsModel(flat(rows), T, 6).matrix())
  })

  it('has correlations like any model', () => {
    expect(correlation(model)[0]).toBe(1)
  })
})

describe('a fault is raised for', () => {
  const rows = blockOf(12, 3)
  const factors = (columns: (t: number) => number[]) => flat(rows.map((_, t) => columns(t)))
  const twoFactors = (t: number) => [Math.sin(t), Math.cos(t * t)]

  it.each<[string, () => unknown, Partial<Fault>]>([
    ...[0, 11, 1.5, -1, NaN].map((lags): [string, () => unknown, Partial<Fault>] => [
      `${lags} lags`,
      () => estimated(rows, { kind: 'lagged', lags }),
      { code: 'out-of-range', found: `${lags} lags for 12 dates`, where: { argument: 'lags' } },
    ]),
    [
      'as many lags as dates',
      () => estimated(rows.slice(0, 4), { kind: 'lagged', lags: 4 }),
      { code: 'out-of-range', found: '4 lags for 4 dates' },
    ],
    [
      'an intensity toward another target',
      () => {
        const { shrinkage } = estimated(rows, { kind: 'shrinkage', target: 'oas' })
        estimateModel(flat(rows), 12, 3, { kind: 'shrinkage', target: 'identity' }, shrinkage!)
      },
      { code: 'unknown-choice', found: 'a shrinkage toward “oas”' },
    ],
    [
      'an intensity where nothing is shrunk',
      () => {
        const { shrinkage } = estimated(rows, { kind: 'shrinkage', target: 'oas' })
        estimateModel(flat(rows), 12, 3, { kind: 'sample' }, shrinkage!)
      },
      { code: 'unknown-choice' },
    ],
    [
      'an intensity of another block',
      () => {
        const { shrinkage } = estimated(blockOf(12, 4), { kind: 'shrinkage', target: 'oas' })
        estimateModel(flat(rows), 12, 3, { kind: 'shrinkage', target: 'oas' }, shrinkage!)
      },
      { code: 'shape', found: 'shrinkage of 4 positions' },
    ],
    [
      'shrinkage of dates that weigh differently',
      () =>
        shrinkageOf(returnsModel(flat(rows), 12, 3, { kind: 'exponential', decay: 0.9 }), 'identity').next(),
      { code: 'unknown-choice' },
    ],
    [
      'a factor that never changes',
      () =>
        factorModel(
          flat(rows),
          12,
          3,
          factors((t) => [Math.sin(t), 0.1]),
          2,
        ),
      {
        code: 'collinear',
        found: 'factors: column 2 never changes',
        where: { argument: 'factors', column: 1 },
      },
    ],
    [
      'a factor that others make up',
      () =>
        factorModel(
          flat(rows),
          12,
          3,
          factors((t) => [...twoFactors(t), 0.3 * Math.sin(t) - 2 * Math.cos(t * t) + 5]),
          3,
        ),
      {
        code: 'collinear',
        found: 'factors: column 3 is made up of the columns before it',
        where: { argument: 'factors', column: 2 },
      },
    ],
    [
      'the same factor twice',
      () =>
        factorModel(
          flat(rows),
          12,
          3,
          factors((t) => [Math.sin(t), Math.sin(t), Math.cos(t)]),
          3,
        ),
      { code: 'collinear', where: { argument: 'factors', column: 1 } },
    ],
    [
      'no more dates than coefficients',
      () => factorModel(flat(rows.slice(0, 3)), 3, 3, factors(twoFactors).subarray(0, 6), 2),
      { code: 'too-few', message: 'returns: 3 dates for 2 factors; at least 4 dates are needed' },
    ],
    [
      'a factor return that is not a number',
      () =>
        factorModel(
          flat(rows),
          12,
          3,
          factors((t) => [t === 4 ? NaN : t]),
          1,
        ),
      { code: 'not-a-number', where: { argument: 'factors', row: 4, column: 0 } },
    ],
    [
      'factors of other dates',
      () => factorModel(flat(rows), 12, 3, factors(twoFactors).subarray(2), 2),
      { code: 'shape', where: { argument: 'factors' } },
    ],
    [
      'weights that do not fit a factor model',
      () => factorModel(flat(rows), 12, 3, factors(twoFactors), 2).split(Float64Array.of(1)),
      { code: 'shape', where: { argument: 'weights' } },
    ],
  ])('%s', (_name, work, expected) => {
    expect(faultOf(work)).toMatchObject(expected)
  })
})

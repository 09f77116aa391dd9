import fc from 'fast-check'
import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import {
  decompose,
  estimateModel,
  factorModel,
  moveCorrelations,
  replay,
  returnsModel,
  scaleVolatilities,
  worstStretch,
  type RiskModel,
} from '../../src/core'
import { relativeGap } from '../closeness'

// Invariants of bent covariances and of replayed stretches. Tolerances are roundings: of the sum of stand-alone risks, squared for a variance.

/** In steps of a millionth of the largest. */
const real = (from: number, to: number) =>
  fc.integer({ min: Math.round(from * 1e6), max: Math.round(to * 1e6) }).map((k) => k / 1e6)

/** Any book by any model: shorts, leverage and riskless positions included. */
const book = fc
  .record({ size: fc.integer({ min: 1, max: 9 }), dates: fc.integer({ min: 4, max: 19 }) })
  .chain(({ size, dates }) =>
    fc.record({
      size: fc.constant(size),
      dates: fc.constant(dates),
      returns: fc.array(real(-0.3, 0.3), { minLength: size * dates, maxLength: size * dates }),
      weights: fc.array(real(-2, 2), { minLength: size, maxLength: size }),
      factors: fc.array(real(0, 4), { minLength: size, maxLength: size }),
      still: fc.array(fc.boolean(), { minLength: size, maxLength: size }),
      theta: real(0, 1),
      kind: fc.constantFrom('sample', 'exponential', 'shrunk', 'factors'),
    }),
  )
  .map(({ size, dates, returns, weights, factors, still, theta, kind }) => {
    const block = Float64Array.from(returns, (r, k) => (still[k % size] && k % size !== 0 ? 0 : r))
    return {
      size,
      dates,
      returns: block,
      weights: Float64Array.from(weights),
      factors: Float64Array.from(factors),
      theta,
      model: modelOf(kind, block, dates, size),
    }
  })

function modelOf(kind: string, block: Float64Array, dates: number, size: number): RiskModel {
  const common = Float64Array.from({ length: dates }, (_, t) => Math.sin(3 * t))
  switch (kind) {
    case 'exponential':
      return returnsModel(block, dates, size, { kind: 'exponential', decay: 0.9 })
    case 'shrunk':
      return estimateModel(block, dates, size, { kind: 'shrinkage', target: 'correlation' })
    case 'factors':
      return factorModel(block, dates, size, common, 1)
    default:
      return returnsModel(block, dates, size)
  }
}

const sumOf = (values: ArrayLike<number>) => Array.from(values).reduce((sum, value) => sum + value, 0)

/** The square of the sum of stand-alone risks: what rounding of a variance is measured by. */
const grossOf = (model: RiskModel, weights: Float64Array) =>
  sumOf(model.variances().map((variance, i) => Math.abs(weights[i]!) * Math.sqrt(variance))) ** 2

/** C w and w'C w by the full matrix. */
function byMatrix(matrix: Float64Array, weights: Float64Array) {
  const marginals = weights.map((_, i) => sumOf(weights.map((w, j) => matrix[i * weights.length + j]! * w)))
  return { marginals, variance: sumOf(marginals.map((m, i) => m * weights[i]!)) }
}

/** By the definitions, entry by entry: D C D, then (1 - theta) C + theta s s'. */
function bentByHand(matrix: Float64Array, factors: Float64Array, theta: number): Float64Array {
  const n = factors.length
  const scaled = matrix.map((c, k) => factors[Math.floor(k / n)]! * c * factors[k % n]!)
  return scaled.map((c, k) => {
    const [i, j] = [Math.floor(k / n), k % n]
    return (1 - theta) * c + theta * Math.sqrt(scaled[i * n + i]! * scaled[j * n + j]!)
  })
}

describe('a bent covariance', () => {
  test('as an operator is what its matrix is by the definitions, entry by entry', () => {
    fc.assert(
      fc.property(book, ({ model, weights, factors, theta }) => {
        const bent = moveCorrelations(scaleVolatilities(model, factors), theta)
        const matrix = bentByHand(model.matrix(), factors, theta)
        expect(relativeGap(bent.matrix(), matrix)).toBeLessThanOrEqual(1e-12)
        const n = factors.length
        expect(
          relativeGap(
            bent.variances(),
            factors.map((_, i) => matrix[i * n + i]!),
          ),
        ).toBeLessThanOrEqual(1e-12)
        const { marginals, variance } = bent.apply(weights)
        const expected = byMatrix(matrix, weights)
        const gross = grossOf(bent, weights)
        expect(Math.abs(variance - expected.variance)).toBeLessThanOrEqual(1e-12 * gross)
        const largest = Math.max(...bent.variances().map(Math.sqrt)) * Math.sqrt(gross)
        marginals.forEach((m, i) =>
          expect(Math.abs(m - expected.marginals[i]!)).toBeLessThanOrEqual(1e-12 * largest),
        )
      }),
    )
  })

  test('has no negative eigenvalue (Boyd & Vandenberghe 2004, section 2.2.5: a convex cone)', () => {
    fc.assert(
      fc.property(book, ({ model, factors, theta, size }) => {
        const matrix = moveCorrelations(scaleVolatilities(model, factors), theta).matrix()
        const trace = sumOf(matrix.filter((_, k) => k % (size + 1) === 0))
        const { realEigenvalues } = new EigenvalueDecomposition(Matrix.from1DArray(size, size, matrix), {
          assumeSymmetric: true,
        })
        expect(Math.min(...realEigenvalues)).toBeGreaterThanOrEqual(-1e-12 * trace)
      }),
    )
  })

  test('with every correlation 1 has the volatility |s′w|, and lies between there and the start', () => {
    fc.assert(
      fc.property(book, ({ model, weights, theta }) => {
        const gross = grossOf(model, weights)
        const inStep = sumOf(model.variances().map((variance, i) => Math.sqrt(variance) * weights[i]!)) ** 2
        const start = model.apply(weights).variance
        const end = moveCorrelations(model, 1).apply(weights).variance
        const between = moveCorrelations(model, theta).apply(weights).variance
        const rounding = 1e-13 * gross
        expect(Math.abs(end - inStep)).toBeLessThanOrEqual(rounding)
        const unmoved = moveCorrelations(model, 0).apply(weights)
        expect(unmoved.variance).toBe(start)
        expect(relativeGap(unmoved.marginals, model.apply(weights).marginals)).toBe(0)
        expect(between).toBeGreaterThanOrEqual(Math.min(start, end) - rounding)
        expect(between).toBeLessThanOrEqual(Math.max(start, end) + rounding)
        // of weights of one sign no book has more than the sum of its parts
        const long = weights.map(Math.abs)
        const most = Math.sqrt(grossOf(model, long))
        expect(decompose(moveCorrelations(model, theta), long).volatility).toBeLessThanOrEqual(
          most * (1 + 1e-12),
        )
      }),
    )
  })

  test('is the same whichever of the two is done first, and contributions add up', () => {
    fc.assert(
      fc.property(book, ({ model, weights, factors, theta }) => {
        const one = moveCorrelations(scaleVolatilities(model, factors), theta)
        const other = scaleVolatilities(moveCorrelations(model, theta), factors)
        const gross = grossOf(one, weights)
        expect(Math.abs(one.apply(weights).variance - other.apply(weights).variance)).toBeLessThanOrEqual(
          1e-13 * gross,
        )
        const d = decompose(one, weights)
        expect(Math.abs(d.difference)).toBeLessThanOrEqual(
          d.volatility === 0 ? 0 : (1e-13 * gross) / d.volatility,
        )
      }),
    )
  })

  test('one factor for all multiplies the volatility by it and leaves shares alone', () => {
    fc.assert(
      fc.property(book, real(0.1, 9), ({ model, weights, size }, factor) => {
        const before = decompose(model, weights)
        fc.pre(before.volatility > 1e-3 * Math.sqrt(grossOf(model, weights)))
        const after = decompose(scaleVolatilities(model, new Float64Array(size).fill(factor)), weights)
        expect(relativeGap(after.volatility, factor * before.volatility)).toBeLessThanOrEqual(1e-9)
        expect(relativeGap(after.share!, before.share!)).toBeLessThanOrEqual(1e-9)
      }),
    )
  })
})

/** The worst fall by the definition: every pair of an earlier and a later value. */
function fallByPairs(values: readonly number[]): number {
  let worst = 0
  for (let from = 0; from < values.length; from++)
    for (let to = from; to < values.length; to++) worst = Math.max(worst, 1 - values[to]! / values[from]!)
  return worst
}

describe('a replayed stretch', () => {
  const stretch = book.map(({ returns, dates, size, weights }) => ({ returns, dates, size, weights }))

  test('its parts and its dates add up to the total', () => {
    fc.assert(
      fc.property(stretch, ({ returns, dates, size, weights }) => {
        const { total, parts, portfolio } = replay(returns, dates, size, weights)
        // at most 9 x 19 terms of at most 0.6
        expect(Math.abs(sumOf(parts) - total)).toBeLessThanOrEqual(1e-12)
        expect(Math.abs(sumOf(portfolio) - total)).toBeLessThanOrEqual(1e-12)
        parts.forEach((part, i) =>
          expect(
            Math.abs(
              part - sumOf(Array.from({ length: dates }, (_, t) => weights[i]! * returns[t * size + i]!)),
            ),
          ).toBeLessThanOrEqual(1e-12),
        )
      }),
    )
  })

  test('compounds as a value from 1 on does, and the worst fall is that of all pairs of dates', () => {
    fc.assert(
      fc.property(stretch, ({ returns, dates, size, weights }) => {
        const { portfolio, compounded, worstFall } = replay(returns, dates, size, weights)
        const values = [1]
        for (const y of portfolio) values.push(values.at(-1)! * (1 + y))
        if (values.some((value) => value <= 0)) {
          expect([compounded, worstFall]).toEqual([null, null])
          return
        }
        const value = values.at(-1)!
        expect(Math.abs(compounded! - (value - 1))).toBeLessThanOrEqual(1e-12 * Math.max(1, value))
        expect(Math.abs(worstFall!.share - fallByPairs(values))).toBeLessThanOrEqual(1e-12)
        if (worstFall!.share > 0) {
          const { share, peak, trough } = worstFall!
          expect(Math.abs(share - (1 - values[trough + 1]! / values[peak + 1]!))).toBeLessThanOrEqual(1e-12)
        }
      }),
    )
  })

  test('none of the same length loses more than the worst, and none before it as much', () => {
    fc.assert(
      fc.property(stretch, fc.nat(), ({ returns, dates, size, weights }, pick) => {
        const length = 1 + (pick % dates)
        const { start, total } = worstStretch(returns, dates, size, weights, length)
        const totals = Array.from(
          { length: dates - length + 1 },
          (_, from) =>
            replay(returns.slice(from * size, (from + length) * size), length, size, weights).total,
        )
        expect(Math.abs(total - totals[start]!)).toBeLessThanOrEqual(1e-12)
        totals.forEach((other, from) => {
          expect(other).toBeGreaterThanOrEqual(total - 2e-12)
          if (from < start) expect(other).toBeGreaterThan(total)
        })
      }),
    )
  })
})

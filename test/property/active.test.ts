import fc from 'fast-check'
import { activeRisk, returnsModel, type ActiveConvention } from '../../src/core'

const T = 12
const numbers = (count: number, size: number) =>
  fc
    .array(fc.integer({ min: -1000, max: 1000 }), { minLength: count, maxLength: count })
    .map((list) => Float64Array.from(list, (k) => (k * size) / 1000))
const setting = fc
  .integer({ min: 1, max: 5 })
  .chain((n) => fc.tuple(fc.constant(n), numbers(T * n, 0.1), numbers(n, 2), numbers(n, 2)))
const sum = (values: Float64Array) => values.reduce((a, x) => a + x, 0)
const conventions: ActiveConvention[] = ['own returns', 'benchmark-relative returns']

test.each(conventions)('by %s, contributions and the net line add up to the tracking error', (convention) => {
  fc.assert(
    fc.property(setting, ([n, returns, weights, benchmark]) => {
      const model = returnsModel(returns, T, n)
      const a = activeRisk(model, weights, benchmark, convention)
      const size = sum(a.contribution.map(Math.abs)) + Math.abs(a.netContribution) + a.trackingError
      expect(Math.abs(sum(a.contribution) + a.netContribution - a.trackingError)).toBeLessThanOrEqual(
        1e-12 * size,
      )
    }),
  )
})

test.each(conventions)(
  'by %s, a book equal to its benchmark has no active risk and no shares',
  (convention) => {
    fc.assert(
      fc.property(setting, ([n, returns, weights]) => {
        const a = activeRisk(returnsModel(returns, T, n), weights, weights, convention)
        expect(a.trackingError).toBe(0)
        expect(a.share).toBeNull()
        expect(a.netShare).toBeNull()
        expect([...a.contribution]).toEqual(Array(n).fill(0))
        expect(a.netContribution).toBe(0)
      }),
    )
  },
)

test('without a net active weight the net line is empty, and both conventions leave the benchmark the same', () => {
  fc.assert(
    fc.property(setting, ([n, returns, weights, benchmark]) => {
      const model = returnsModel(returns, T, n)
      // the last active weight takes the others back
      const free = weights.slice()
      free[n - 1] = free[n - 1]! - (sum(weights) - sum(benchmark))
      const relative = activeRisk(model, free, benchmark, 'benchmark-relative returns')
      const scale = sum(relative.contribution.map(Math.abs)) + relative.trackingError
      expect(Math.abs(relative.netContribution)).toBeLessThanOrEqual(1e-11 * (scale + 1e-3))
    }),
  )
})

test('a benchmark held as a position of its own with weight 1 is the same as its constituents', () => {
  fc.assert(
    fc.property(setting, ([n, returns, weights, benchmark]) => {
      const wide = new Float64Array(T * (n + 1))
      for (let t = 0; t < T; t++) {
        const row = returns.subarray(t * n, (t + 1) * n)
        wide.set(row, t * (n + 1))
        wide[t * (n + 1) + n] = row.reduce((total, r, i) => total + r * benchmark[i]!, 0)
      }
      const plain = activeRisk(returnsModel(returns, T, n), weights, benchmark)
      const series = activeRisk(
        returnsModel(wide, T, n + 1),
        Float64Array.of(...weights, 0),
        Float64Array.of(...benchmark.map(() => 0), 1),
      )
      const scale = plain.benchmarkVolatility + sum(plain.decomposition.standAlone) + 1e-9
      expect(Math.abs(series.trackingError - plain.trackingError)).toBeLessThan(1e-7 * scale)
      if (plain.beta !== null && series.beta !== null && plain.benchmarkVolatility > 1e-6)
        expect(Math.abs(series.beta - plain.beta)).toBeLessThan(1e-6 * (1 + Math.abs(plain.beta)))
    }),
  )
})

test('weights that differ from the benchmark in their last digits alone are no active weights', () => {
  // 0.1 + 0.2 is not 0.3 in binary; nor are amounts over their sum the fractions they stand for
  const model = returnsModel(Float64Array.of(0.01, 0.02, -0.03, 0.01, 0.02, -0.01), 3, 2)
  const a = activeRisk(model, Float64Array.of(0.1 + 0.2, 0.7), Float64Array.of(0.3, 0.7))
  expect(0.1 + 0.2).not.toBe(0.3)
  expect(a).toMatchObject({ trackingError: 0, netWeight: 0, share: null })
})

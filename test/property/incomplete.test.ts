import fc from 'fast-check'
import {
  completedMoments,
  covariance,
  inOneGo,
  nearestCorrelation,
  pairwiseCovariance,
  repairCovariance,
  returnsModel,
  shrinkToDefinite,
} from '../../src/core'
import { absoluteGap, relativeGap } from '../closeness'
import { textbookCovariance } from '../textbook'
import { expectationMaximisationStep, textbookMoments } from '../unequal-histories'

// Invariants of gappy data and of repaired matrices. Bounds: 1e-11 for moments, 1e-8 for optima, as in the references.

/** In steps of 1e-9, like returns from prices; series that never move come from the constant one. */
const step = fc.integer({ min: -300_000_000, max: 300_000_000 }).map((k) => k / 1e9)

const block = (minDates: number, maxDates: number, maxSize: number) =>
  fc
    .record({
      size: fc.integer({ min: 1, max: maxSize }),
      dates: fc.integer({ min: minDates, max: maxDates }),
    })
    .chain(({ size, dates }) =>
      fc.array(fc.array(step, { minLength: size, maxLength: size }), { minLength: dates, maxLength: dates }),
    )

const flat = (rows: readonly (readonly number[])[]) => Float64Array.from(rows.flat())
const sizeOf = (rows: readonly (readonly number[])[]) => [rows.length, rows[0]!.length] as const

/** Rows with gaps, every pair with at least two common dates: the first two rows are whole. */
const gappy = block(3, 20, 6).chain((rows) =>
  fc
    .array(fc.boolean(), { minLength: rows.flat().length, maxLength: rows.flat().length })
    .map((holes) => rows.map((row, t) => row.map((x, i) => (t > 1 && holes[t * row.length + i] ? NaN : x)))),
)

const permuted = (matrix: ArrayLike<number>, order: readonly number[]) => {
  const n = order.length
  return Float64Array.from(order.flatMap((i) => order.map((j) => matrix[i * n + j]!)))
}
const orders = (n: number) => fc.shuffledSubarray([...Array(n).keys()], { minLength: n, maxLength: n })

describe('covariance of each pair’s own dates', () => {
  it('is the sample covariance of the rows that both have', () => {
    fc.assert(
      fc.property(gappy, (rows) => {
        const [T, n] = sizeOf(rows)
        const { matrix, overlaps } = inOneGo(pairwiseCovariance(flat(rows), T, n))
        const largest = Math.max(...matrix.map(Math.abs))
        for (let i = 0; i < n; i++) {
          for (let j = 0; j < n; j++) {
            const common = rows.map((row) => [row[i]!, row[j]!]).filter((pair) => !pair.some(Number.isNaN))
            expect(overlaps[i * n + j]).toBe(common.length)
            const expected = textbookCovariance(common)[0]![1]!
            expect(Math.abs(matrix[i * n + j]! - expected)).toBeLessThanOrEqual(1e-11 * largest)
          }
        }
      }),
    )
  })

  it('is that of a returns model where nothing is missing', () => {
    fc.assert(
      fc.property(block(2, 20, 6), (rows) => {
        const [T, n] = sizeOf(rows)
        const model = returnsModel(flat(rows), T, n)
        const { matrix, means } = inOneGo(pairwiseCovariance(flat(rows), T, n))
        expect(relativeGap(matrix, covariance(model))).toBeLessThan(1e-11)
        expect(relativeGap(means, model.means)).toBeLessThan(1e-11)
      }),
    )
  })

  it('goes with the order of the columns', () => {
    fc.assert(
      fc.property(
        gappy.chain((rows) => fc.tuple(fc.constant(rows), orders(rows[0]!.length))),
        ([rows, order]) => {
          const [T, n] = sizeOf(rows)
          const turned = flat(rows.map((row) => order.map((i) => row[i]!)))
          expect(inOneGo(pairwiseCovariance(turned, T, n)).matrix).toEqual(
            permuted(inOneGo(pairwiseCovariance(flat(rows), T, n)).matrix, order),
          )
        },
      ),
    )
  })
})

/** Series with late starts: at least three dates more than series. */
const late = block(10, 24, 5).chain((rows) =>
  fc
    .array(fc.integer({ min: 0, max: rows.length - rows[0]!.length - 4 }), {
      minLength: rows[0]!.length,
      maxLength: rows[0]!.length,
    })
    .map((starts) => starts.map((start) => start - Math.min(...starts)))
    .map((starts) => rows.map((row, t) => row.map((x, i) => (t < starts[i]! ? NaN : x)))),
)

describe('moments of unequal histories', () => {
  const scaleOf = (matrix: readonly number[][]) => Math.max(...matrix.map((row, i) => row[i]!))
  /** Random blocks of few dates are close to singular now and then, where normal equations lose digits. */
  const regular = late.filter((rows) => {
    const { matrix } = textbookMoments(rows)
    return matrix.flat().every(Number.isFinite) && matrix.every((row, i) => row[i]! > 1e-6 * scaleOf(matrix))
  })

  it('are those of regressions by normal equations', () => {
    fc.assert(
      fc.property(regular, (rows) => {
        const [T, n] = sizeOf(rows)
        const { means, matrix } = inOneGo(completedMoments(flat(rows), T, n))
        const expected = textbookMoments(rows)
        expect(absoluteGap(means, expected.means)).toBeLessThan(1e-7)
        expect(relativeGap(matrix, expected.matrix.flat())).toBeLessThan(1e-7)
      }),
    )
  })

  it('are left where they are by a step of expectation-maximisation: the likelihood is at its maximum', () => {
    fc.assert(
      fc.property(regular, (rows) => {
        const [T, n] = sizeOf(rows)
        const { means, matrix } = inOneGo(completedMoments(flat(rows), T, n))
        const grid = Array.from({ length: n }, (_, i) => Array.from(matrix.subarray(i * n, (i + 1) * n)))
        const after = expectationMaximisationStep(rows, { means: Array.from(means), matrix: grid })
        expect(absoluteGap(means, after.means)).toBeLessThan(1e-7)
        expect(relativeGap(matrix, after.matrix.flat())).toBeLessThan(1e-7)
      }),
    )
  })

  it('are the sample’s with divisor T where all series start together', () => {
    fc.assert(
      fc.property(block(2, 20, 6), (rows) => {
        const [T, n] = sizeOf(rows)
        const { means, matrix } = inOneGo(completedMoments(flat(rows), T, n))
        const model = returnsModel(flat(rows), T, n)
        expect(absoluteGap(means, model.means)).toBeLessThan(1e-13)
        expect(
          relativeGap(
            matrix,
            covariance(model).map((c) => (c * (T - 1)) / T),
          ),
        ).toBeLessThan(1e-11)
      }),
    )
  })

  it('need no repair', () => {
    fc.assert(
      fc.property(late, (rows) => {
        const [T, n] = sizeOf(rows)
        const { matrix } = inOneGo(completedMoments(flat(rows), T, n))
        expect(inOneGo(repairCovariance(matrix, n, 'nearest')).changed).toBe(false)
      }),
    )
  })
})

/** Any symmetric matrix of numbers between -1 and 1 with ones on its diagonal: hardly ever one of correlations. */
const claimed = fc.integer({ min: 1, max: 9 }).chain((n) =>
  fc
    .array(
      fc.integer({ min: -1000, max: 1000 }).map((k) => k / 1000),
      { minLength: n * n, maxLength: n * n },
    )
    .map((entries) => ({
      n,
      matrix: Float64Array.from(entries, (_, k) => {
        const [i, j] = [Math.floor(k / n), k % n]
        return i === j ? 1 : entries[i > j ? i * n + j : j * n + i]!
      }),
    })),
)

/** Cholesky's pivots stay above zero: the plainest proof that a matrix is positive definite. */
function isDefinite(matrix: ArrayLike<number>, n: number): boolean {
  const l = Array.from({ length: n }, () => new Array<number>(n).fill(0))
  for (let i = 0; i < n; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = matrix[i * n + j]!
      for (let k = 0; k < j; k++) sum -= l[i]![k]! * l[j]![k]!
      if (i === j && !(sum > 0)) return false
      l[i]![j] = i === j ? Math.sqrt(sum) : sum / l[j]![j]!
    }
  }
  return true
}
/** A matrix of correlations with e on top of each eigenvalue. */
const lifted = (matrix: Float64Array, n: number, e: number) =>
  matrix.map((x, k) => (k % (n + 1) === 0 ? x + e : x))

describe('the nearest correlation matrix', () => {
  it('is symmetric, has ones on its diagonal, no negative eigenvalue, and is found', () => {
    fc.assert(
      fc.property(claimed, ({ n, matrix }) => {
        const repair = inOneGo(nearestCorrelation(matrix, n))
        expect(repair.converged).toBe(true)
        for (let i = 0; i < n; i++) {
          expect(repair.matrix[i * n + i]).toBe(1)
          for (let j = 0; j < i; j++) expect(repair.matrix[i * n + j]).toBe(repair.matrix[j * n + i])
        }
        expect(isDefinite(lifted(repair.matrix, n, 1e-12), n)).toBe(true)
      }),
    )
  })

  it('is no farther than the shrunk one, nor than any other mixture with a valid one', () => {
    fc.assert(
      fc.property(claimed, fc.double({ min: 0, max: 1, noNaN: true }), ({ n, matrix }, share) => {
        const repair = inOneGo(nearestCorrelation(matrix, n))
        const shrunk = shrinkToDefinite(matrix, n)
        expect(repair.distance).toBeLessThanOrEqual(shrunk.distance + 1e-9)
        // the set of correlation matrices is convex: every mixture of two of them is another one
        const mixed = repair.matrix.map((x, k) => (1 - share) * x + share * shrunk.matrix[k]!)
        expect(repair.distance).toBeLessThanOrEqual(Math.hypot(...mixed.map((x, k) => x - matrix[k]!)) + 1e-9)
      }),
    )
  })

  it('of a correlation matrix is itself, bit for bit', () => {
    fc.assert(
      fc.property(claimed, ({ n, matrix }) => {
        const valid = shrinkToDefinite(matrix, n).matrix
        const repair = inOneGo(nearestCorrelation(valid, n))
        expect(repair.matrix).toEqual(valid)
        expect(repair).toMatchObject({ iterations: 0, distance: 0, converged: true })
      }),
    )
  })

  it('goes with the order of the series', () => {
    fc.assert(
      fc.property(
        claimed.chain((c) => fc.tuple(fc.constant(c), orders(c.n))),
        ([{ n, matrix }, order]) => {
          const turned = inOneGo(nearestCorrelation(permuted(matrix, order), n)).matrix
          const straight = permuted(inOneGo(nearestCorrelation(matrix, n)).matrix, order)
          expect(absoluteGap(turned, straight)).toBeLessThan(1e-8)
        },
      ),
    )
  })

  it('is the same by alternating projections', () => {
    fc.assert(
      fc.property(claimed, ({ n, matrix }) => {
        const fast = inOneGo(nearestCorrelation(matrix, n))
        const slow = inOneGo(
          nearestCorrelation(matrix, n, { steps: 'projections', maxIterations: 20_000, tolerance: 1e-11 }),
        )
        expect(slow.converged).toBe(true)
        expect(absoluteGap(fast.matrix, slow.matrix)).toBeLessThan(1e-6)
        expect(Math.abs(fast.distance - slow.distance)).toBeLessThan(1e-8)
      }),
      { numRuns: 40 },
    )
  })
})

describe('shrunk correlations', () => {
  it('are positive definite at the smallest intensity that makes them so, as bisection finds it', () => {
    // Higham, Strabić & Šego (2016), section 3: bisection on Cholesky's success (from memory)
    fc.assert(
      fc.property(claimed, ({ n, matrix }) => {
        const { matrix: shrunk, intensity } = shrinkToDefinite(matrix, n)
        const mixed = (alpha: number) => matrix.map((x, k) => (k % (n + 1) === 0 ? 1 : (1 - alpha) * x))
        expect(absoluteGap(shrunk, mixed(intensity))).toBeLessThan(1e-15)
        let [low, high] = [0, 1]
        for (let k = 0; k < 45; k++) {
          const middle = (low + high) / 2
          if (isDefinite(mixed(middle), n)) high = middle
          else low = middle
        }
        expect(Math.abs(intensity - high)).toBeLessThan(1e-10)
        if (intensity > 0) expect(isDefinite(shrunk, n)).toBe(true)
      }),
    )
  })
})

describe('a repaired covariance', () => {
  const volatilities = fc.array(
    fc.integer({ min: 0, max: 500 }).map((k) => k / 1000),
    {
      minLength: 9,
      maxLength: 9,
    },
  )
  const both = fc.constantFrom('nearest', 'shrunk')

  it('keeps every variance and every riskless column, and tells the correlation it changed most', () => {
    fc.assert(
      fc.property(claimed, volatilities, both, ({ n, matrix }, vol, how) => {
        const given = matrix.map((r, k) => r * vol[Math.floor(k / n)]! * vol[k % n]!)
        const repair = inOneGo(repairCovariance(given, n, how))
        for (let i = 0; i < n; i++) {
          for (let j = 0; j < n; j++) {
            const [before, after] = [given[i * n + j]!, repair.matrix[i * n + j]!]
            if (i === j || vol[i] === 0 || vol[j] === 0 || !repair.changed) expect(after).toBe(before)
            else {
              const most = Math.abs(repair.largestChange!.after - repair.largestChange!.before)
              expect(Math.abs(after - before) / vol[i]! / vol[j]!).toBeLessThanOrEqual(most + 1e-12)
            }
          }
        }
        expect(repair.changed).toBe(repair.smallestBefore < 0)
        expect(repair.smallestAfter).toBeGreaterThan(-1e-12)
        expect(repair.converged).toBe(true)
      }),
    )
  })

  it('is what a second repair leaves alone', () => {
    fc.assert(
      fc.property(claimed, both, ({ n, matrix }, how) => {
        const once = inOneGo(repairCovariance(matrix, n, how))
        const twice = inOneGo(repairCovariance(once.matrix, n, how))
        expect(absoluteGap(twice.matrix, once.matrix)).toBeLessThan(1e-12)
      }),
    )
  })
})

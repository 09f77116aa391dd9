import fc from 'fast-check'
import {
  inOneGo,
  matrixModel,
  roundToLots,
  smallestChange,
  type ChangeLimit,
  type ChangeProblem,
  type ChangeResult,
  type LimitMeasure,
} from '../../src/core'

// The smallest change against a naive second form: figures by double sums over the matrix, slopes by central differences of them, and all points
// of a grid instead of a search. What a stationary point has to satisfy: Karush, Kuhn & Tucker's conditions (Nocedal & Wright (2006),
// Numerical Optimization, theorem 12.1; from memory).

const MEASURES: readonly LimitMeasure[] = [
  'share',
  'contribution',
  'volatility',
  'stand-alone',
  'tracking error',
  'weight',
]
const CONVEX = MEASURES.slice(2)

interface Book {
  readonly n: number
  readonly matrix: number[]
  readonly weights: number[]
  readonly benchmark: number[]
  readonly limits: readonly ChangeLimit[]
  readonly kind: 'book' | 'cash'
}

const form = (matrix: readonly number[], x: readonly number[], y: readonly number[]) =>
  x.reduce((sum, a, i) => sum + y.reduce((inner, b, j) => inner + a * matrix[i * x.length + j]! * b, 0), 0)

function figure(
  { matrix, benchmark }: Pick<Book, 'matrix' | 'benchmark'>,
  limit: ChangeLimit,
  w: readonly number[],
) {
  const { measure, members } = limit
  const of = w.map((x, i) => (!members || members.includes(i) ? x : 0))
  switch (measure) {
    case 'share':
      return form(matrix, of, w) / form(matrix, w, w)
    case 'contribution':
      return form(matrix, of, w) / Math.sqrt(form(matrix, w, w))
    case 'volatility':
      return Math.sqrt(form(matrix, w, w))
    case 'stand-alone':
      return Math.sqrt(form(matrix, of, of))
    case 'tracking error': {
      const active = w.map((x, i) => x - benchmark[i]!)
      return Math.sqrt(form(matrix, active, active))
    }
    case 'weight':
      return members?.length === 1 ? Math.abs(w[members[0]!]!) : of.reduce((sum, x) => sum + x, 0)
  }
}

const unit = (min: number, max: number) =>
  fc.double({ min, max, noNaN: true }).map((x) => Math.round(x * 1e6) / 1e6)

/** A book of a common factor and own risk, some limits a little over or under today's figures. */
const bookOf = (least: number, largest: number, measures: readonly LimitMeasure[]) =>
  fc.integer({ min: least, max: largest }).chain((n) =>
    fc
      .record({
        sigma: fc.array(unit(0.1, 0.4), { minLength: n, maxLength: n }),
        beta: fc.array(unit(-0.5, 1), { minLength: n, maxLength: n }),
        weights: fc.array(unit(0.02, 1), { minLength: n, maxLength: n }),
        short: fc.boolean(),
        benchmark: fc.array(unit(0, 0.5), { minLength: n, maxLength: n }),
        kind: fc.constantFrom('book' as const, 'cash' as const),
        wanted: fc.array(
          fc.record({
            measure: fc.constantFrom(...measures),
            members: fc.uniqueArray(fc.integer({ min: 0, max: n - 1 }), {
              minLength: 1,
              maxLength: Math.max(1, n - 1),
            }),
            times: unit(0.7, 1.1),
          }),
          { minLength: 1, maxLength: 3 },
        ),
      })
      .map(({ sigma, beta, weights, short, benchmark, kind, wanted }): Book => {
        const matrix = sigma.flatMap((s, i) =>
          sigma.map((r, j) => s * r * (beta[i]! * beta[j]! + (i === j ? 0.5 : 0))),
        )
        const w = weights.map((x, i) => (short && i === 0 ? -x / 2 : x))
        const limits = wanted.map(({ measure, members, times }): ChangeLimit => {
          const limit = {
            measure,
            members:
              measure === 'volatility' || measure === 'tracking error' ? null : Int32Array.from(members),
            most: 0,
          }
          const today = figure({ matrix, benchmark }, limit, w)
          return { ...limit, most: today > 0 ? today * times : today + 0.05 * times }
        })
        return { n, matrix, weights: w, benchmark, limits, kind }
      }),
  )

const problemOf = ({ weights, limits, kind, benchmark }: Book): ChangeProblem => ({
  weights: Float64Array.from(weights),
  limits,
  financing: { kind },
  benchmark: Float64Array.from(benchmark),
})
const solve = (book: Book): ChangeResult =>
  inOneGo(smallestChange(matrixModel(Float64Array.from(book.matrix), book.n), problemOf(book)))
const total = (values: ArrayLike<number>) => Array.from(values).reduce((sum, x) => sum + x, 0)

describe('the smallest change of any book', () => {
  const any = bookOf(1, 7, MEASURES)

  test('holds what it says it holds, in the naive form', () => {
    fc.assert(
      fc.property(any, (book) => {
        const result = solve(book)
        const w = Array.from(result.weights)
        w.forEach((x, i) => expect(book.weights[i]! < 0 ? x <= 0 : x >= 0).toBe(true))
        if (book.kind === 'book')
          expect(Math.abs(total(w) - total(book.weights))).toBeLessThan(1e-13 * book.n)
        expect(result.change).toBeCloseTo(total(w.map((x, i) => Math.abs(x - book.weights[i]!))), 12)
        book.limits.forEach((limit, k) => {
          const { figure: told, excess } = result.residuals[k]!
          const own = figure(book, limit, w)
          // a book that is hedged away leaves a root of rounding
          if (Number.isFinite(own) && Math.sqrt(form(book.matrix, w, w)) > 1e-6)
            expect(Math.abs(told - own)).toBeLessThan(1e-7)
          if (result.status === 'met')
            expect(excess).toBeLessThanOrEqual(1e-12 * Math.max(1, Math.abs(limit.most)))
        })
      }),
    )
  })

  test('is a stationary point: slopes of limits, weighed with what they save, balance the change of each position', () => {
    fc.assert(
      fc.property(any, (book) => {
        const { status, weights, savings, change } = solve(book)
        fc.pre(status === 'met' && change > 0)
        const w = Array.from(weights)
        fc.pre(Math.sqrt(form(book.matrix, w, w)) > 1e-3)
        const h = 1e-6
        const at = (i: number, by: number) => w.map((x, j) => (j === i ? x + by : x))
        const pulls = w.map((_, i) =>
          book.limits.reduce((sum, limit, k) => {
            if (savings[k] === 0) return sum
            return (
              sum + (savings[k]! * (figure(book, limit, at(i, h)) - figure(book, limit, at(i, -h)))) / (2 * h)
            )
          }, 0),
        )
        // each position allows a range for the price of the sum; without one it is 0
        let [low, high] = book.kind === 'book' ? [-Infinity, Infinity] : [0, 0]
        w.forEach((x, i) => {
          // an absolute weight at 0 has no slope to be compared
          if (
            Math.abs(x) < 10 * h &&
            book.limits.some(({ measure }) => measure === 'weight' || measure === 'stand-alone')
          ) {
            return
          }
          const d = x - book.weights[i]!
          const down = d > 0 ? 1 : -1
          const up = d < 0 ? -1 : 1
          // moving up must not save: up + pull + price >= 0; moving down: -(down + pull + price) >= 0
          if (!(book.weights[i]! < 0 && x === 0)) low = Math.max(low, -up - pulls[i]!)
          if (!(book.weights[i]! >= 0 && x === 0)) high = Math.min(high, -down - pulls[i]!)
        })
        const size = 1 + total(savings) + Math.max(...pulls.map(Math.abs))
        expect(low - high).toBeLessThanOrEqual(1e-5 * size)
      }),
    )
  })

  test('is nothing, to the last bit, where no limit is over', () => {
    fc.assert(
      fc.property(any, (book) => {
        const limits = book.limits.map((limit) => ({
          ...limit,
          most: Math.max(limit.most, figure(book, limit, book.weights) * (1 + 1e-9) + 1e-9),
        }))
        const result = solve({ ...book, limits })
        expect(Array.from(result.weights)).toEqual(book.weights)
        expect(result.status).toBe('met')
      }),
    )
  })

  test('leads nowhere else from where it led', () => {
    fc.assert(
      fc.property(any, (book) => {
        const result = solve(book)
        fc.pre(result.status === 'met')
        const again = solve({ ...book, weights: Array.from(result.weights) })
        expect(Array.from(again.weights)).toEqual(Array.from(result.weights))
      }),
    )
  })

  test('under limits on shares and weights does not depend on the scale of risk: a quarter of the volatility, the same bits', () => {
    fc.assert(
      fc.property(bookOf(2, 6, ['share', 'weight']), (book) => {
        // a power of 2, which scales every step of the way without rounding
        const scaled = solve({ ...book, matrix: book.matrix.map((c) => c / 16) })
        expect(Array.from(scaled.weights)).toEqual(Array.from(solve(book).weights))
      }),
    )
  })
})

describe('under convex limits the smallest change', () => {
  const convex = bookOf(2, 6, CONVEX)

  test('is proven, or is proven not to exist', () => {
    fc.assert(
      fc.property(convex, (book) => {
        const { status, proven, minimised, leastPossible } = solve(book)
        expect([status, proven]).toEqual([expect.stringMatching(/^(met|not found)$/), true])
        if (status === 'met') expect(minimised - leastPossible).toBeLessThan(1e-6)
      }),
    )
  })

  test('is the same in any order of the positions', () => {
    fc.assert(
      fc.property(convex, fc.infiniteStream(fc.nat(1e6)), (book, keys) => {
        const order = book.weights
          .map((_, i) => ({ i, key: keys.next().value as number }))
          .sort((a, b) => a.key - b.key)
          .map(({ i }) => i)
        const shuffled: Book = {
          ...book,
          matrix: order.flatMap((i) => order.map((j) => book.matrix[i * book.n + j]!)),
          weights: order.map((i) => book.weights[i]!),
          benchmark: order.map((i) => book.benchmark[i]!),
          limits: book.limits.map((limit) => ({
            ...limit,
            members: limit.members && limit.members.map((member) => order.indexOf(member)),
          })),
        }
        const [a, b] = [solve(book), solve(shuffled)]
        expect(a.status).toBe(b.status)
        if (a.status === 'met') expect(Math.abs(a.minimised - b.minimised)).toBeLessThan(1e-6)
      }),
    )
  })
})

describe('against all points of a grid', () => {
  /** The least change on a grid around the weights, refined around its best; Infinity where no point of it holds all limits. */
  function onGrid(book: Book): { change: number; at: number[] } {
    const free = book.kind === 'book' ? book.n - 1 : book.n
    const points = free === 1 ? 401 : free === 2 ? 81 : 21
    let best = { change: Infinity, at: book.weights }
    let half = 1
    const holds = (w: readonly number[]) =>
      w.every((x, i) => (book.weights[i]! < 0 ? x <= 0 : x >= 0)) &&
      form(book.matrix, w, w) > 1e-12 &&
      book.limits.every((limit) => figure(book, limit, w) <= limit.most)
    for (let level = 0; level < 5; level++) {
      const centre = best.at
      for (let cell = 0; cell < points ** free; cell++) {
        const w = centre.slice()
        for (let d = 0, left = cell; d < free; d++, left = Math.floor(left / points))
          w[d] = centre[d]! + half * ((2 * (left % points)) / (points - 1) - 1)
        if (book.kind === 'book') w[book.n - 1] = total(book.weights) - total(w.slice(0, -1))
        const change = total(w.map((x, i) => Math.abs(x - book.weights[i]!)))
        if (change < best.change && holds(w)) best = { change, at: w }
      }
      if (best.change === Infinity) break
      half *= 6 / (points - 1)
    }
    return best
  }

  test('of two positions, no point changes less, and where any holds all limits the search finds one', () => {
    fc.assert(
      fc.property(bookOf(2, 2, MEASURES), (book) => {
        const result = solve(book)
        const grid = onGrid(book)
        if (grid.change < Infinity) {
          expect(result.status).toBe('met')
          expect(result.minimised).toBeLessThanOrEqual(grid.change + 1e-6)
        }
      }),
      { numRuns: 40 },
    )
  })

  test('of three positions, no point changes less where that is proven, and none nearby where it is not', () => {
    fc.assert(
      fc.property(bookOf(3, 3, MEASURES), (book) => {
        const result = solve(book)
        const grid = onGrid(book)
        if (result.status === 'not found' && result.proven) expect(grid.change).toBe(Infinity)
        if (result.status !== 'met' || grid.change === Infinity) return
        const nearby = grid.at.every((x, i) => Math.abs(x - result.weights[i]!) < 0.01)
        if (result.proven || nearby) expect(result.minimised).toBeLessThanOrEqual(grid.change + 1e-6)
      }),
      { numRuns: 20 },
    )
  })

  test('of three positions in sixty books, the local optimum is all but always the best there is', () => {
    let [found, missed, worse] = [0, 0, 0]
    fc.sample(bookOf(3, 3, MEASURES), { numRuns: 60, seed: 20260901 }).forEach((book) => {
      const grid = onGrid(book)
      const { status, minimised } = solve(book)
      if (status === 'met') found++
      else if (grid.change < Infinity) missed++
      if (status === 'met' && minimised > grid.change + 1e-4) worse++
    })
    expect(found).toBeGreaterThan(40)
    expect([missed, worse]).toEqual([0, 0])
  }, 120_000)
})

describe('rounding a smallest change to lots', () => {
  test('gives whole lots within bounds, and says of limits what the naive form says', () => {
    fc.assert(
      fc.property(bookOf(1, 6, MEASURES), unit(0.001, 0.05), (book, lot) => {
        const { weights, status } = solve(book)
        fc.pre(status === 'met')
        const model = matrixModel(Float64Array.from(book.matrix), book.n)
        const sizes = new Float64Array(book.n).fill(lot)
        const result = inOneGo(roundToLots(model, problemOf(book), weights, sizes))
        result.weights.forEach((w, i) => {
          expect(Number.isInteger(result.lots[i])).toBe(true)
          expect(w).toBe(result.lots[i] === 0 ? book.weights[i] : book.weights[i]! + result.lots[i]! * lot)
          expect(book.weights[i]! < 0 ? w <= 0 : w >= 0).toBe(true)
        })
        const own = book.limits.map((limit) => figure(book, limit, Array.from(result.weights)))
        if (result.holds) own.forEach((f, k) => expect(f).toBeLessThanOrEqual(book.limits[k]!.most + 1e-7))
        else expect(own.some((f, k) => !(f <= book.limits[k]!.most - 1e-7))).toBe(true)
      }),
    )
  })
})

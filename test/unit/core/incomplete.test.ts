import {
  completedMoments,
  historyLengths,
  inOneGo,
  pairwiseCovariance,
  repairCovariance,
  nearestCorrelation,
  shrinkToDefinite,
  smallestEigenvalue,
} from '../../../src/core'
import { faultOf } from '../../fault-of'
import { absoluteGap, relativeGap } from '../../closeness'
import { textbookMoments } from '../../unequal-histories'

const _ = NaN
const flat = (rows: readonly (readonly number[])[]) => Float64Array.from(rows.flat())

/** The shares a computation tells on its way. */
function sharesOf(steps: Generator<number, unknown>): number[] {
  const shares: number[] = []
  for (let step = steps.next(); !step.done; step = steps.next()) shares.push(step.value)
  return shares
}

describe('what each series has', () => {
  it('counts dates from its first return to its last, and the gaps between', () => {
    const rows = [
      [_, 0.01, _, 0],
      [0.02, _, _, 0],
      [_, _, _, 0],
      [0.01, 0.03, _, _],
    ]
    expect(historyLengths(flat(rows), 4, 4)).toEqual({
      first: Int32Array.of(1, 0, -1, 0),
      last: Int32Array.of(3, 3, -1, 2),
      counts: Int32Array.of(2, 2, 0, 3),
      gaps: Int32Array.of(1, 2, 0, 0),
    })
  })
})

describe('covariance of pairs', () => {
  it('of a series that never changes is exactly 0, over whichever dates', () => {
    // 0.1 is no double: sums of it do not come out even
    const rows = [
      [0.1, _, 0.02],
      [0.1, 0.1, -0.05],
      [0.1, 0.1, _],
      [_, 0.1, 0.01],
      [0.1, 0.1, 0.04],
    ]
    const { matrix, means } = inOneGo(pairwiseCovariance(flat(rows), 5, 3))
    expect(Array.from(matrix, Math.abs).map((x, k) => (k === 8 ? 1 : x))).toEqual([0, 0, 0, 0, 0, 0, 0, 0, 1])
    expect(Array.from(means.subarray(0, 2))).toEqual([0.1, 0.1])
  })

  it('keeps its digits where returns ride on a large constant', () => {
    // by hand: common rows 1 to 3, (1, 3, 2) and (2, 2, 5), deviations (-1, 1, 0) and (-1, -1, 2): sum 0 + ..., c = 0/2
    const far = 1e6
    const rows = [
      [far + 1, far + 2],
      [far + 3, far + 2],
      [far + 2, far + 5],
      [far + 9, _],
      [_, far - 7],
    ]
    const { matrix, smallestOverlap } = inOneGo(pairwiseCovariance(flat(rows), 5, 2))
    expect(absoluteGap(matrix[1]!, 0)).toBeLessThan(1e-9)
    // (1, 3, 2, 9): mean 3.75, squares 7.5625 + .5625 + 3.0625 + 27.5625 over 3
    expect(absoluteGap(matrix[0]!, 38.75 / 3)).toBeLessThan(1e-9)
    expect(smallestOverlap).toEqual({ i: 0, j: 1, dates: 3 })
  })

  it.each([
    [
      'a pair without two common dates, by the shorter series',
      [
        [0.01, _, 0.01],
        [0.02, _, 0.03],
        [0.03, 0.01, 0.02],
        [_, 0.02, 0.02],
      ],
      'returns: columns 1 and 2 have 1 date in common',
      1,
    ],
    [
      'a pair that never meets',
      [
        [0.01, _],
        [0.02, _],
        [_, 0.01],
        [_, 0.02],
      ],
      'returns: columns 1 and 2 have 0 dates in common',
      0,
    ],
    ['a single series with one return', [[_], [0.01], [_]], 'returns: column 1 has 1 return', 0],
  ])('refuses %s', (_name, rows, found, column) => {
    const fault = faultOf(() => inOneGo(pairwiseCovariance(flat(rows), rows.length, rows[0]!.length)))
    expect(fault).toMatchObject({
      code: 'missing-data',
      found,
      needed: 'at least 2 are needed',
      where: { argument: 'returns', column },
    })
  })

  it.each([1, 2.5, NaN])('refuses %d as the least common dates', (least) => {
    expect(faultOf(() => inOneGo(pairwiseCovariance(Float64Array.of(1, 2), 2, 1, least)))).toMatchObject({
      code: 'out-of-range',
      where: { argument: 'least' },
    })
  })
})

describe('moments of unequal histories', () => {
  it.each([
    [
      'a gap after the start',
      [
        [0.01, _, 0.01],
        [0.02, 0.01, 0.03],
        [0.03, _, _],
        [0.01, 0.02, 0.02],
      ],
      'missing-data',
      'returns: a gap after column 2 has begun',
      { argument: 'returns', row: 2, column: 1 },
    ],
    [
      'a series that ends early',
      [
        [0.01, 0.02],
        [0.02, 0.01],
        [0.03, _],
      ],
      'missing-data',
      'returns: a gap after column 2 has begun',
      { argument: 'returns', row: 2, column: 1 },
    ],
    [
      'a series without any return',
      [
        [0.01, _],
        [0.02, _],
      ],
      'missing-data',
      'returns: column 2 has no return',
      { argument: 'returns', column: 1 },
    ],
    [
      'fewer dates than a regression takes',
      [
        [0.01, 0.02, _],
        [0.02, 0.01, _],
        [0.03, 0.01, 0.01],
        [0.01, 0.03, 0.02],
        [0.02, 0.05, 0.03],
      ],
      'too-few',
      'returns: column 3 has 3 dates and 2 longer series',
      { argument: 'returns', row: 2, column: 2 },
    ],
    [
      'one date',
      [[0.01, 0.02]],
      'too-few',
      'returns: column 1 has 1 date',
      { argument: 'returns', column: 0 },
    ],
    [
      'an infinite return',
      [
        [0.01, _],
        [0.01, Infinity],
      ],
      'not-a-number',
      'returns: Infinity',
      { argument: 'returns', row: 1, column: 1 },
    ],
  ])('refuse %s', (_name, rows, code, found, where) => {
    const fault = faultOf(() => inOneGo(completedMoments(flat(rows), rows.length, rows[0]!.length)))
    expect(fault).toMatchObject({ code, found })
    expect(fault.where).toEqual(where)
  })

  /** A market of two factors in steps of 1/1000, with the columns asked for. */
  const market = (dates: number, columns: ((a: number, b: number, t: number) => number)[]) =>
    Array.from({ length: dates }, (_unused, t) => {
      const [a, b] = [((t * 37) % 23) / 1000, ((t * 61) % 29) / 1000]
      return columns.map((column) => column(a, b, t))
    })
  const noise = (t: number) => ((t * t * 17) % 31) / 1000

  it('leave a series out of a regression that the other longer ones span, and say so', () => {
    const rows = market(60, [
      (a) => a,
      (a, b, t) => (t < 20 ? _ : a + b + noise(t)),
      (_a, b) => b,
      // over all dates a series of its own, over the last 40 the sum of the first and third
      (a, b, t) => (t < 20 ? noise(t) : a + b),
    ])
    const { means, matrix, groups } = inOneGo(completedMoments(flat(rows), 60, 4))
    expect(groups.map(({ redundant }) => Array.from(redundant))).toEqual([[], [3]])
    // the same without that series, by normal equations; 1e-9 for their rounding
    const others = [0, 1, 2]
    const expected = textbookMoments(rows.map((row) => others.map((i) => row[i]!)))
    expect(
      relativeGap(
        others.map((i) => means[i]!),
        expected.means,
      ),
    ).toBeLessThan(1e-9)
    expect(
      relativeGap(
        others.flatMap((i) => others.map((j) => matrix[i * 4 + j]!)),
        expected.matrix.flat(),
      ),
    ).toBeLessThan(1e-9)
  })

  it('have no covariance with a series that never changes, which takes no part in the others', () => {
    const columns = [
      (a: number) => a,
      (a: number, b: number, t: number) => (t < 20 ? _ : a + b),
      (_a: number, b: number) => b + 0.001,
    ]
    const rows = market(60, columns)
    const withCash = rows.map((row) => [row[0]!, 0.1, ...row.slice(1)])
    const plain = inOneGo(completedMoments(flat(rows), 60, 3))
    const { means, matrix, groups } = inOneGo(completedMoments(flat(withCash), 60, 4))
    expect(means[1]).toBe(0.1)
    expect([0, 1, 2, 3].map((i) => matrix[4 + i])).toEqual([0, 0, 0, 0])
    const rest = [0, 2, 3]
    expect(Float64Array.from(rest, (i) => means[i]!)).toEqual(plain.means)
    expect(Float64Array.from(rest.flatMap((i) => rest.map((j) => matrix[i * 4 + j]!)))).toEqual(plain.matrix)
    expect(groups.every(({ redundant }) => redundant.length === 0)).toBe(true)
  })

  it('come out where all series are one and the same', () => {
    // rounding of rounding goes below the range of doubles here, unless it is stopped
    const n = 120
    const rows = market(
      200,
      new Array<(a: number) => number>(n).fill((a) => a),
    )
    for (const [t, row] of rows.entries()) if (t < 20) row[n - 1] = _
    const { matrix, groups, residualVariances } = inOneGo(completedMoments(flat(rows), 200, n))
    // a series explained by another takes its variance over all dates
    expect(relativeGap(matrix, new Array<number>(n * n).fill(matrix[0]!))).toBeLessThan(1e-11)
    expect(groups[1]!.redundant.length).toBe(n - 2)
    expect(residualVariances[n - 1]! / matrix[0]!).toBeLessThan(1e-20)
  })
})

describe('nearest correlations', () => {
  const threeAlike = Float64Array.of(1, -56, 76, -56, 1, 56, 76, 56, 1)

  it('take projections where Newton’s equations are singular, and arrive all the same', () => {
    const mixed = inOneGo(nearestCorrelation(threeAlike, 3))
    expect(mixed.projections).toBeGreaterThan(0)
    expect(mixed.converged).toBe(true)
    const slow = inOneGo(nearestCorrelation(threeAlike, 3, { steps: 'projections', maxIterations: 20_000 }))
    expect(slow.projections).toBe(slow.iterations)
    expect(slow.converged).toBe(true)
    // the dual is flat far from correlations; what is left of 1e-10 in the diagonal may be 1e-6 elsewhere
    expect(absoluteGap(mixed.matrix, slow.matrix)).toBeLessThan(1e-6)
  })

  it('that are not reached come back valid, and said not to be the nearest', () => {
    const given = Float64Array.of(1, 0.9, -0.9, 0.9, 1, 0.9, -0.9, 0.9, 1)
    const nearest = inOneGo(nearestCorrelation(given, 3))
    const short = inOneGo(nearestCorrelation(given, 3, { steps: 'projections', maxIterations: 1 }))
    expect(short).toMatchObject({ converged: false, iterations: 1 })
    expect(short.residual).toBeGreaterThan(1e-10)
    expect(short.distance).toBeGreaterThan(nearest.distance)
    expect([0, 4, 8].map((k) => short.matrix[k])).toEqual([1, 1, 1])
    expect(smallestEigenvalue(short.matrix, 3)).toBeGreaterThan(-1e-14)
    // with a tolerance below rounding the search ends where nothing gets better, not at its last iteration
    const endless = inOneGo(nearestCorrelation(given, 3, { tolerance: 1e-300 }))
    expect(endless.iterations).toBeLessThan(20)
    expect(absoluteGap(endless.matrix, nearest.matrix)).toBeLessThan(1e-8)
  })

  it('are exact for three series that cannot all be opposite', () => {
    // analytic: equal correlations stay equal by symmetry, and three can go down to -1/2
    const given = Float64Array.of(1, -1, -1, -1, 1, -1, -1, -1, 1)
    expect(
      absoluteGap(
        inOneGo(nearestCorrelation(given, 3)).matrix,
        [1, -0.5, -0.5, -0.5, 1, -0.5, -0.5, -0.5, 1],
      ),
    ).toBeLessThan(1e-10)
  })

  it.each([{ tolerance: 0 }, { tolerance: NaN }, { maxIterations: -1 }, { maxIterations: 1.5 }])(
    'refuse %j',
    (options) => {
      expect(faultOf(() => inOneGo(nearestCorrelation(threeAlike, 3, options)))).toMatchObject({
        code: 'out-of-range',
        where: { argument: Object.keys(options)[0] },
      })
    },
  )

  it.each([
    ['a matrix that is not symmetric', Float64Array.of(1, 0.5, 0.4, 1), 'not-symmetric'],
    ['numbers that are none', Float64Array.of(1, NaN, NaN, 1), 'not-a-number'],
    ['another shape', Float64Array.of(1, 0, 0), 'shape'],
    ['a negative variance', Float64Array.of(1, 0, 0, -1), 'negative-variance'],
  ])('and shrunk ones refuse %s', (_name, matrix, code) => {
    for (const work of [
      () => inOneGo(nearestCorrelation(matrix, 2)),
      () => shrinkToDefinite(matrix, 2),
      () => smallestEigenvalue(matrix, 2),
      () => inOneGo(repairCovariance(matrix, 2, 'nearest')),
    ]) {
      expect(faultOf(work).code).toBe(code)
    }
  })

  it('shrunk ones want ones on the diagonal', () => {
    expect(faultOf(() => shrinkToDefinite(Float64Array.of(1, 0, 0, 2), 2))).toMatchObject({
      code: 'out-of-range',
      found: 'risk: 2 on the diagonal',
      where: { row: 1, column: 1 },
    })
  })
})

describe('a repaired covariance', () => {
  it('cannot have a covariance beside a variance of 0', () => {
    const work = () => inOneGo(repairCovariance(Float64Array.of(0.04, 0.01, 0.01, 0), 2, 'shrunk'))
    expect(faultOf(work)).toMatchObject({
      code: 'out-of-range',
      found: 'risk: a covariance of 0.01 beside a variance of 0',
      where: { row: 1, column: 0 },
    })
  })

  it('of riskless positions alone is itself', () => {
    expect(inOneGo(repairCovariance(new Float64Array(4), 2, 'nearest'))).toMatchObject({
      changed: false,
      smallestBefore: 0,
      smallestAfter: 0,
      matrix: new Float64Array(4),
    })
  })

  it('tells the change of its pair', () => {
    // the three opposite series again, with volatilities 10%, 20% and 30%
    const vol = [0.1, 0.2, 0.3]
    const given = flat(vol.map((a, i) => vol.map((b, j) => (i === j ? 1 : i + j === 1 ? -1 : -0.9) * a * b)))
    const repair = inOneGo(repairCovariance(given, 3, 'shrunk'))
    expect(repair.largestChange).toMatchObject({ i: 0, j: 1 })
    expect(repair.largestChange!.before).toBeCloseTo(-1, 14)
    expect(repair.largestChange!.after * 0.1 * 0.2).toBeCloseTo(repair.matrix[1]!, 16)
  })
})

test.each([
  [
    'pairwiseCovariance',
    () =>
      pairwiseCovariance(
        flat([
          [1, 2, 3],
          [2, _, 1],
          [4, 3, 3],
          [1, 1, 2],
        ]),
        4,
        3,
      ),
  ],
  [
    'completedMoments',
    () =>
      completedMoments(
        flat([
          [1, _],
          [2, 3],
          [4, 1],
          [1, 0],
        ]),
        4,
        2,
      ),
  ],
  ['nearestCorrelation', () => nearestCorrelation(Float64Array.of(1, 1, 0, 1, 1, 1, 0, 1, 1), 3)],
  ['repairCovariance', () => repairCovariance(Float64Array.of(1, 1, 0, 1, 1, 1, 0, 1, 1), 3, 'nearest')],
] as [string, () => Generator<number, unknown>][])(
  '%s tells a share done that never falls back',
  (_name, start) => {
    const shares = sharesOf(start())
    expect(shares.length).toBeGreaterThan(2)
    expect(shares).toEqual([...shares].sort((a, b) => a - b))
    expect(shares.every((share) => share >= 0 && share <= 1)).toBe(true)
  },
)

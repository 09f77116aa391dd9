import {
  autocorrelation,
  carefulError,
  estimateModel,
  frequencySteps,
  jointLimit,
  laggedCrossCorrelation,
  ljungBox,
  longestRun,
  outliers,
  rhythm,
  robustScale,
  scalingFactor,
  shareBroughtBack,
  shareInRuns,
  splitRatio,
  unsmoothedReturns,
  unsmoothedVolatility,
  unsmoothingFactor,
  usualLags,
  withoutRuns,
} from '../../../src/core'
import { absoluteGap, relativeGap } from '../../closeness'

/** Independent numbers from -0.5 to 0.5: the Park-Miller generator. */
function independent(seed: number, count: number): Float64Array {
  let x = seed
  return Float64Array.from({ length: count }, () => (x = (16807 * x) % 2147483647) / 2147483647 - 0.5)
}

describe('autocorrelation', () => {
  test('gaps before and after the observations change nothing', () => {
    const x = Float64Array.of(1, 4, 2, 8, 5, 7)
    const gappy = Float64Array.of(NaN, NaN, ...x, NaN)
    expect(autocorrelation(gappy, 2)).toEqual(autocorrelation(x, 2))
    expect(ljungBox(gappy, 2)).toEqual(ljungBox(x, 2))
  })

  test('a gap within takes its pairs out', () => {
    // mean 2.5, deviations -1.5 -0.5 | 0.5 1.5: one pair each side of the gap, (0.75 + 0.75) / 5
    expect(autocorrelation(Float64Array.of(1, 2, NaN, 3, 4), 1)).toMatchObject({
      value: expect.closeTo(0.3, 14) as number,
      pairs: 2,
    })
  })

  test('is not defined where nothing moves, nothing is there or no pair is left', () => {
    for (const x of [[0.1, 0.1, 0.1], [NaN, NaN], [], [1, NaN, 2], [1, 2]])
      expect(autocorrelation(Float64Array.from(x), x.length === 2 ? 2 : 1)).toBeNull()
    expect(ljungBox(Float64Array.of(1, 2, 3), 3)).toBeNull()
    expect(ljungBox(Float64Array.of(1, 1, 1), 1)).toBeNull()
    expect(unsmoothedVolatility(Float64Array.of(1, 1, 1))).toBeNull()
  })

  test('about 95 of 100 independent series stay within either band', () => {
    // 1000 series of 250: the share is known to sqrt(.05 x .95 / 1000) = 0.7%; tolerance three of those
    let [plain, robust] = [0, 0]
    const all = independent(99, 250000)
    for (let k = 0; k < 1000; k++) {
      const r = autocorrelation(all.subarray(250 * k, 250 * (k + 1)), 1)!
      if (Math.abs(r.value) <= r.band) plain++
      if (Math.abs(r.value) <= r.robustBand) robust++
    }
    expect(Math.abs(plain / 1000 - 0.95)).toBeLessThan(0.021)
    expect(Math.abs(robust / 1000 - 0.95)).toBeLessThan(0.021)
  })

  test('where volatility comes and goes only the robust band holds what it says', () => {
    // independent signs, each date 1 or 10 wide in spells of 25
    const all = independent(5, 250000).map((u, t) => u * (Math.floor(t / 25) % 5 === 0 ? 10 : 1))
    let [plain, robust] = [0, 0]
    for (let k = 0; k < 1000; k++) {
      const r = autocorrelation(all.subarray(250 * k, 250 * (k + 1)), 1)!
      if (Math.abs(r.value) <= r.band) plain++
      if (Math.abs(r.value) <= r.robustBand) robust++
    }
    expect(plain / 1000).toBeLessThan(0.75)
    expect(Math.abs(robust / 1000 - 0.95)).toBeLessThan(0.021)
  })
})

describe('the limit of chance', () => {
  // scipy 1.17.1, stats.norm.isf(chance / 2 / count); 1e-12: the last digits of two ways to a quantile
  test.each([
    [1, 0.05, 1.9599639845400545],
    [6, 0.01, 3.1439802870690796],
    [40, 0.01, 3.6622599308877013],
  ])('of %i estimates and %d in all', (count, chance, expected) => {
    expect(absoluteGap(jointLimit(count, chance), expected)).toBeLessThan(1e-12)
  })

  test('is kept by all of 10 series in about 95 of 100 books of them', () => {
    // (1 - 0.05/10)^10 = 0.951 for independent series, a little more by the wider of two bands. Of 400 books the share is known to
    // sqrt(.05 x .95 / 400) = 1.1%; three of those
    const limit = jointLimit(10, 0.05)
    const all = independent(77, 400 * 10 * 100)
    const isWithin = (_: unknown, k: number): boolean => {
      const found = autocorrelation(all.subarray(100 * k, 100 * (k + 1)), 1)!
      return Math.abs(found.value) <= limit * carefulError(found)
    }
    const series = Array.from({ length: 4000 }, isWithin)
    const books = Array.from({ length: 400 }, (_, k) => series.slice(10 * k, 10 * (k + 1)).every(Boolean))
    const share = books.filter(Boolean).length / 400
    expect(share).toBeGreaterThan(0.951 - 0.033)
    // a limit that lets nothing through would say nothing
    expect(share).toBeLessThan(0.995)
  })
})

describe('lagged cross-correlation', () => {
  test('finds which market follows which', () => {
    const news = independent(3, 400)
    const late = news.map((_, t) => (t === 0 ? 0 : news[t - 1]!))
    expect(laggedCrossCorrelation(news, late, 1)!.value).toBeGreaterThan(0.99)
    expect(laggedCrossCorrelation(late, news, -1)!.value).toBeGreaterThan(0.99)
    const other = laggedCrossCorrelation(news, late, -1)!
    expect(Math.abs(other.value)).toBeLessThan(other.band)
  })

  test('a history that begins late is compared over the dates it has', () => {
    const x = independent(4, 300)
    const short = x.map((value, t) => (t < 200 ? NaN : value))
    expect(laggedCrossCorrelation(x, short, 0)).toMatchObject({
      value: expect.closeTo(1, 12) as number,
      pairs: 100,
    })
    expect(laggedCrossCorrelation(x.subarray(0, 200), short.subarray(0, 200), 0)).toBeNull()
  })
})

describe('runs', () => {
  test('the earliest of the longest, ended by a gap', () => {
    expect(longestRun(Float64Array.of(0, 0, NaN, 0, 0, 1, 0))).toEqual({ start: 0, length: 2 })
    expect(longestRun(Float64Array.of(3, 7, 7, 3), 7)).toEqual({ start: 1, length: 2 })
    expect(longestRun(Float64Array.of(1, 2))).toEqual({ start: 0, length: 0 })
    expect(longestRun(Float64Array.of(1, -0, 0))).toEqual({ start: 1, length: 2 })
  })

  test('the share of observations in them leaves gaps out', () => {
    expect(shareInRuns(Float64Array.of(0, 0, NaN, 1, 0))).toBe(0.5)
    expect(shareInRuns(Float64Array.of(0, 0, NaN, 1, 0), 0, 1)).toBe(0.75)
    expect(shareInRuns(Float64Array.of(0, 0, 0, 1), 0, 4)).toBe(0)
    expect(shareInRuns(Float64Array.of(NaN))).toBe(0)
  })
})

describe('runs that become gaps', () => {
  test('are those of the length asked for or longer, in a copy', () => {
    const x = Float64Array.of(0, 0, 1, -0, 0, 0, NaN, 0, 0, 0, 0)
    expect([...withoutRuns(x, 3)]).toEqual([0, 0, 1, NaN, NaN, NaN, NaN, NaN, NaN, NaN, NaN])
    expect([...withoutRuns(x, 4)]).toEqual([0, 0, 1, -0, 0, 0, NaN, NaN, NaN, NaN, NaN])
    expect([...withoutRuns(Float64Array.of(7, 7, 0, 0), 2, 7)]).toEqual([NaN, NaN, 0, 0])
    expect(x[3]).toBe(-0)
  })
})

describe('rhythm', () => {
  const moving = (dates: readonly number[], rest = 0): Float64Array => {
    const x = new Float64Array(60).fill(rest)
    for (const t of dates) x[t] = 0.01
    return x
  }

  test('is seen in six moves, through zeros as through gaps', () => {
    expect(rhythm(moving([3, 7, 11, 15, 19, 23]))).toBe(4)
    expect(rhythm(moving([3, 7, 11, 15, 19, 23], NaN))).toBe(4)
    expect(rhythm(moving([3, 7, 11, 15, 19]))).toBeNull()
  })

  test('is kept in four of five steps', () => {
    expect(rhythm(moving([3, 7, 11, 15, 19, 24]))).toBe(4)
    expect(rhythm(moving([3, 7, 11, 15, 20, 25]))).toBeNull()
  })

  test('is none in a series that moves at every date', () => {
    expect(rhythm(independent(21, 60))).toBeNull()
    expect(rhythm(new Float64Array(60))).toBeNull()
  })
})

describe('smoothing', () => {
  test('is undone where it was put in by the same share; a gap costs the date after it as well', () => {
    const own = independent(31, 200)
    for (const rho of [0.3, 0.7, -0.4]) {
      let last = 0
      const smooth = own.map((value) => (last = (1 - rho) * value + rho * last))
      // 1e-14: a few roundings of numbers up to 0.5, divided by 1 - rho
      expect(absoluteGap(unsmoothedReturns(smooth, rho).subarray(1), own.subarray(1))).toBeLessThan(1e-14)
      smooth[50] = NaN
      const undone = unsmoothedReturns(smooth, rho)
      expect([0, 49, 50, 51, 52].map((t) => Number.isNaN(undone[t]))).toEqual([
        true,
        false,
        true,
        true,
        false,
      ])
    }
  })

  test('of a share that is the autocorrelation makes volatility smaller by its factor', () => {
    // over 200,000 dates the deviation of each is known to 0.2%, the factor to twice that
    const own = independent(32, 200_000)
    let last = 0
    const smooth = own.map((value) => (last = 0.4 * value + 0.6 * last))
    const spread = (x: Float64Array): number => Math.sqrt(x.reduce((sum, value) => sum + value * value, 0))
    expect(relativeGap(spread(own) / spread(smooth), unsmoothingFactor(0.6))).toBeLessThan(0.01)
  })
})

describe('lagged terms', () => {
  test.each([
    [2, 3],
    [4, 7],
    [4, 2],
    [12, 10],
  ])('bring back of a series shown every %i dates, with %i of them, what the model says', (every, lags) => {
    // single moves of +1 and -1, far enough apart not to meet, once at each place in a block; shown at the end of its block
    const apart = every * Math.ceil((2 * every + lags + 1) / every)
    const rows = new Float64Array(2 * 2 * every * apart)
    for (let k = 0; k < 2 * every; k++) {
      const move = k % 2 === 0 ? 1 : -1
      const start = k * apart
      rows[2 * (start + (k >> 1))] = move
      rows[2 * (start + every - 1) + 1] = move
    }
    const covariances = estimateModel(rows, rows.length / 2, 2, { kind: 'lagged', lags }).matrix()
    // 1e-14: sums of a few dozen products of exact numbers
    expect(relativeGap(shareBroughtBack(every, lags), covariances[1]! / covariances[0]!)).toBeLessThan(1e-14)
  })

  test('that suit the dates grow slowly with them', () => {
    // 4 (T/100)^(2/9): 4 at T = 100 and 4 x 2 at T = 100 x 2^(9/2) = 2262.7
    expect([0, 1, 99, 100, 2262, 2263].map(usualLags)).toEqual([0, 1, 3, 4, 7, 8])
  })
})

describe('outliers', () => {
  test('are found with their sign, past gaps, in order', () => {
    const x = independent(8, 200)
    x[17] = -9
    x[40] = NaN
    x[150] = 5
    const found = outliers(x, 10)
    expect(Array.from(found.rows)).toEqual([17, 150])
    expect(found.multiples[0]).toBeLessThan(-10)
    expect(found.multiples[1]).toBeGreaterThan(10)
    expect(found.scale!.count).toBe(199)
  })

  test('a jump in a stale series is measured against what else moves', () => {
    const stale = new Float64Array(100)
    for (const [t, value] of [0.01, -0.01, 0.02, -0.02, 0.01].entries()) stale[10 * t] = value
    stale[77] = -0.5
    expect(robustScale(stale)).toMatchObject({ median: 0, basis: 'moving' })
    expect(Array.from(outliers(stale, 8).rows)).toEqual([77])
  })

  test('there are none where nothing moves or nothing is there', () => {
    expect(outliers(Float64Array.of(2, 2, 2), 3)).toMatchObject({
      scale: { scale: 0 },
      rows: new Int32Array(0),
    })
    expect(outliers(Float64Array.of(NaN), 3)).toMatchObject({ scale: null, rows: new Int32Array(0) })
  })
})

describe('volatility without smoothing', () => {
  test('comes back from a series that was smoothed', () => {
    // 40000 independent numbers smoothed with rho 0.6: the deviation is known to about 1.5% (Bartlett); tolerance 4%
    const truth = independent(12, 40000)
    let last = 0
    const reported = truth.map((u) => (last = 0.4 * u + 0.6 * last))
    const found = unsmoothedVolatility(reported)!
    // uniform on an interval of length 1
    expect(Math.abs(found.unsmoothed! * Math.sqrt(12) - 1)).toBeLessThan(0.04)
    expect(found.volatility / found.unsmoothed!).toBeLessThan(0.52)
    expect(found.autocorrelation.value).toBeGreaterThan(found.autocorrelation.band)
  })

  test('is what scaling over many periods says (Lo 2002), by another road', () => {
    const x = Float64Array.of(1, 2, 4, 3, 5, 6, 5)
    const { factor, autocorrelation: r } = unsmoothedVolatility(x)!
    const q = 200000
    const powers = Float64Array.from({ length: 400 }, (_, k) => r.value ** (k + 1))
    // the ends of q periods miss correlation with what is beyond them: of order 1/q
    expect(scalingFactor(powers, q) / Math.sqrt(q)).toBeCloseTo(factor!, 4)
  })

  test('is not offered where returns turn back', () => {
    expect(unsmoothedVolatility(Float64Array.of(1, -1, 1, -1, 1))).toMatchObject({
      unsmoothed: null,
      factor: null,
    })
  })
})

describe('splits', () => {
  test.each([
    [2, 1],
    [3, 1],
    [3, 2],
    [4, 3],
    [5, 2],
    [10, 1],
    [100, 1],
    [1, 2],
    [1, 20],
  ])('%i new shares for %i old ones show on a day that also earned 1%', (fresh, old) => {
    expect(splitRatio((1.01 * old) / fresh - 1)).toEqual({
      fresh,
      old,
      rest: expect.closeTo(0.01, 12) as number,
    })
  })

  test('ordinary moves, and large ones between the ratios, are none', () => {
    for (const change of [0, 0.1, -0.1, 0.2, -0.2, -0.3, -0.42, -0.58, 0.7, 1.3])
      expect(splitRatio(change)).toBeNull()
    expect(splitRatio(-0.51, 0.001)).toBeNull()
    // shares are put together many for one, not four into three or three into two: common practice, no source
    for (const change of [1 / 3, 0.31, 0.5, 1.5]) expect(splitRatio(change)).toBeNull()
    expect(splitRatio(1)).toMatchObject({ fresh: 1, old: 2 })
  })
})

describe('steps between dates', () => {
  /** Business days from a Monday on. */
  const days = (count: number) => Array.from({ length: count }, (_, k) => 7 * Math.floor(k / 5) + (k % 5))

  test('working days with a holiday are daily and nothing else', () => {
    const dates = days(60).filter((_, k) => k !== 20)
    expect(frequencySteps(Float64Array.from(dates))).toMatchObject({ usual: 'daily', other: null })
  })

  test('months before days are found with their place', () => {
    const months = Array.from({ length: 12 }, (_, k) => -30 * (12 - k))
    expect(frequencySteps(Float64Array.from([...months, ...days(100)]))).toMatchObject({
      usual: 'daily',
      other: { frequency: 'monthly', start: 0, length: 12 },
    })
  })

  test('a date twice and dates out of order stand at 0 and below', () => {
    const { steps, counts } = frequencySteps(Float64Array.of(10, 11, 11, 9, 10))
    expect(Array.from(steps)).toEqual([-2, 0, 1])
    expect(Array.from(counts)).toEqual([1, 1, 2])
  })

  test.each([
    [[0, 7, 14, 21], 'weekly'],
    [[0, 31, 59, 90, 120], 'monthly'],
    [[0, 90, 181, 273], 'quarterly'],
    [[0, 365, 731], 'yearly'],
    [[0, 15, 30], 'other'],
  ])('%j are %s', (dates, usual) => {
    expect(frequencySteps(Float64Array.from(dates))).toMatchObject({ usual, other: null })
  })
})

test.each<[string, () => unknown, object]>([
  [
    'a lag of 0',
    () => autocorrelation(Float64Array.of(1, 2), 0),
    { code: 'out-of-range', where: { argument: 'lag' } },
  ],
  [
    'half a lag',
    () => laggedCrossCorrelation(Float64Array.of(1), Float64Array.of(1), 0.5),
    { code: 'out-of-range' },
  ],
  [
    'series of two lengths',
    () => laggedCrossCorrelation(Float64Array.of(1), Float64Array.of(1, 2), 0),
    { code: 'shape' },
  ],
  [
    'an infinite return',
    () => autocorrelation(Float64Array.of(1, 2, Infinity), 1),
    { code: 'not-a-number', where: { argument: 'returns', row: 2 } },
  ],
  ['the same in a scale', () => robustScale(Float64Array.of(-Infinity)), { code: 'not-a-number' }],
  [
    'a multiple of 0',
    () => outliers(Float64Array.of(1, 2), 0),
    { code: 'out-of-range', where: { argument: 'multiple' } },
  ],
  [
    'no period',
    () => scalingFactor(Float64Array.of(0.1), 0),
    { code: 'out-of-range', where: { argument: 'periods' } },
  ],
  [
    'an autocorrelation beyond 1',
    () => scalingFactor(Float64Array.of(0.1, 1.1), 12),
    { code: 'out-of-range', where: { argument: 'autocorrelations', row: 1 } },
  ],
  [
    'autocorrelations no series can have',
    () => scalingFactor(Float64Array.of(-0.9), 12),
    { code: 'negative-variance' },
  ],
  ['no estimate at all', () => jointLimit(0, 0.01), { code: 'out-of-range', where: { argument: 'count' } }],
  ['a chance of 0', () => jointLimit(5, 0), { code: 'out-of-range', where: { argument: 'chance' } }],
  ['a chance of 1', () => jointLimit(5, 1), { code: 'out-of-range', where: { argument: 'chance' } }],
  [
    'smoothing that keeps all of the last return',
    () => unsmoothedReturns(Float64Array.of(0.1, 0.2), 1),
    { code: 'out-of-range', where: { argument: 'rho' } },
  ],
  ['the factor of such smoothing', () => unsmoothingFactor(-1), { code: 'out-of-range' }],
  [
    'a series shown every 0 dates',
    () => shareBroughtBack(0, 2),
    { code: 'out-of-range', where: { argument: 'every' } },
  ],
  ['half a lag', () => shareBroughtBack(2, 0.5), { code: 'out-of-range', where: { argument: 'lags' } }],
  ['a price of 0', () => splitRatio(-1), { code: 'out-of-range', where: { argument: 'change' } }],
  [
    'a tolerance below 0',
    () => splitRatio(0, -1),
    { code: 'out-of-range', where: { argument: 'tolerance' } },
  ],
  [
    'a single date',
    () => frequencySteps(Float64Array.of(1)),
    { code: 'too-few', where: { argument: 'dates' } },
  ],
  [
    'a date that is none',
    () => frequencySteps(Float64Array.of(1, NaN)),
    { code: 'not-a-number', where: { argument: 'dates', row: 1 } },
  ],
])('refuses %s', (_name, attempt, fault) => {
  expect(attempt).toThrow(expect.objectContaining(fault))
})

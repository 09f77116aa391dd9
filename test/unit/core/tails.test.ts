import {
  decompose,
  type Fault,
  fitStudent,
  inCornishFisherDomain,
  jarqueBera,
  mardia,
  matrixModel,
  momentsOf,
  returnsModel,
  tailRisk,
  type ReturnsModel,
  type RiskModel,
  type TailMethod,
} from '../../../src/core'
import { faultOf } from '../../fault-of'
import { relativeGap } from '../../closeness'
import { generatedReturns } from '../../reference/data'

const normal: TailMethod = { kind: 'normal' }
const fitted: TailMethod = { kind: 'student', degrees: null }
const historical: TailMethod = { kind: 'historical' }
const cornishFisher: TailMethod = { kind: 'cornish-fisher' }

const series = (...values: number[]) => returnsModel(Float64Array.from(values), values.length, 1)
const at = (
  model: RiskModel,
  method: TailMethod,
  {
    confidence = 0.95,
    periods = 1,
    weights = [1],
    history = null,
  }: { confidence?: number; periods?: number; weights?: number[]; history?: ReturnsModel | null } = {},
) => tailRisk(model, Float64Array.from(weights), { method, confidence, periods }, history)
const ofHistory = (model: ReturnsModel, method: TailMethod, more = {}) =>
  at(model, method, { history: model, ...more })

const unit = matrixModel(Float64Array.of(1), 1)
const ordinary = series(-0.03, -0.02, -0.01, 0, 0.01, 0.02, 0.03, 0.06)

describe('a fault is raised for', () => {
  const cases: [string, () => unknown, Partial<Fault>][] = [
    ...[0.5, 1, 0, 95, NaN, -0.99].map((confidence): (typeof cases)[number] => [
      `a confidence of ${confidence}`,
      () => at(unit, normal, { confidence }),
      { code: 'out-of-range', found: `confidence: ${confidence}`, where: { argument: 'confidence' } },
    ]),
    [
      'a confidence that leaves no tail of dates',
      () => ofHistory(ordinary, historical, { confidence: 1 - 1e-12 }),
      { code: 'out-of-range', where: { argument: 'confidence' } },
    ],
    ...[0, -1, NaN, Infinity].map((periods): (typeof cases)[number] => [
      `${periods} periods`,
      () => at(unit, normal, { periods }),
      { code: 'out-of-range', found: `periods: ${periods}`, where: { argument: 'periods' } },
    ]),
    ...[historical, cornishFisher].map((method): (typeof cases)[number] => [
      `ten periods of ${method.kind}`,
      () => ofHistory(ordinary, method, { periods: 10 }),
      { code: 'out-of-range', found: `periods: 10 for “${method.kind}”`, where: { argument: 'periods' } },
    ]),
    ...[2, 0, -5, NaN].map((degrees): (typeof cases)[number] => [
      `${degrees} degrees of freedom`,
      () => at(unit, { kind: 'student', degrees }),
      { code: 'out-of-range', found: `method: ${degrees} degrees of freedom`, where: { argument: 'method' } },
    ]),
    ...[historical, cornishFisher, fitted].map((method): (typeof cases)[number] => [
      `${method.kind} without returns`,
      () => at(unit, method),
      {
        code: 'unknown-choice',
        found: `method: “${method.kind}” without returns`,
        where: { argument: 'method' },
      },
    ]),
    [
      'returns of other positions than the model has',
      () => at(unit, historical, { history: returnsModel(Float64Array.of(1, 2, 3, 4), 2, 2) }),
      { code: 'shape', found: 'risk: returns of 2 positions', where: { argument: 'risk' } },
    ],
    [
      'a series whose likeliest Student t has no volatility',
      // a Cauchy sample: tangents of evenly spaced angles
      () =>
        ofHistory(
          series(...Array.from({ length: 99 }, (_, k) => Math.tan(Math.PI * ((k + 1) / 100 - 0.5)))),
          fitted,
        ),
      { code: 'out-of-range', where: { argument: 'method' } },
    ],
    [
      'a series most of which is one number',
      () =>
        ofHistory(series(...Array.from({ length: 60 }, (_, k) => (k % 10 === 0 ? k / 100 : 0.01))), fitted),
      { code: 'out-of-range', where: { argument: 'method' } },
    ],
    [
      'a shape outside the domain of Cornish-Fisher',
      () => ofHistory(series(-0.4, ...Array.from({ length: 40 }, (_, k) => (k % 2) / 100)), cornishFisher),
      { code: 'out-of-range', where: { argument: 'method' } },
    ],
    [
      'tails thinner than normal, which lie outside that domain as well',
      () => ofHistory(series(-0.01, 0.01, -0.01, 0.01), cornishFisher),
      { code: 'out-of-range', found: expect.stringContaining('excess kurtosis -2.00') as unknown as string },
    ],
    [
      'a fit to returns that never move',
      () => at(unit, fitted, { history: series(0.01, 0.01, 0.01) }),
      { code: 'zero-risk', where: { argument: 'risk' } },
    ],
    [
      'weights of another number than positions',
      () => at(unit, normal, { weights: [1, 2] }),
      { code: 'shape', where: { argument: 'weights' } },
    ],
  ]
  it.each(cases)('%s', (_name, work, expected) => {
    expect(faultOf(work)).toMatchObject(expected)
  })
})

describe('the historical tail', () => {
  // losses 1..T in mixed order, so that the k-th largest is T + 1 - k
  const ladder = (T: number) => series(...Array.from({ length: T }, (_, t) => -(((t * 13) % T) + 1)))

  it.each([
    [500, 0.95, 25],
    [400, 0.9, 40],
    [700, 0.99, 7],
    [1000, 0.93, 70],
    [250, 0.99, 3],
    [250, 0.975, 7],
    [60, 0.99, 1],
  ])(
    'of %d dates at %d begins at the loss number %d, in decimals rather than in binary',
    (T, confidence, k) => {
      // counted by hand: T x (1 - confidence), rounded up
      const t = ofHistory(ladder(T), historical, { confidence })
      expect(relativeGap(t.valueAtRisk, T + 1 - k)).toBeLessThan(1e-14)
    },
  )

  it('lets dates that tie at the cut share what weight is left', () => {
    // losses 4, 3, 3, 3, 0 .. at T = 10, confidence 0.8: T p = 2, so 4 counts once and the three 3s a third each, by hand
    const returns = [-4, 0, -1, -2, -2, -1, -3, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0]
    const model = returnsModel(Float64Array.from(returns), 10, 2)
    const t = ofHistory(model, historical, { confidence: 0.8, weights: [1, 1] })
    expect(t.valueAtRisk).toBeCloseTo(3, 14)
    expect(t.shortfall).toBeCloseTo(3.5, 14)
    // the tied dates lose (1, 2), (2, 1) and (3, 0)
    expect(t.parts![0]).toBeCloseTo((4 + (1 + 2 + 3) / 3) / 2, 14)
    expect(t.parts![1]).toBeCloseTo((2 + 1 + 0) / 3 / 2, 14)
    expect(t.tailObservations).toBe(2)
  })

  it('keeps the mean, and every date counts alike under exponential weights', () => {
    const values = Float64Array.from({ length: 40 }, (_, t) => 0.01 + Math.sin(t * t) / 50)
    const sample = returnsModel(values, 40, 1)
    const weighted = returnsModel(values, 40, 1, { kind: 'exponential', decay: 0.9 })
    const [a, b] = [sample, weighted].map((model) => ofHistory(model, historical, { confidence: 0.9 })) as [
      ReturnType<typeof at>,
      ReturnType<typeof at>,
    ]
    // the fourth largest loss of forty, found by sorting
    const fourth = Float64Array.from(values, (r) => -r).sort()[36]!
    expect(relativeGap(a.valueAtRisk, fourth)).toBeLessThan(1e-14)
    expect(relativeGap(b.valueAtRisk, fourth)).toBeLessThan(1e-14)
    expect(relativeGap(b.shortfall!, a.shortfall!)).toBeLessThan(1e-14)
  })

  it('has no shares where even its worst dates gained', () => {
    const t = ofHistory(series(0.01, 0.02, 0.03, 0.04), historical, { confidence: 0.75 })
    expect(t.valueAtRisk).toBeCloseTo(-0.01, 15)
    expect(t.shares).toBeNull()
    expect(t.parts).not.toBeNull()
  })
})

describe('the parametric tails', () => {
  it('grow with the square root of the periods', () => {
    for (const method of [normal, { kind: 'student', degrees: 5 } as const]) {
      const [one, ten] = [1, 10].map((periods) => at(unit, method, { periods })) as [
        ReturnType<typeof at>,
        ReturnType<typeof at>,
      ]
      expect(relativeGap(ten.valueAtRisk, Math.sqrt(10) * one.valueAtRisk)).toBeLessThan(1e-15)
      expect(relativeGap(ten.shortfall!, Math.sqrt(10) * one.shortfall!)).toBeLessThan(1e-15)
      expect(
        relativeGap(
          ten.parts!,
          one.parts!.map((part) => Math.sqrt(10) * part),
        ),
      ).toBeLessThan(1e-15)
    }
  })

  it('of Student’s t become normal as its degrees of freedom grow, from above', () => {
    const gaps = [10, 100, 1e4, 1e6, 1e9].map(
      (degrees) =>
        at(unit, { kind: 'student', degrees }, { confidence: 0.99 }).shortfall! /
          at(unit, normal, { confidence: 0.99 }).shortfall! -
        1,
    )
    gaps.reduce((larger, smaller) => (expect(smaller).toBeLessThan(larger), smaller))
    // the gap falls as 1/degrees; at 1e9 it is below 1e-8
    expect(Math.abs(gaps.at(-1)!)).toBeLessThan(1e-8)
    expect(at(unit, { kind: 'student', degrees: Infinity }).valueAtRisk).toBe(at(unit, normal).valueAtRisk)
  })

  it('of a fit are normal, and say so, where no tail is fatter', () => {
    const model = series(...Array.from({ length: 50 }, (_, k) => (k % 5) / 100))
    const t = ofHistory(model, fitted)
    expect(t.degrees).toBe(Infinity)
    expect(t.valueAtRisk).toBe(ofHistory(model, normal).valueAtRisk)
  })

  it('are nothing without risk, and nothing is shared', () => {
    const still = returnsModel(Float64Array.of(0.01, 0.02, 0.01, 0.02), 2, 2)
    for (const method of [normal, fitted, cornishFisher, { kind: 'student', degrees: 4 } as const]) {
      const t = ofHistory(still, method, { weights: [1, 1] })
      expect([t.valueAtRisk, t.shares]).toEqual([0, null])
      expect(t.shortfall ?? 0).toBe(0)
    }
    // historical knows the mean: a riskless gain of 3% is a loss of -3%
    expect(ofHistory(still, historical, { weights: [1, 1] }).valueAtRisk).toBeCloseTo(-0.03, 15)
  })

  it('take the volatility from the model and the shape from the returns', () => {
    const { returns } = generatedReturns(11, 3, 300)
    const sample = returnsModel(returns, 300, 3)
    const weighted = returnsModel(returns, 300, 3, { kind: 'exponential', decay: 0.97 })
    const weights = [0.5, 0.3, 0.2]
    const volatility = (model: RiskModel) => decompose(model, Float64Array.from(weights)).volatility
    for (const method of [fitted, cornishFisher]) {
      const [a, b] = [sample, weighted].map((model) => at(model, method, { weights, history: sample })) as [
        ReturnType<typeof at>,
        ReturnType<typeof at>,
      ]
      expect(
        relativeGap(a.valueAtRisk / volatility(sample), b.valueAtRisk / volatility(weighted)),
      ).toBeLessThan(1e-14)
    }
  })
})

describe('the fit of Student’s t', () => {
  // quantiles of Student's t with 4 degrees of freedom have a closed form: 2 sign(p - 1/2) sqrt(q - 1), q = cos(arccos(sqrt a) / 3) / sqrt a,
  // a = 4 p (1 - p) (Shaw 2006, Journal of Computational Finance 9(4), from memory)
  const quantile4 = (p: number) => {
    const a = 4 * p * (1 - p)
    const q = Math.cos(Math.acos(Math.sqrt(a)) / 3) / Math.sqrt(a)
    return 2 * Math.sign(p - 0.5) * Math.sqrt(q - 1)
  }

  it('finds what evenly spaced quantiles were made with', () => {
    const values = Float64Array.from({ length: 4000 }, (_, k) => 0.01 + 0.02 * quantile4((k + 0.5) / 4000))
    const fit = fitStudent(values)!
    // such a sample lacks the outermost tails: within 2% of degrees and half a percent of scale
    expect(Math.abs(fit.degrees - 4)).toBeLessThan(0.08)
    expect(Math.abs(fit.location - 0.01)).toBeLessThan(1e-10)
    expect(relativeGap(fit.scale, 0.02)).toBeLessThan(0.005)
  })

  it('is at the top: moving anything lowers the likelihood', () => {
    const values = generatedReturns(5, 1, 250).returns
    const fit = fitStudent(values)!
    // the density as any text prints it, with gamma functions by Stirling's series
    const logGamma = (x: number): number =>
      x < 12
        ? logGamma(x + 1) - Math.log(x)
        : (x - 0.5) * Math.log(x) - x + 0.5 * Math.log(2 * Math.PI) + 1 / (12 * x) - 1 / (360 * x ** 3)
    const likelihood = (v: number, location: number, scale: number) =>
      values.reduce(
        (sum, x) =>
          sum +
          logGamma((v + 1) / 2) -
          logGamma(v / 2) -
          0.5 * Math.log(v * Math.PI) -
          Math.log(scale) -
          ((v + 1) / 2) * Math.log(1 + ((x - location) / scale) ** 2 / v),
        0,
      )
    const top = likelihood(fit.degrees, fit.location, fit.scale)
    // Stirling's series is good to 1/(1260 12^5) = 3e-9 a term
    expect(Math.abs(top - fit.logLikelihood)).toBeLessThan(250 * 2 * 3e-9)
    for (const step of [0.99, 1.01]) {
      expect(likelihood(fit.degrees * step, fit.location, fit.scale)).toBeLessThan(top)
      expect(likelihood(fit.degrees, fit.location, fit.scale * step)).toBeLessThan(top)
      expect(likelihood(fit.degrees, fit.location + (step - 1) * fit.scale, fit.scale)).toBeLessThan(top)
    }
  })
})

describe('moments', () => {
  it('keep their digits on a large constant', () => {
    const small = momentsOf(Float64Array.of(-2, -1, 0, 1, 7))
    const raised = momentsOf(Float64Array.of(-2, -1, 0, 1, 7).map((x) => x + 2 ** 40))
    expect(raised.skewness).toBeCloseTo(small.skewness!, 12)
    expect(raised.variance).toBeCloseTo(small.variance, 12)
  })

  it('have no shape where the spread is rounding', () => {
    expect(momentsOf(Float64Array.of(0.1, 0.1 + 2 ** -56, 0.1))).toMatchObject({
      variance: 0,
      skewness: null,
      excessKurtosis: null,
    })
  })
})

describe('the domain of Cornish-Fisher', () => {
  it('is where the expansion rises, seen by walking along it', () => {
    // dx/dz = 1 + z S/3 + (3z^2 - 3) K/24 - (6z^2 - 5) S^2/36, term by term from the expansion
    const slope = (z: number, S: number, K: number) =>
      1 + (z * S) / 3 + ((3 * z * z - 3) * K) / 24 - ((6 * z * z - 5) * S * S) / 36
    // near 0 in small steps, where a dip may be narrow, then on and on in ever larger ones
    const walk = Array.from({ length: 2001 }, (_, k) => k / 100)
    for (let z = 20; z < 1e4; z *= 1.05) walk.push(z)
    const rises = (S: number, K: number) =>
      walk.every((z) => slope(z, S, K) >= -1e-9 && slope(-z, S, K) >= -1e-9)
    for (let S = -2.6; S <= 2.6; S += 0.26)
      for (let K = -1; K <= 12; K += 0.77)
        expect([S, K, inCornishFisherDomain(S, K)]).toEqual([S, K, rises(S, K)])
    // so skewed that the slope is negative throughout, where its discriminant alone would let it pass
    expect([inCornishFisherDomain(20, 493), rises(20, 493)]).toEqual([false, false])
  })
})

test('the largest loss of too short a history has no standard error', () => {
  const model = series(-0.04, -0.01, 0.02, 0.03, 0.01)
  // T p = 5 x 0.2 = 1 and 5 x 0.1 = 0.5, by hand
  expect(ofHistory(model, historical, { confidence: 0.8 })).toMatchObject({ valueAtRisk: 0.04 })
  expect(ofHistory(model, historical, { confidence: 0.8 }).standardError).toBeGreaterThan(0)
  expect(ofHistory(model, historical, { confidence: 0.9 })).toMatchObject({
    valueAtRisk: 0.04,
    standardError: null,
  })
})

describe('the verdict on normality', () => {
  const verdict = (...values: number[]) => jarqueBera(Float64Array.from(values)).verdict
  const spread = Array.from({ length: 200 }, (_, k) => k - 99.5)

  it.each([
    ['heavy-tailed', [...spread.map((x) => x / 100), 30, -30]],
    ['light-tailed', spread.map(Math.sign)],
    ['skewed-to-losses', spread.map((x) => -Math.exp(x / 100))],
    ['skewed-to-gains', spread.map((x) => Math.exp(x / 100))],
    ['consistent', [-2, -1, -1, 0, 0, 0, 1, 1, 2]],
    ['not-tested', [3, 3, 3]],
  ])('on one series can be %s', (expected, values) => {
    expect(verdict(...values)).toBe(expected)
  })

  const block = (model: ReturnsModel) => {
    const run = mardia(model)
    let step = run.next()
    const shares: number[] = []
    while (!step.done) {
      shares.push(step.value)
      step = run.next()
    }
    return { result: step.value, shares }
  }

  it('on a block leaves positions that never move aside, and names the first that others give', () => {
    const rows = Array.from({ length: 30 }, (_, t) => [Math.sin(t), 0.02, Math.cos(3 * t), 0])
    const still = returnsModel(Float64Array.from(rows.flat()), 30, 4)
    const moving = returnsModel(Float64Array.from(rows.flatMap(([a, , c]) => [a!, c!])), 30, 2)
    expect(block(still).result).toEqual(block(moving).result)
    expect(block(still).result.size).toBe(2)

    const sums = rows.map(([a, , c]) => [a!, 0.01, c!, 2 * a! - c!])
    expect(block(returnsModel(Float64Array.from(sums.flat()), 30, 4)).result).toMatchObject({
      verdict: 'dependent-positions',
      dependent: 3,
      skewness: null,
    })
  })

  it('is asymmetric where one side is longer without heavy tails', () => {
    // a triangle falling to one side: excess kurtosis -0.6, skewness 0.57 (any text on the triangular distribution)
    const triangle = Array.from({ length: 150 }, (_, k) => 1 - Math.sqrt(1 - (k + 0.5) / 150))
    expect(block(series(...triangle)).result.verdict).toBe('asymmetric')
    expect(
      block(series(...Array.from({ length: 150 }, (_, k) => Math.tan((k - 75) / 48.5)))).result.verdict,
    ).toBe('heavy-tailed')
  })

  it('on one position alone has the skewness squared and the kurtosis of its series', () => {
    const values = generatedReturns(3, 1, 120).returns
    const { skewness, excessKurtosis } = momentsOf(values)
    const { result } = block(returnsModel(values, 120, 1))
    expect(relativeGap(result.skewness!, skewness! ** 2)).toBeLessThan(1e-12)
    expect(relativeGap(result.kurtosis!, excessKurtosis! + 3)).toBeLessThan(1e-13)
  })

  // Mean 3 (T-1)/(T+1) and variance 24 T (T-2)(T-3) / ((T+1)^2 (T+3)(T+5)) of the kurtosis of T normal numbers: D'Agostino, Belanger &
  // D'Agostino (1990), The American Statistician 44(4) (from memory). Tolerance 1e-12: the kurtosis itself is good to 1e-13.
  it('on one position measures its kurtosis by the moments that of so many normal numbers has', () => {
    const T = 120
    const values = generatedReturns(3, 1, T).returns
    const variance = (24 * T * (T - 2) * (T - 3)) / ((T + 1) ** 2 * (T + 3) * (T + 5))
    const expected = (momentsOf(values).excessKurtosis! + 3 - (3 * (T - 1)) / (T + 1)) / Math.sqrt(variance)
    const { result } = block(returnsModel(values, T, 1))
    expect(relativeGap(result.exactKurtosisStatistic!, expected)).toBeLessThan(1e-12)
  })

  it('has nothing to say of the tails where one date more than positions leaves them no choice', () => {
    const { result } = block(returnsModel(generatedReturns(4, 5, 6).returns, 6, 5))
    // S^-1 distances are all T - 1 then (algebra); tolerance for a factor of five columns
    expect(relativeGap(result.kurtosis!, 25)).toBeLessThan(1e-9)
    expect(result).toMatchObject({ exactKurtosisStatistic: 0, exactKurtosisPValue: 1 })
    expect(result.verdict).not.toBe('light-tailed')
  })

  // At 5% a right test rejects 3 of 60 normal blocks; 9 or more has a probability of 0.003 (binomial). Sums of twelve uniform numbers, made
  // by Park & Miller's generator, stand for normal ones: their excess kurtosis of -0.1 is far below what 80 dates can show.
  it('seldom calls normal returns light-tailed, however many positions there are', () => {
    let x = 20261201
    const uniform = () => (x = (16807 * x) % 2147483647) / 2147483647
    const normals = (count: number) =>
      Float64Array.from({ length: count }, () => {
        let sum = -6
        for (let k = 0; k < 12; k++) sum += uniform()
        return sum
      })
    let rejected = 0
    let rejectedByLongSeries = 0
    for (let k = 0; k < 60; k++) {
      const { result } = block(returnsModel(normals(80 * 20), 80, 20))
      if (result.verdict === 'light-tailed' || result.verdict === 'heavy-tailed') rejected++
      if (result.kurtosisPValue! < 0.05) rejectedByLongSeries++
    }
    expect(rejected).toBeLessThan(9)
    // what the verdict was spared
    expect(rejectedByLongSeries).toBeGreaterThan(20)
  })

  it('on a large block comes with shares of the work done, rising to 1', () => {
    const { shares } = block(returnsModel(generatedReturns(9, 150, 400).returns, 400, 150))
    expect(shares.length).toBeGreaterThan(1)
    expect(shares.every((share, k) => share > (shares[k - 1] ?? 0) && share <= 1)).toBe(true)
  })
})

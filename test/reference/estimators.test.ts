import {
  conditionOf,
  correlation,
  decompose,
  estimateModel,
  factorModel,
  inOneGo,
  logReturns,
  matrixModel,
  returnsModel,
  simpleReturns,
  type Estimator,
  type ShrinkageTarget,
} from '../../src/core'
import { absoluteGap, relativeGap } from '../closeness'
import { generatedReturns, readCsv, readJson } from './data'

// Expected: computed with numpy 1.24.2, scikit-learn 1.2.1 and statsmodels 0.13.5, and a second time with R 4.2.2; see README.md beside
// this file. Tolerance: 1e-11 relative to the largest entry, as README.md says.
const tolerance = 1e-11

interface Figure {
  readonly value: number & number[] & number[][]
  readonly digest?: {
    readonly trace: number
    readonly sum: number
    readonly frobenius: number
    readonly diag: number[]
    readonly row_0: number[]
    readonly row_last: number[]
  }
}
interface ComputedSet {
  readonly about: {
    readonly T: number
    readonly n: number
    readonly weights: Record<'long' | 'longshort', number[]>
    readonly generator?: { readonly seed: number }
  }
  readonly estimators: Record<string, Figure>
  readonly factor_model?: Record<string, Figure>
  readonly portfolios: Record<'long' | 'longshort', { readonly by_estimator: Record<string, Figure> }>
}

const closes = () => {
  const { names, rows } = readCsv('eustockmarkets_close.csv')
  const first = names.indexOf('DAX')
  return Float64Array.from(rows.flatMap((row) => row.slice(first, first + 4)))
}
const generated = ({ about }: ComputedSet) => generatedReturns(about.generator!.seed, about.n, about.T)

const sets: [string, (set: ComputedSet) => Float64Array][] = [
  ['eu_log.json', () => logReturns(closes(), 1860, 4)],
  ['eu_simple.json', () => simpleReturns(closes(), 1860, 4)],
  ['lcg60.json', (set) => generated(set).returns],
  ['lcg120.json', (set) => generated(set).returns],
]

/** A matrix with what is given of the expected one: all of it, or its digest. */
function expectMatrix(matrix: Float64Array, n: number, expected: Figure) {
  if (!expected.digest) return expect(relativeGap(matrix, expected.value.flat())).toBeLessThan(tolerance)
  const { trace, sum, frobenius, diag, row_0, row_last } = expected.digest
  const total = (values: Float64Array) => values.reduce((a, x) => a + x, 0)
  const diagonal = Float64Array.from({ length: n }, (_, i) => matrix[i * (n + 1)]!)
  for (const [actual, figure] of [
    [diagonal, diag],
    [matrix.subarray(0, n), row_0],
    [matrix.subarray(n * (n - 1)), row_last],
    [total(diagonal), trace],
    [total(matrix), sum],
    [Math.sqrt(total(matrix.map((c) => c * c))), frobenius],
  ] as const)
    expect(relativeGap(actual, figure)).toBeLessThan(tolerance)
}

describe.each(sets)('%s', (name, returnsOf) => {
  const set = readJson<ComputedSet>(name)
  const { T, n, weights } = set.about
  const returns = returnsOf(set)
  const of = (estimator: Estimator) => estimateModel(returns, T, n, estimator)
  const expected = (figure: string) => set.estimators[figure]!

  test('divisor T', () => {
    expectMatrix(of({ kind: 'population' }).matrix(), n, expected('cov_mle'))
  })

  test.each<[ShrinkageTarget, string]>([
    ['identity', 'lw_identity'],
    ['correlation', 'lw_constcorr'],
  ])(
    'shrinkage toward “%s”: intensity, covariances, condition, and the risk of both portfolios',
    (target, key) => {
      const model = of({ kind: 'shrinkage', target })
      expect(relativeGap(model.shrinkage!.intensity, expected(`${key}_shrinkage`).value)).toBeLessThan(
        tolerance,
      )
      expectMatrix(model.matrix(), n, expected(`${key}_cov`))
      // a quotient by the smallest eigenvalue: good to its digits less those of the quotient, which is up to 8e2
      expect(relativeGap(inOneGo(conditionOf(model)).condition!, expected(`${key}_cond`).value)).toBeLessThan(
        1e-10,
      )
      for (const kind of ['long', 'longshort'] as const) {
        const figures = set.portfolios[kind].by_estimator
        const d = decompose(model, Float64Array.from(weights[kind]))
        expect(relativeGap(d.volatility, figures[`vol__${key}_cov`]!.value)).toBeLessThan(tolerance)
        expect(relativeGap(d.contribution, figures[`rc__${key}_cov`]!.value)).toBeLessThan(tolerance)
      }
    },
  )

  test('the mean correlation that shrinkage draws toward', () => {
    const { shrinkage } = of({ kind: 'shrinkage', target: 'correlation' })
    // absolute: correlations are of size 1
    expect(absoluteGap(shrinkage!.meanCorrelation, expected('lw_constcorr_rbar').value)).toBeLessThan(
      tolerance,
    )
  })

  test('shrinkage by “oas”, the article’s intensity', () => {
    const model = of({ kind: 'shrinkage', target: 'oas' })
    const intensity = expected('oas_article_shrinkage').value
    expect(relativeGap(model.shrinkage!.intensity, intensity)).toBeLessThan(tolerance)
    // the set holds this covariance for the library's intensity (without the 2/n) alone: both lie on the line from S to mu I
    const S = expected('cov_mle')
    const diagonal = S.digest?.diag ?? (S.value as number[][]).map((row, i) => row[i]!)
    const mu = diagonal.reduce((a, s) => a + s, 0) / n
    expect(
      relativeGap(
        model.variances(),
        diagonal.map((s) => (1 - intensity) * s + intensity * mu),
      ),
    ).toBeLessThan(tolerance)
    const first = (S.digest?.row_0 ?? (S.value as number[][])[0]!).map(
      (s, j) => (1 - intensity) * s + (j === 0 ? intensity * mu : 0),
    )
    expect(relativeGap(model.matrix().subarray(0, n), first)).toBeLessThan(tolerance)
  })

  test('the condition number and the extreme eigenvalues of the sample', () => {
    const c = inOneGo(conditionOf(of({ kind: 'sample' })))
    if (T - 1 < n) return expect(c.condition).toBe(Infinity)
    const eigenvalues = expected('eig').value
    expect(relativeGap(c.condition!, expected('cond_sample').value)).toBeLessThan(1e-10)
    expect(relativeGap(c.largest!, eigenvalues[0]!)).toBeLessThan(tolerance)
    expect(Math.abs(c.smallest - eigenvalues.at(-1)!)).toBeLessThan(1e-14 * c.largest!)
    expect(c.rank).toBe(n)
  })
})

describe.each([
  [
    'eu_log.json',
    () => {
      // DAX, SMI, CAC on FTSE of the date and of the date before (about.factor_model)
      const all = logReturns(closes(), 1860, 4)
      const at = (t: number, j: number) => all[t * 4 + j]!
      const T = 1858
      return {
        T,
        n: 3,
        k: 2,
        returns: Float64Array.from({ length: T * 3 }, (_, p) => at(Math.floor(p / 3) + 1, p % 3)),
        factors: Float64Array.from({ length: T * 2 }, (_, p) => at(Math.floor(p / 2) + 1 - (p % 2), 3)),
      }
    },
  ],
  ['lcg60.json', (set: ComputedSet) => ({ T: 500, n: 60, k: 3, ...generated(set) })],
] as const)('the factor model of %s', (name, read) => {
  const set = readJson<ComputedSet>(name)
  const { T, n, k, returns, factors } = read(set)
  const model = factorModel(returns, T, n, factors, k)
  const withIntercepts = (first: Float64Array, others: Float64Array) =>
    Array.from(first).flatMap((x, i) => [x, ...others.subarray(i * k, (i + 1) * k)])

  test.each<[string, ArrayLike<number>]>([
    ['fac_alpha', model.intercepts],
    ['fac_beta', model.exposures],
    ['fac_se', withIntercepts(model.interceptErrors, model.exposureErrors)],
    [
      'fac_t',
      withIntercepts(
        model.intercepts.map((a, i) => a / model.interceptErrors[i]!),
        model.exposures.map((b, i) => b / model.exposureErrors[i]!),
      ),
    ],
    ['fac_r2', model.rSquared],
    ['fac_adj_r2', model.adjustedRSquared],
    ['fac_resid_sd', model.specificVariances.map(Math.sqrt)],
    ['fac_cov', model.factorCovariance],
  ])('%s', (figure, actual) => {
    expect(relativeGap(actual, set.factor_model![figure]!.value.flat())).toBeLessThan(tolerance)
  })
})

describe('NIST StRD linear regression (certified values, read in the test suites of libraries that quote them)', () => {
  interface Certified {
    readonly data: { readonly y: string[]; readonly x: string[][]; readonly model: string }
    readonly exact: {
      readonly coef: string[]
      readonly se: string[]
      readonly residual_sd: string
      readonly r_squared: string
    }
  }
  const { sets: problems } = readJson<{ readonly sets: Record<string, Certified> }>('nist_regression.json')

  /**
   * Significant digits asked for: what a decomposition by reflections attains in doubles, less one (nist_regression.json, `qr_min_digits`).
   * The exact values are those of the printed data in arithmetic of 50 digits, which agree with the certified ones to all of theirs.
   */
  const digits: Record<string, number> = {
    Norris: 11,
    Pontius: 11,
    Longley: 10,
    Filip: 6.5,
    Wampler1: 8,
    Wampler2: 12,
    Wampler3: 8,
    Wampler4: 7,
    Wampler5: 5,
  }

  test('are all here', () => {
    expect(Object.keys(problems).sort()).toEqual(Object.keys(digits).sort())
  })

  test.each(Object.entries(digits))('%s, to %d digits', (name, wanted) => {
    const { data, exact } = problems[name]!
    const y = Float64Array.from(data.y, Number)
    const k = exact.coef.length - 1
    // one column is the variable of a polynomial of degree k
    const x = data.x.map((row) =>
      row.length === k ? row.map(Number) : Array.from({ length: k }, (_, j) => Number(row[0]) ** (j + 1)),
    )
    const model = factorModel(y, y.length, 1, Float64Array.from(x.flat()), k)
    const near = (actual: number, certified: string, scale = Math.abs(Number(certified))) =>
      expect(Math.abs(actual - Number(certified))).toBeLessThanOrEqual(10 ** -wanted * scale)
    const coefficients = [model.intercepts[0]!, ...model.exposures]
    coefficients.forEach((b, j) => near(b, exact.coef[j]!))
    // where the fit is exact (Wampler 1 and 2) errors are 0 beside the coefficients
    const errors = [model.interceptErrors[0]!, ...model.exposureErrors]
    errors.forEach((e, j) => near(e, exact.se[j]!, Number(exact.se[j]) || Math.abs(coefficients[j]!)))
    near(Math.sqrt(model.specificVariances[0]!), exact.residual_sd, Number(exact.residual_sd) || 1)
    near(model.rSquared[0]!, exact.r_squared)
  })
})

describe('as published', () => {
  interface Check {
    readonly id: string
    readonly citation: string
    readonly status: 'read' | 'memory'
    readonly inputs: unknown
    readonly outputs: Record<string, unknown>
    readonly tolerance: Record<string, number>
  }
  const { checks } = readJson<{ readonly checks: readonly Check[] }>('published.json')
  function example<I, O>(
    id: string,
    compare: (inputs: I, outputs: O, tolerance: Record<string, number>) => void,
  ) {
    const check = checks.find((entry) => entry.id === id)!
    test(`${id}: ${check.citation} (${check.status})`, () =>
      compare(check.inputs as I, check.outputs as O, check.tolerance))
  }
  const shrunk = (X: number[][], target: ShrinkageTarget) =>
    estimateModel(Float64Array.from(X.flat()), X.length, X[0]!.length, { kind: 'shrinkage', target })
      .shrinkage!

  example<{ X: number[][] }, { shrinkage: number }>('ledoit-wolf-2004-identity', ({ X }, outputs, within) => {
    expect(absoluteGap(shrunk(X, 'identity').intensity, outputs.shrinkage)).toBeLessThan(within['shrinkage']!)
  })

  example<{ X: number[][] }, { paper: number }>('oas-2010-eq23', ({ X }, outputs, within) => {
    expect(absoluteGap(shrunk(X, 'oas').intensity, outputs.paper)).toBeLessThan(within['paper']!)
  })

  example<{ x: number[]; m: number }, { weights: number[]; lrv: number; lrv_m2: number }>(
    'newey-west-weights',
    ({ x, m }, outputs, within) => {
      const lagged = (returns: ArrayLike<number>, size: number, lags: number) =>
        estimateModel(Float64Array.from(returns), returns.length / size, size, { kind: 'lagged', lags })
      expect(absoluteGap(lagged(x, 1, m).variances(), outputs.lrv)).toBeLessThan(within['lrv']!)
      expect(absoluteGap(lagged(x, 1, 2).variances(), outputs.lrv_m2)).toBeLessThan(within['lrv_m2']!)
      // a shock and its reverse, and the same k dates later: all they have in common is the lag's weight
      const weights = outputs.weights.map((_, lag) => {
        const block = new Float64Array(200)
        block[20] = block[2 * (10 + lag + 1) + 1] = 1
        block[120] = block[2 * (60 + lag + 1) + 1] = -1
        const C = lagged(block, 2, m).matrix()
        return C[1]! / C[0]!
      })
      expect(absoluteGap(weights, outputs.weights)).toBeLessThan(within['weights']!)
    },
  )

  // The edges are the limit for many series that have nothing in common (Marchenko & Pastur). Of finitely many, the extreme eigenvalues
  // scatter by the Tracy-Widom law of order 1, mean -1.2 and deviation 1.3, in units of (√T ± √N)(1/√N ± 1/√T)^(1/3) / T (Johnstone 2001,
  // Annals of Statistics 29(2), theorem 1.1, and its mirror image at the lower edge; from memory). Five units: the mean and three deviations.
  example<{ N: number; T: number }, { lambdaMax: number; lambdaMin: number }>(
    'marchenko-pastur-edge',
    ({ N, T }, { lambdaMax, lambdaMin }) => {
      let x = 20240601
      const u = () => (x = (16807 * x) % 2147483647) / 2147483647
      const noise = Float64Array.from({ length: N * T }, () => u() + u() + u() - u() - u() - u())
      const c = inOneGo(conditionOf(matrixModel(correlation(returnsModel(noise, T, N)), N)))
      const unit = (sign: 1 | -1) =>
        ((Math.sqrt(T) + sign * Math.sqrt(N)) * Math.cbrt(1 / Math.sqrt(N) + sign / Math.sqrt(T))) / T
      expect(Math.abs(c.largest! - lambdaMax)).toBeLessThan(5 * unit(1))
      expect(Math.abs(c.smallest - lambdaMin)).toBeLessThan(5 * unit(-1))
    },
  )
})

/**
 * The worksheet functions of the tail as a host calls them. Weights (.5, .5) on C = diag(.04, .01): s = sqrt(.0125), contributions .08944 and
 * .02236, by hand. Normal quantile and mean beyond it at 99%: 2.3263478740408408 and 2.665214220345808 (R 4.2.2, qnorm(.99) and
 * dnorm(qnorm(.99))/.01); Student t with 5 degrees of freedom, in units of its deviation: 2.60646356938428 and 3.4488367600480165 (R 4.2.2, qt
 * and dt). Tolerance: 12 digits.
 */
import { readFileSync } from 'node:fs'
import path from 'node:path'
import { absoluteGap } from '../../closeness'
import { call, refusal } from './function-calls'

const number = (id: string, ...args: unknown[]): number => call(id, ...args) as number
const vector = (id: string, ...args: unknown[]): number[] => (call(id, ...args) as number[][]).flat()

const C = [
  [0.04, 0],
  [0, 0.01],
]
const half = [[0.5], [0.5]]
const s = Math.sqrt(0.0125)
const near = (found: number | number[], expected: number | number[]) =>
  expect(absoluteGap(found, expected)).toBeLessThan(1e-12)

/** Twenty dates of two positions: losses of the book at half and half 10, 9, 8, .. thousandths, in mixed order; no two alike. */
const history = Array.from({ length: 20 }, (_, t) => {
  const loss = 10 - ((t * 7) % 20)
  const tilt = (t % 3) - 1
  return [(-loss + 3 * tilt) / 1000, (-loss - 3 * tilt) / 1000]
})

describe('VALUEATRISK, SHORTFALL and SHORTFALLPARTS', () => {
  it('are normal where no method is given, whatever stands for nothing', () => {
    near(number('VALUEATRISK', half, C, 0.99), 2.3263478740408408 * s)
    near(number('VALUEATRISK', half, C, [[0.99]], null, null, null), 2.3263478740408408 * s)
    near(number('SHORTFALL', half, C, 0.99, undefined, 'Normal'), 2.665214220345808 * s)
    near(
      vector('SHORTFALLPARTS', half, C, 0.99),
      [0.04, 0.01].map((c) => (2.665214220345808 * 0.25 * c) / s),
    )
  })

  it('take Student’s t with the degrees of freedom written behind it, comma or point', () => {
    near(number('VALUEATRISK', half, C, 0.99, 1, 'student 5'), 2.60646356938428 * s)
    near(number('SHORTFALL', half, C, 0.99, 1, ' Student  5,0 '), 3.4488367600480165 * s)
  })

  it('scale by the square root of the periods ahead', () => {
    near(number('VALUEATRISK', half, C, 0.99, 16), 4 * 2.3263478740408408 * s)
    near(number('SHORTFALL', half, C, 0.99, 16, 'student 5'), 4 * 3.4488367600480165 * s)
  })

  it('read the past at today’s weights', () => {
    // T p = 20 x 0.15 = 3: the third largest loss is 8 thousandths, the mean of 10, 9 and 8 is 9
    near(number('VALUEATRISK', half, history, 0.85, null, 'historical'), 0.008)
    near(number('SHORTFALL', half, history, 0.85, null, 'historical'), 0.009)
    const worst = history.filter(([a, b]) => a! + b! < -0.0155)
    near(
      vector('SHORTFALLPARTS', half, history, 0.85, null, 'historical'),
      [0, 1].map((i) => -worst.reduce((sum, row) => sum + row[i]! / 2, 0) / 3),
    )
  })

  it('give parts in the orientation of the weights, summing to the whole', () => {
    const across = call('SHORTFALLPARTS', [[0.5, 0.5]], history, 0.9, 1, 'historical') as number[][]
    expect(across).toHaveLength(1)
    near(across[0]![0]! + across[0]![1]!, number('SHORTFALL', half, history, 0.9, 1, 'historical'))
  })

  it('take the volatility from the estimator, but the past as it was', () => {
    const of = (id: string, ...rest: unknown[]) => number(id, half, history, 0.9, 1, ...rest)
    const ratio =
      number('VOLATILITY', half, history, 1, 'exponential 0.8') / number('VOLATILITY', half, history)
    near(of('VALUEATRISK', 'normal', 'exponential 0.8'), ratio * of('VALUEATRISK', 'normal', 'sample'))
    near(of('SHORTFALL', 'historical', 'exponential 0.8'), of('SHORTFALL', 'historical', 'sample'))
    // other estimators keep the returns behind them
    for (const estimator of ['shrink correlation', 'shrink identity', 'shrink oas', 'lagged 2'])
      near(of('SHORTFALL', 'historical', estimator), of('SHORTFALL', 'historical', 'sample'))
  })

  it('fit Student’s t and correct for skewness and kurtosis where there are returns', () => {
    // four share indices, log returns, weights .4 .3 .2 .1; computed with scipy 1.10.1 and R 4.2.2 (test/reference/data/eu_log.json)
    const data = path.join(__dirname, '../../reference/data')
    const prices = readFileSync(path.join(data, 'eustockmarkets_close.csv'), 'utf8')
      .trim()
      .split(/\r?\n/)
      .slice(1)
      .map((line) => line.split(',').slice(-4).map(Number))
    const weights = [[0.4, 0.3, 0.2, 0.1]]
    const returns = call('RETURNS', prices, 'log')
    const { distribution, var_es } = (
      JSON.parse(readFileSync(path.join(data, 'eu_log.json'), 'utf8')) as {
        portfolios: {
          long: {
            distribution: Record<string, { value: number }>
            var_es: Record<string, Record<string, { value: number }>>
          }
        }
      }
    ).portfolios.long
    const volatility = number('VOLATILITY', weights, returns)
    const [df, location, scale] = ['tfit_df', 'tfit_loc', 'tfit_scale'].map(
      (key) => distribution[key]!.value,
    ) as [number, number, number]
    const fitted = (var_es['0.99']!['t_fitted_var']!.value + location) / scale
    near(
      number('VALUEATRISK', weights, returns, 0.99, 1, 'student'),
      fitted * Math.sqrt((df - 2) / df) * volatility,
    )
    near(
      number('VALUEATRISK', weights, returns, 0.99, 1, 'cornish-fisher'),
      -var_es['0.99']!['cf_z']!.value * volatility,
    )
  })

  it('are nothing for a portfolio without risk', () => {
    const none = [[0], [0]]
    expect(number('VALUEATRISK', none, C, 0.99)).toBe(0)
    expect(number('SHORTFALL', none, history, 0.99, 1, 'student')).toBe(0)
    expect(vector('SHORTFALLPARTS', none, C, 0.99)).toEqual([0, 0])
  })
})

describe('a tail figure is refused', () => {
  it.each([
    [95, 'confidence: found 95; a number above 0.5 and below 1 is needed, such as 0.99 or 99%.'],
    [0.05, 'confidence: found 0.05; a number above 0.5 and below 1 is needed, such as 0.99 or 99%.'],
    [
      '99%',
      'confidence: found “99%”; a number is needed, and this cell holds text that only looks like one.',
    ],
    [null, 'confidence: found a blank cell; a number is needed.'],
  ])('at a confidence of %j', (confidence, sentence) => {
    expect(refusal('VALUEATRISK', half, C, confidence).sentence).toBe(sentence)
  })

  it.each([
    [0, 'periods: found 0; a number above 0 is needed, such as 10.'],
    ['ten', 'periods: found “ten”; a number is needed.'],
  ])('over %j periods', (periods, sentence) => {
    expect(refusal('SHORTFALL', half, C, 0.99, periods).sentence).toBe(sentence)
  })

  it.each(['gaussian', 'student five', 'student 5 6', 'historical 250', 5])('by the method %j', (method) => {
    expect(refusal('SHORTFALLPARTS', half, C, 0.99, 1, method)).toEqual({
      code: 'unknown-choice',
      sentence: `method: found ${typeof method === 'number' ? method : `“${method}”`}; “normal”, “historical”, “student”, “student 5” or “cornish-fisher” is needed.`,
    })
  })

  it('by Student’s t without a volatility', () => {
    expect(refusal('VALUEATRISK', half, C, 0.99, 1, 'student 2').sentence).toBe(
      'method: found 2 degrees of freedom; more than 2 are needed to have a volatility.',
    )
  })

  it.each(['historical', 'student', 'cornish-fisher'])('by %s for a covariance matrix', (method) => {
    expect(refusal('VALUEATRISK', half, C, 0.99, 1, method).sentence).toBe(
      `method: “${method}” without returns; returns are needed: a covariance matrix serves “normal” and “student” with degrees of freedom given, such as “student 5”.`,
    )
  })

  it.each(['historical', 'cornish-fisher'])('by %s over more than one period', (method) => {
    expect(refusal('VALUEATRISK', half, history, 0.99, 10, method).sentence).toBe(
      `periods: 10 for “${method}”; 1 is needed: the square root of time holds for “normal” and “student” alone.`,
    )
  })

  it('as a mean beyond value at risk where the method has none', () => {
    // skewness 0, excess kurtosis 1.33 (scipy 1.17.1): within the domain
    const shaped = [-5, -2, -2, -1, -1, -1, 0, 0, 0, 0, 0, 1, 1, 1, 2, 2, 5].map((x) => [x / 100])
    expect(number('VALUEATRISK', 1, shaped, 0.99, 1, 'cornish-fisher')).toBeGreaterThan(0)
    for (const id of ['SHORTFALL', 'SHORTFALLPARTS']) {
      expect(refusal(id, 1, shaped, 0.99, 1, 'cornish-fisher')).toEqual({
        code: 'unknown-choice',
        sentence:
          'method: found “cornish-fisher”, which corrects a quantile and gives no mean beyond it; ' +
          '“normal”, “student”, “student 5” or “historical” is needed.',
      })
    }
  })

  it('outside the domain of Cornish-Fisher, with the shape that was found', () => {
    const thin = [[-1], [1], [-1], [1]].map(([x]) => [x! / 100])
    expect(refusal('VALUEATRISK', 1, thin, 0.99, 1, 'cornish-fisher').sentence).toBe(
      'method: skewness 0.00 and excess kurtosis -2.00, outside the domain of “cornish-fisher”; ' +
        'another method is needed: out there the expansion is no distribution (Maillard 2012).',
    )
  })

  it('where a blank or text lies among the returns, as everywhere', () => {
    const gap = history.map((row, t) => (t === 4 ? [row[0], null] : row))
    expect(refusal('SHORTFALL', half, gap, 0.99, 1, 'historical').sentence).toBe(
      'risk, row 5, column 2: found a blank cell; a number is needed.',
    )
  })
})

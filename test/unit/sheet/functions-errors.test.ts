import { attempt, explain } from '../../../src/sheet/explain'
import { worksheetFunctions } from '../../../src/sheet/functions'
import { absoluteGap } from '../../closeness'

// RISKSHAREERROR as a host calls it. By hand for weights (.5, .5): less their means z_1 = (.01, -.02, .01), y = (.005, -.005, 0),
// v = 5e-5 / 3, p_1 = 1.5, u v = (-1, 1, 0) x 1.25e-5, and so the error sqrt(2)/3 x .75 = 1 / sqrt(8). Tolerance: 12 digits.
const call = (...cells: unknown[]) =>
  (worksheetFunctions['RISKSHAREERROR'] as (...given: unknown[]) => number[][])(...cells)

function refusal(...cells: unknown[]): { sentence: string; code: string } {
  const { fault } = attempt(() => call(...cells))
  if (!fault) throw new Error('nothing wrong was found')
  return { sentence: explain(fault), code: fault.code }
}

const rows = [
  [0.01, 0],
  [-0.02, 0.01],
  [0.01, -0.01],
]
const error = 1 / Math.sqrt(8)
const half = [[0.5], [0.5]]

describe('RISKSHAREERROR', () => {
  it('spills in the orientation of the weights', () => {
    expect(call(half, rows)).toHaveLength(2)
    expect(absoluteGap(call(half, rows).flat(), [error, error])).toBeLessThan(1e-12)
    const across = call([[0.5, 0.5]], rows, null)
    expect(across).toHaveLength(1)
    expect(absoluteGap(across[0]!, [error, error])).toBeLessThan(1e-12)
  })

  it('takes names and dates along, and puts dated rows in order', () => {
    const dated = [['Date', 'Larch', 'Rowan'], ...rows.map((row, t) => [45000 + t, ...row])]
    const turned = [dated[0], ...dated.slice(1).reverse()]
    for (const estimator of ['sample', 'exponential 0.5', 'lagged 1']) {
      expect(call(half, turned, estimator)).toEqual(call(half, rows, estimator))
    }
  })

  it('is the error before shrinkage with every shrinkage, as shares are alike for divisors T and T - 1', () => {
    for (const estimator of ['shrink identity', 'shrink correlation', 'shrink oas']) {
      expect(absoluteGap(call(half, rows, estimator).flat(), [error, error])).toBeLessThan(1e-12)
    }
  })

  it('is 0 for an only position and for one not held', () => {
    expect(call([[0.7], [0]], rows)).toEqual([[0], [0]])
  })

  it('refuses a covariance matrix, with or without an estimator: returns are needed', () => {
    const matrix = [
      [0.04, 0],
      [0, 0.01],
    ]
    for (const estimator of [null, 'lagged 1']) {
      expect(refusal(half, matrix, estimator)).toEqual({
        code: 'shape',
        sentence: expect.stringContaining('returns') as string,
      })
    }
    expect(refusal(half, matrix).sentence).toContain('does not tell how many dates')
  })

  it('says which argument does not fit', () => {
    expect(refusal([[0.5], [0.3], [0.2]], rows).sentence).toMatch(/^returns/i)
    expect(refusal(half, [...rows.slice(1), ['x', 0]]).sentence).toMatch(/^returns/i)
    expect(refusal(half, rows, 'robust').sentence).toMatch(/^estimator/i)
    expect(refusal([[0], [0]], rows)).toMatchObject({ code: 'zero-risk' })
    expect(refusal([[0], [0]], rows).sentence).toMatch(/^returns/i)
  })
})

import { decompose, joinStates, matrixModel, splitChange, type RiskState } from '../../../src/core'
import { absoluteGap } from '../../closeness'
import { faultOf } from '../../fault-of'

const state = (weights: number[], volatilities: number[], correlations: number[][]): RiskState => ({
  weights: Float64Array.from(weights),
  volatilities: Float64Array.from(volatilities),
  correlations: Float64Array.from(correlations.flat()),
})
const places = (...list: number[]): Int32Array => Int32Array.from(list)
const sum = (values: Float64Array): number => values.reduce((total, value) => total + value, 0)

/** Oak is held on both dates, Elm is sold, Ash is bought. */
const BEFORE = state([0.6, 0.4], [0.2, 0.1], [[1, 0.3], [0.3, 1]]) // prettier-ignore
const AFTER = state([0.5, 0.5], [0.25, 0.3], [[1, -0.2], [-0.2, 1]]) // prettier-ignore
const JOINED = joinStates(BEFORE, AFTER, places(0, 1, -1), places(0, -1, 1))

describe('Two dates with positions of their own', () => {
  test('come to one list: what is not held has no weight, and the volatility and correlations of the other date', () => {
    expect([...JOINED.from.weights]).toEqual([0.6, 0.4, 0])
    expect([...JOINED.to.weights]).toEqual([0.5, 0, 0.5])
    expect([...JOINED.from.volatilities]).toEqual([0.2, 0.1, 0.3])
    expect([...JOINED.to.volatilities]).toEqual([0.25, 0.1, 0.3])
    const both = [1, 0.3, -0.2, 0.3, 1, 0, -0.2, 0, 1]
    expect([...JOINED.from.correlations]).toEqual(both)
    expect([...JOINED.to.correlations]).toEqual(both)
    expect(JOINED.unknown).toBeNull()
  })

  test('keep their volatilities and contributions', () => {
    const split = splitChange(JOINED.from, JOINED.to)
    // 0.6^2 0.2^2 + 2 0.6 0.4 0.3 0.2 0.1 + 0.4^2 0.1^2 and 0.5^2 0.25^2 - 2 0.5 0.5 0.2 0.25 0.3 + 0.5^2 0.3^2, by hand
    expect(split.from).toBeCloseTo(Math.sqrt(0.01888), 15)
    expect(split.to).toBeCloseTo(Math.sqrt(0.030625), 15)
    const gone = split.positions[1]! + split.volatilities[1]! + split.correlations[1]!
    // all of what Elm added is gone: -0.4 (0.6 0.3 0.2 0.1 + 0.4 0.1^2) / s, by hand
    expect(gone).toBeCloseTo(-0.00304 / Math.sqrt(0.01888), 15)
  })

  test('never ask for the correlation between a new position and one that is gone', () => {
    const drifted = Float64Array.of(0.62, 0.38, 0)
    const split = splitChange(JOINED.from, JOINED.to, drifted)
    const bent = (of: RiskState): RiskState => {
      const correlations = of.correlations.slice()
      correlations[5] = correlations[7] = 0.7
      return { ...of, correlations }
    }
    const other = splitChange(bent(JOINED.from), bent(JOINED.to), drifted)
    for (const cause of ['positions', 'volatilities', 'correlations', 'drift', 'trades'] as const)
      expect(other[cause]).toEqual(split[cause])
  })

  test('fit together where the mixed correlations are some', () => {
    // eigenvalues 1 ± 0.2 and 1 ± 0.3 of the pairs that are held together
    expect(JOINED.smallest).toEqual({ from: null, to: null })
    // Elm and its twin, which is new: eigenvalues 0 and 2, known to the rounding of 0 alone
    const twins = state([0.5, 0.5], [0.2, 0.2], [[1, 1], [1, 1]]) // prettier-ignore
    const one = state([1], [0.2], [[1]])
    expect(joinStates(one, twins, places(0, -1), places(0, 1)).smallest).toEqual({ from: null, to: null })
  })

  test('are told the least eigenvalue where no covariance has such correlations', () => {
    // Oak and Elm move together before and against each other after; Ash, which is new, moves with both as only then it can
    const before = state([0.5, 0.5], [0.2, 0.2], [[1, 0.95], [0.95, 1]]) // prettier-ignore
    const after = state([0.3, 0.3, 0.4], [0.2, 0.2, 0.2], [[1, -0.9, 0.2], [-0.9, 1, -0.6], [0.2, -0.6, 1]]) // prettier-ignore
    const { smallest } = joinStates(before, after, places(0, 1, -1), places(0, 1, 2))
    // numpy 2.4.6, eigvalsh of [[1, .95, .2], [.95, 1, -.6], [.2, -.6, 1]]
    expect(smallest.from).toBeCloseTo(-0.22037989, 7)
    expect(smallest.to).toBeNull()
  })

  test('leave out of that what has no weight', () => {
    const before = state([0.5, 0.5], [0.2, 0.2], [[1, 0.95], [0.95, 1]]) // prettier-ignore
    const after = state([0.3, 0.3, 0], [0.2, 0.2, 0.2], [[1, -0.9, 0.2], [-0.9, 1, -0.6], [0.2, -0.6, 1]]) // prettier-ignore
    expect(joinStates(before, after, places(0, 1, -1), places(0, 1, 2)).smallest.from).toBeNull()
  })

  test('take the correlations of a position that is riskless on one of them from the other', () => {
    const before = state([0.5, 0.5], [0.2, 0], [[1, 0], [0, 1]]) // prettier-ignore
    const { from, to, unknown } = joinStates(before, AFTER, places(0, 1), places(0, 1))
    expect([...from.volatilities]).toEqual([0.2, 0])
    expect([...from.correlations]).toEqual([1, -0.2, -0.2, 1])
    expect([...to.correlations]).toEqual([1, -0.2, -0.2, 1])
    expect(unknown).toBeNull()
  })

  test('name a pair that a mix holds and neither of them knows', () => {
    // Elm moves before only, Ash is bought after: the weights of the one with the volatilities of the other hold both
    const before = state([0.5, 0.5], [0.2, 0.1], [[1, 0.3], [0.3, 1]]) // prettier-ignore
    const after = state([0.3, 0.3, 0.4], [0.2, 0, 0.2], [[1, 0, 0.2], [0, 1, 0], [0.2, 0, 1]]) // prettier-ignore
    expect(joinStates(before, after, places(0, 1, -1), places(0, 1, 2)).unknown).toEqual({ i: 2, j: 1 })
  })

  test('are refused where a position is on neither of them', () => {
    expect(faultOf(() => joinStates(BEFORE, AFTER, places(0, -1), places(0, -1)))).toMatchObject({
      code: 'out-of-range',
      where: { argument: 'places', row: 1 },
    })
    expect(faultOf(() => joinStates(BEFORE, AFTER, places(0, 2), places(0, 1))).code).toBe('out-of-range')
    expect(faultOf(() => joinStates(BEFORE, AFTER, places(0), places(0, 1))).code).toBe('shape')
  })
})

describe('The split of a change', () => {
  test('of one position halves what weight and volatility do together', () => {
    // w sigma from 1 x 10% to 2 x 30%: (2 - 1)(10% + 30%)/2 and (30% - 10%)(1 + 2)/2, by hand
    const split = splitChange(state([1], [0.1], [[1]]), state([2], [0.3], [[1]]))
    expect(split.positions[0]).toBeCloseTo(0.2, 15)
    expect(split.volatilities[0]).toBeCloseTo(0.3, 15)
    expect(split.correlations[0]).toBe(0)
  })

  test('counts a mix without volatility as contributions of 0', () => {
    // long and short of one thing: no risk before, and none whatever the volatilities while the correlation is 1
    const before = state([1, -1], [0.2, 0.2], [[1, 1], [1, 1]]) // prettier-ignore
    const after = state([1, -1], [0.2, 0.2], [[1, 0.5], [0.5, 1]]) // prettier-ignore
    const split = splitChange(before, after)
    expect(split.from).toBe(0)
    expect(sum(split.correlations)).toBeCloseTo(0.2, 15)
    expect([...split.positions, ...split.volatilities]).toEqual([0, 0, 0, 0])
  })

  test('ends at the contributions of the covariance', () => {
    const split = splitChange(JOINED.from, JOINED.to)
    const { contribution } = decompose(
      matrixModel(Float64Array.of(0.0625, -0.015, -0.015, 0.09), 2),
      Float64Array.of(0.5, 0.5),
    )
    const bought = split.positions[2]! + split.volatilities[2]! + split.correlations[2]!
    expect(absoluteGap(bought, contribution[1]!)).toBeLessThanOrEqual(1e-15)
  })

  test('sells what is gone before it drifts, where trades come first', () => {
    // one position, sold: it doubles first and is sold, or is sold: -20% in whole, drift (10% to 20%)/2, by hand
    const split = splitChange(state([1], [0.1], [[1]]), state([0], [0.1], [[1]]), Float64Array.of(2))
    expect(split.drift![0]).toBeCloseTo(0.05, 15)
    expect(split.trades![0]).toBeCloseTo(-0.15, 15)
    expect(split.positions[0]).toBeCloseTo(-0.1, 15)
  })

  test('refuses what is no state, naming the place', () => {
    const one = state([1], [0.1], [[1]])
    expect(faultOf(() => splitChange(one, state([1], [-0.1], [[1]])))).toMatchObject({
      code: 'out-of-range',
      where: { argument: 'volatilities', row: 0 },
    })
    expect(faultOf(() => splitChange(one, JOINED.to)).code).toBe('shape')
    expect(faultOf(() => splitChange(one, one, Float64Array.of(NaN))).code).toBe('not-a-number')
    const noCovariance = state([1, 1, 1], [1, 1, 1], [[1, -0.9, -0.9], [-0.9, 1, -0.9], [-0.9, -0.9, 1]]) // prettier-ignore
    expect(faultOf(() => splitChange(noCovariance, noCovariance)).code).toBe('negative-variance')
  })
})

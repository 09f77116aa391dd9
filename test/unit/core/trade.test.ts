import {
  courseOf,
  decompose,
  financed,
  firstOrder,
  impliedReturns,
  loweringPairs,
  loweringTrades,
  matrixModel,
  removals,
  returnPerMarginal,
  returnsModel,
} from '../../../src/core'
import { faultOf } from '../../fault-of'

// Small books worked out by hand: variances .04 and .01 without correlation, unless a test says otherwise.
const apart = matrixModel(Float64Array.of(0.04, 0, 0, 0.01), 2)
const half = Float64Array.of(0.5, 0.5)

describe('a course', () => {
  it('is a corner where the book has no risk: no slope, least risk at once', () => {
    const course = courseOf(apart, Float64Array.of(0, 0), Float64Array.of(1, 0))
    expect(course.slope).toBeNull()
    expect(course.leastAt).toBe(0)
    // 3 x 20%
    expect(course.volatilityAt(-3)).toBeCloseTo(0.6, 15)
    expect(course.shareAt([0], 0)).toBeNull()
    expect(course.contributionAt([0], 0)).toBe(0)
  })

  it('along something riskless changes nothing', () => {
    const cash = matrixModel(Float64Array.of(0.04, 0, 0, 0), 2)
    const course = courseOf(cash, half, Float64Array.of(0, 1))
    expect(course.leastAt).toBeNull()
    expect(course.slope).toBe(0)
    expect(course.volatilityReach(0.1)).toEqual({ at: [], everywhere: true })
    expect(course.volatilityReach(0.2)).toEqual({ at: [], everywhere: false })
    expect(course.sharesReach([0], 1)).toEqual({ at: [], everywhere: true })
    expect(course.sharesReach([0], 0.5)).toEqual({ at: [], everywhere: false })
  })

  it('says that a share is the same all along when the whole book is scaled', () => {
    const course = courseOf(apart, half, half)
    // .04 / (.04 + .01)
    expect(course.sharesReach([0], 0.8).everywhere).toBe(true)
    expect(course.sharesReach([0], 0.7)).toEqual({ at: [], everywhere: false })
    expect(course.sharesReach([0, 1], 1).everywhere).toBe(true)
  })

  it('reaches a volatility on both sides of the least, once at it, and not below', () => {
    // variance (.5 + t)^2 .04 + .0025: least .05 at t = -.5
    const course = courseOf(apart, half, Float64Array.of(1, 0))
    const { at } = course.volatilityReach(Math.sqrt(0.0025 + 0.04 * 0.09))
    expect(at[0]).toBeCloseTo(-0.8, 14)
    expect(at[1]).toBeCloseTo(-0.2, 14)
    // .05 squared is not quite .0025: a double root is known to half the digits
    for (const t of course.volatilityReach(0.05).at) expect(t).toBeCloseTo(-0.5, 7)
    expect(course.volatilityReach(0.05).at.length).toBeGreaterThan(0)
    expect(course.volatilityReach(0.049).at).toEqual([])
  })

  it('keeps its digits where a hedge cancels all but the last of the risk', () => {
    // two series that differ by 1e-9 on one date: their difference has that much risk, and no more
    const T = 5
    const first = [0.01, -0.02, 0.03, 0, -0.01]
    const returns = Float64Array.from(first.flatMap((r, t) => [r, t === 0 ? r + 1e-9 : r]))
    const course = courseOf(returnsModel(returns, T, 2), Float64Array.of(1, 0), Float64Array.of(0, 1))
    // one date off by d: variance d^2 (1 - 1/T) / (T - 1) = d^2 / T. 1e-9 is known to 1e-17 beside returns of .01
    expect(course.volatilityAt(-1) / (1e-9 / Math.sqrt(T))).toBeCloseTo(1, 6)
  })

  it.each([
    ['a change that is no number', () => courseOf(apart, half, half).volatilityAt(NaN), 'not-a-number'],
    ['a member that is no position', () => courseOf(apart, half, half).shareAt([2], 0), 'out-of-range'],
    [
      'a share that is no number',
      () => courseOf(apart, half, half).sharesReach([0], Infinity),
      'not-a-number',
    ],
    ['a volatility below 0', () => courseOf(apart, half, half).volatilityReach(-0.1), 'out-of-range'],
    ['a direction of another length', () => courseOf(apart, half, Float64Array.of(1)), 'shape'],
  ])('refuses %s', (_, ask, code) => {
    expect(faultOf(ask).code).toBe(code)
  })
})

describe('financing', () => {
  const book = Float64Array.of(0.6, 0.5, -0.2)

  it('pro rata scales longs and shorts of the rest by one factor', () => {
    // rest .5 - .2 = .3 takes -.03: factor .9
    const { changes, cash, factor } = financed(book, Float64Array.of(0.03, 0, 0), { kind: 'pro rata' })
    expect(factor).toBeCloseTo(0.9, 15)
    expect(changes[1]).toBeCloseTo(-0.05, 15)
    expect(changes[2]).toBeCloseTo(0.02, 15)
    expect(cash).toBe(0)
  })

  it('tells a factor below 0, where longs of the rest would turn short', () => {
    expect(financed(book, Float64Array.of(0.6, 0, 0), { kind: 'pro rata' }).factor).toBeCloseTo(-1, 14)
  })

  it('moves nothing else where the wanted changes finance each other', () => {
    const swap = Float64Array.of(-0.1, 0.1, 0)
    for (const financing of [{ kind: 'pro rata' }, { kind: 'position', position: 2 }] as const)
      expect(financed(book, swap, financing).changes).toEqual(swap)
  })

  it('refuses a position with a change of its own, one that is none, and a rest that cannot finance', () => {
    const wanted = Float64Array.of(0.1, 0, 0)
    expect(faultOf(() => financed(book, wanted, { kind: 'position', position: 0 })).code).toBe('twice')
    expect(faultOf(() => financed(book, wanted, { kind: 'position', position: 3 })).code).toBe('out-of-range')
    const hedged = Float64Array.of(0.6, 0.5, -0.47)
    const { found, needed } = faultOf(() => financed(hedged, wanted, { kind: 'pro rata' }))
    expect(found).toBe(
      'financing pro rata: the weights of the rest of the book add up to 0.03, without their signs to 0.97',
    )
    expect(needed).toBe('cash or one position to finance the trade is needed')
    expect(
      faultOf(() => financed(Float64Array.of(1, 0), Float64Array.of(0.1, 0), { kind: 'pro rata' })).found,
    ).toBe('financing pro rata: nothing else is held')
  })
})

describe('removals', () => {
  it('are not defined for the position that finances, nor for one that is all there is, pro rata', () => {
    const { volatility, change } = removals(apart, half, { kind: 'position', position: 1 })
    expect(volatility[1]).toBeNaN()
    expect(change[1]).toBeNaN()
    // all of it in the second: 10%
    expect(volatility[0]).toBeCloseTo(0.1, 15)
    expect(removals(apart, Float64Array.of(1, 0), { kind: 'pro rata' }).volatility[0]).toBeNaN()
  })

  it('keep the digits of a small change', () => {
    const weights = Float64Array.of(1, 1e-9)
    // s' - s = -(w^2 .01) / (s' + s), s = .2: -2.5e-20
    const { change } = removals(apart, weights, { kind: 'cash' })
    expect(change[1]! / -2.5e-20).toBeCloseTo(1, 12)
  })
})

describe('trades that lower risk', () => {
  it('are none where the book has no risk', () => {
    const none = Float64Array.of(0, 0)
    expect(loweringTrades(apart, none, { kind: 'cash' }, 'shorting').trades).toEqual([])
    expect(loweringPairs(apart, none, 'shorting', 5)).toEqual([])
  })

  it('end where a weight reaches 0 unless shorts are allowed, and say so', () => {
    // correlated .9: the second would have to be short for least risk
    const model = matrixModel(Float64Array.of(0.01, 0.018, 0.018, 0.04), 2)
    const [long] = loweringTrades(model, half, { kind: 'cash' }, 'no shorting').trades
    expect(long).toMatchObject({ position: 1, change: -0.5, end: 'weight 0', turnover: 0.5 })
    // .5 x 10%
    expect(long!.volatility).toBeCloseTo(0.05, 15)
    const [short] = loweringTrades(model, half, { kind: 'cash' }, 'shorting').trades
    // -(.5 x .018 + .5 x .04) / .04
    expect(short!.change).toBeCloseTo(-0.725, 14)
    expect(short!.end).toBe('least risk')
  })

  it('sell only what is held, where nothing may be short', () => {
    const trades = loweringTrades(
      apart,
      Float64Array.of(0, 1),
      { kind: 'position', position: 1 },
      'no shorting',
    )
    // into the first out of the second: least at .01 / (.04 + .01)
    expect(trades.trades).toHaveLength(1)
    expect(trades.trades[0]!.change).toBeCloseTo(0.2, 15)
    expect(loweringPairs(apart, Float64Array.of(0, 1), 'no shorting', 4)).toMatchObject([
      { position: 1, against: 0, end: 'least risk' },
    ])
  })

  it('name the positions that a financing cannot serve', () => {
    expect(loweringTrades(apart, Float64Array.of(1, 0), { kind: 'pro rata' }, 'shorting').unfinanced).toEqual(
      [0],
    )
  })

  it('refuse a number of pairs that is none', () => {
    expect(faultOf(() => loweringPairs(apart, half, 'shorting', 0)).code).toBe('out-of-range')
  })
})

describe('first-order estimates', () => {
  it('are none where the book before has no risk, and stand where the book after has none', () => {
    const empty = decompose(apart, Float64Array.of(0, 0))
    const full = decompose(apart, half)
    expect(firstOrder(empty, full)).toBeNull()
    // all sold: s + m'(-w) = 0
    expect(firstOrder(full, empty)!.volatility).toBeCloseTo(0, 15)
  })

  it('are refused for figures scaled differently', () => {
    const d = decompose(apart, half)
    expect(faultOf(() => firstOrder(d, { ...d, periodsPerYear: 12 })).code).toBe('out-of-range')
  })
})

describe('implied returns', () => {
  it('of a book without risk are 0 at any risk aversion, and refused for a total', () => {
    const empty = decompose(apart, Float64Array.of(0, 0))
    expect(impliedReturns(empty, { kind: 'risk aversion', value: 3 })).toEqual({
      implied: Float64Array.of(0, 0),
      total: 0,
      riskAversion: null,
    })
    expect(faultOf(() => impliedReturns(empty, { kind: 'total', value: 0.05 })).code).toBe('zero-risk')
    expect(returnPerMarginal(empty, Float64Array.of(0.1, 0.1))).toEqual(Float64Array.of(NaN, NaN))
  })

  it.each(['risk aversion', 'total'] as const)('are refused at a %s of 0 or below', (kind) => {
    for (const value of [0, -1, NaN])
      expect(faultOf(() => impliedReturns(decompose(apart, half), { kind, value })).code).toBe('out-of-range')
  })

  it('leave the return per unit of marginal out where that is 0', () => {
    const cash = matrixModel(Float64Array.of(0.04, 0, 0, 0), 2)
    // .04 over 20%
    const [moving, still] = returnPerMarginal(decompose(cash, half), Float64Array.of(0.04, 0.01))
    expect(moving).toBeCloseTo(0.2, 15)
    expect(still).toBeNaN()
  })
})

import { annualise, decompose, leastRiskWeights, matrixModel } from '../../../src/core'
import type { Limit } from '../../../src/sheet'
import { impliedReturnsOf } from '../../../src/sheet/implied'
import { riskLowering, sizingOf } from '../../../src/sheet/sizing'
import { faultOf } from '../../fault-of'

// A book typed for its tests: monthly variances .0016 and .0004 (4% and 2%), covariance .0002, and a candidate at .0009.
const inputs = {
  names: ['Meadow', 'Orchard', 'Quarry'],
  model: matrixModel(Float64Array.of(0.0016, 0.0002, 0, 0.0002, 0.0004, -0.0003, 0, -0.0003, 0.0009), 3),
  weights: Float64Array.of(0.5, 0.5, 0),
  periods: 12,
}
const CASH = { kind: 'cash' } as const
const volatilityAt = (...weights: number[]) =>
  annualise(decompose(inputs.model, Float64Array.from(weights)), 12)
const limitOf = (limit: Partial<Limit>): Limit => ({
  scope: 'holding',
  header: null,
  name: 'Meadow',
  measure: 'weight',
  soft: null,
  hard: null,
  cell: null,
  members: Int32Array.of(0),
  ...limit,
})

describe('sizing', () => {
  it('runs from below 0 past twice the weight, with every named point among its points, by the year', () => {
    const { curve, marks, changeIfRemoved, financing, notes } = sizingOf(inputs, 0, CASH, [
      limitOf({ soft: 0.3, hard: 0.4 }),
    ])
    expect(financing).toBe('cash beyond the holdings (nothing else moves)')
    expect(notes).toEqual([])
    expect(marks.map(({ kind, label }) => `${kind}: ${label}`)).toEqual([
      'today: Today',
      'removed: Removed',
      'least risk: Least-risk weight',
      'soft limit: Weight, soft limit 30.0%',
      'hard limit: Weight, hard limit 40.0%',
    ])
    // -.0002 x .5 / .0016
    expect(marks[2]!.weight).toBeCloseTo(-0.0625, 15)
    expect(marks[2]!.weight).toBeCloseTo(leastRiskWeights(inputs.model, inputs.weights)[0]!, 15)
    for (const mark of marks) {
      expect(mark.shown).toBe(true)
      expect(
        curve.some(({ weight, volatility }) => weight === mark.weight && volatility === mark.volatility),
      ).toBe(true)
    }
    for (const { weight, volatility, share } of curve) {
      const d = volatilityAt(weight, 0.5, 0)
      expect(volatility).toBeCloseTo(d.volatility, 14)
      expect(share).toBeCloseTo(d.share![0]!, 12)
    }
    const weights = curve.map(({ weight }) => weight)
    expect(weights).toEqual([...weights].sort((a, b) => a - b))
    expect(curve.length).toBeGreaterThanOrEqual(60)
    expect(weights[0]).toBeLessThan(-0.0625)
    expect(weights.at(-1)).toBeGreaterThan(1)
    expect(changeIfRemoved).toBeCloseTo(
      volatilityAt(0, 0.5, 0).volatility - volatilityAt(0.5, 0.5, 0).volatility,
      14,
    )
  })

  it('finds the weights at which shares, stand-alone risk and the volatility of the book reach their limits', () => {
    const { marks } = sizingOf(inputs, 0, { kind: 'position', position: 1 }, [
      limitOf({ measure: 'share of risk', hard: 0.6 }),
      limitOf({ measure: 'stand-alone risk', hard: 0.05 }),
      limitOf({ scope: 'total', name: '', measure: 'volatility', hard: 0.08, members: null }),
      limitOf({
        scope: 'group',
        header: 'Region',
        name: 'North',
        measure: 'share of risk',
        soft: 0.7,
        members: Int32Array.of(0, 2),
      }),
      // another's own
      limitOf({ name: 'Orchard', soft: 0.1, members: Int32Array.of(1) }),
    ])
    const at = (label: string) => marks.filter((mark) => mark.label === label)
    const shares = at('Share of risk, hard limit 60.0%')
    expect(shares.length).toBeGreaterThan(0)
    for (const { weight } of shares)
      expect(volatilityAt(weight, 1 - weight, 0).share![0]).toBeCloseTo(0.6, 12)
    // 5% over 4% x sqrt(12)
    expect(at('Stand-alone risk, hard limit 5.0%')[0]!.weight).toBeCloseTo(0.05 / (0.04 * Math.sqrt(12)), 14)
    const book = at('Volatility of the book, hard limit 8.0%')
    expect(book).toHaveLength(2)
    for (const { weight } of book)
      expect(volatilityAt(weight, 1 - weight, 0).volatility).toBeCloseTo(0.08, 12)
    expect(at('Share of risk of Region: North, soft limit 70.0%').length).toBeGreaterThan(0)
    expect(marks.filter(({ label }) => label.startsWith('Weight'))).toEqual([])
  })

  it('of a series that is not held starts at 0, says so and removes nothing', () => {
    const { curve, marks, changeIfRemoved } = sizingOf(inputs, 2, CASH)
    expect(marks[0]).toMatchObject({ kind: 'today', label: 'Not held', weight: 0, share: 0 })
    expect(marks.map(({ kind }) => kind)).toEqual(['today', 'least risk'])
    // .0003 x .5 / .0009
    expect(marks[1]!.weight).toBeCloseTo(1 / 6, 15)
    expect(curve.at(-1)!.weight).toBeGreaterThan(1 / 6)
    expect(changeIfRemoved).toBe(0)
  })

  it('does not stretch the picture to a limit on the other side of 0', () => {
    const { marks, curve } = sizingOf(inputs, 0, CASH, [
      limitOf({ scope: 'total', measure: 'volatility', hard: 0.2, members: null, name: '' }),
    ])
    // by hand: .0016 x^2 + .0002 x + .0001 = .2^2 / 12
    const limits = marks.filter(({ kind }) => kind === 'hard limit').sort((a, b) => a.weight - b.weight)
    expect(limits[0]?.weight).toBeCloseTo(-1.4854, 4)
    expect(limits[1]?.weight).toBeCloseTo(1.3604, 4)
    expect(limits.map(({ shown }) => shown)).toEqual([false, true])
    expect(curve[0]?.weight).toBeGreaterThan(-0.2)
  })

  it('marks a least-risk weight that lies beyond the picture', () => {
    const weights = Float64Array.of(0.001, 0.999, 0)
    const { marks, curve } = sizingOf({ ...inputs, weights }, 0, CASH)
    const least = marks.find(({ kind }) => kind === 'least risk')
    // -.0002 x .999 / .0016
    expect(least?.weight).toBeCloseTo(-0.124875, 12)
    expect(least?.shown).toBe(false)
    expect(curve[0]?.weight).toBeGreaterThan(least?.weight ?? 0)
  })

  it('tells what pro rata does in a book with shorts, and where the rest is used up', () => {
    const weights = Float64Array.of(0.6, 0.5, -0.1)
    const { notes, financing } = sizingOf({ ...inputs, weights }, 0, { kind: 'pro rata' })
    expect(financing).toBe('the rest of the book, in proportion to its weights')
    // (.5 + .1) / (.5 - .1)
    expect(notes).toContain(
      'The rest of the book holds shorts: longs and shorts alike grow or shrink with it, 150% of positions for 100% of money.',
    )
    expect(notes).toContain('At 100.0% the rest of the book is used up: beyond, its longs turn into shorts.')
  })

  it('of something riskless says that no weight has least risk', () => {
    const model = matrixModel(Float64Array.of(0.0016, 0, 0, 0), 2)
    const { notes, marks } = sizingOf(
      { names: ['Meadow', 'Till'], model, weights: Float64Array.of(0.5, 0.5), periods: 12 },
      1,
      CASH,
    )
    expect(notes).toEqual([
      'The weight of “Till” changes nothing about the portfolio’s risk with this financing, so that no weight has least risk.',
    ])
    expect(marks.map(({ kind }) => kind)).toEqual(['today', 'removed'])
  })

  it('is refused where the financing cannot serve, or there is no such position', () => {
    expect(faultOf(() => sizingOf(inputs, 0, { kind: 'position', position: 0 })).code).toBe('twice')
    expect(faultOf(() => sizingOf(inputs, 3, CASH)).code).toBe('out-of-range')
  })
})

describe('the trades that lower risk most', () => {
  it('name what is bought and sold, with the weight and the risk where they end', () => {
    const { trades, switches, shorting, unfinanced } = riskLowering(inputs, CASH)
    expect(shorting).toBe('no shorting')
    expect(unfinanced).toEqual([])
    expect(trades.map(({ kind, name, end }) => `${kind} ${name}: ${end}`)).toEqual([
      'sell Meadow: weight 0',
      'sell Orchard: weight 0',
      'buy Quarry: least risk',
    ])
    expect(trades[0]).toMatchObject({ weight: 0.5, weightAfter: 0, turnover: 0.5 })
    expect(trades[0]!.volatility).toBeCloseTo(volatilityAt(0, 0.5, 0).volatility, 14)
    // sqrt(12) m: marginal contribution (.0008 + .0001) / s
    expect(trades[0]!.perTurnover).toBeCloseTo(-volatilityAt(0.5, 0.5, 0).marginal![0]!, 14)
    expect(switches[0]).toMatchObject({ kind: 'switch', name: 'Meadow', into: 'Quarry' })
    const { weightAfter, turnover } = switches[0]!
    expect(switches[0]!.volatility).toBeCloseTo(volatilityAt(weightAfter, 0.5, turnover).volatility, 14)
    expect(switches[0]!.change).toBeLessThan(0)
  })

  it('may open shorts where the book holds some already', () => {
    expect(riskLowering({ ...inputs, weights: Float64Array.of(0.5, 0.5, -0.1) }, CASH).shorting).toBe(
      'shorting',
    )
  })
})

describe('implied returns beside expected ones', () => {
  const decomposition = volatilityAt(0.5, 0.5, 0)
  const of = (expected: (number | null)[] | null, risklessRate = 0) =>
    impliedReturnsOf(
      { names: inputs.names, decomposition, expected, risklessRate },
      { kind: 'risk aversion', value: 2.5 },
    )

  it('are by the year, with the difference and the return for each unit of marginal contribution', () => {
    const { rows, total, riskAversion, conventions } = of([0.05, 0.02, null], 0.01)
    expect(riskAversion).toBe(2.5)
    // 2.5 x 12 x (.0008 + .0001), 2.5 x 12 x (.0001 + .0002), 2.5 x 12 x -.00015
    expect(rows.map(({ implied }) => implied)).toEqual([
      expect.closeTo(0.027, 14),
      expect.closeTo(0.009, 14),
      expect.closeTo(-0.0045, 14),
    ])
    expect(rows[0]!.expected).toBeCloseTo(0.04, 15)
    expect(rows[0]!.difference).toBeCloseTo(0.013, 14)
    expect(rows[0]!.perUnitOfMarginal).toBeCloseTo(0.04 / decomposition.marginal![0]!, 14)
    expect(rows[2]).toMatchObject({ expected: null, difference: null, perUnitOfMarginal: null })
    // a blank of what is not held leaves the total whole: .5 x .04 + .5 x .01
    expect(total.expected).toBeCloseTo(0.025, 15)
    expect(total.implied).toBeCloseTo(0.018, 14)
    expect(total.perUnitOfMarginal).toBeCloseTo(0.025 / decomposition.volatility, 14)
    expect(conventions[0]).toBe(
      'All returns are those beyond the riskless rate, a year. Expected returns are shown less a riskless rate of 1.00%.',
    )
  })

  it('leave the total out where a holding has no expected return, and say so', () => {
    const { total, conventions } = of([0.05, null, null])
    expect(total).toMatchObject({ expected: null, difference: null, perUnitOfMarginal: null })
    expect(conventions.at(-1)).toBe(
      'The total of the expected returns is left out: not every holding has one.',
    )
    expect(of(null).conventions.join(' ')).not.toContain('left out')
  })

  it('of a stated total tell the risk aversion that follows', () => {
    const { rows, total, conventions } = impliedReturnsOf(
      { names: inputs.names, decomposition, expected: null, risklessRate: 0 },
      { kind: 'total', value: 0.036 },
    )
    expect(total.implied).toBe(0.036)
    // twice those at 2.5
    expect(rows[0]!.implied).toBeCloseTo(0.054, 14)
    expect(conventions[1]).toBe(
      'Scaled so that the whole book earns the stated 3.60%: a risk aversion of 5.00 follows.',
    )
  })
})

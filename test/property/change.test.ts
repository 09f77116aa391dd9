import fc from 'fast-check'
import { correlation, joinStates, returnsModel, splitChange, type RiskState } from '../../src/core'
import { absoluteGap } from '../closeness'

// The split against a second one that walks along the six orders with full covariance matrices, and what has to hold of any split. Books are measured
// by the largest sum of contributions without their signs that any mix has: it is the volatility of a book without hedges, and what the digits of a
// hedged one are lost to.

const real = (from: number, to: number) =>
  fc.integer({ min: Math.round(from * 1e6), max: Math.round(to * 1e6) }).map((k) => k / 1e6)

/** A date of a book: correlations are those of returns, so that they are some. A share of the positions is riskless. */
const state = (size: number, lowest: number) =>
  fc
    .record({
      dates: fc.integer({ min: 3, max: 12 }),
      returns: fc.array(real(-0.3, 0.3), { minLength: size * 12, maxLength: size * 12 }),
      weights: fc.array(real(lowest, 2), { minLength: size, maxLength: size }),
      still: fc.array(fc.integer({ min: 0, max: 5 }), { minLength: size, maxLength: size }),
    })
    .map(({ dates, returns, weights, still }): RiskState => {
      const block = Float64Array.from(returns.slice(0, dates * size), (r, k) =>
        still[k % size] === 0 ? 0 : r,
      )
      const model = returnsModel(block, dates, size)
      const volatilities = model.variances().map(Math.sqrt)
      const correlations = correlation(model)
      for (let i = 0; i < size; i++)
        for (let j = 0; j < size; j++) {
          const k = i * size + j
          if (i === j) correlations[k] = 1
          else if (Number.isNaN(correlations[k])) correlations[k] = 0
          // the same number on both sides of the diagonal
          else if (j < i) correlations[j * size + i] = correlations[k]!
        }
      return { weights: Float64Array.from(weights), volatilities, correlations }
    })

const pair = (lowest = -2) =>
  fc.integer({ min: 1, max: 7 }).chain((size) =>
    fc.record({
      from: state(size, lowest),
      to: state(size, lowest),
      drifted: fc.array(real(-2, 2), { minLength: size, maxLength: size }).map((w) => Float64Array.from(w)),
    }),
  )

/** w_i (C w)_i / s with C in full; and what its digits are lost to. */
function contributionsIn({ weights, volatilities, correlations }: RiskState): number[] {
  const n = weights.length
  const marginals = Array.from(weights, (_, i) => {
    let sum = 0
    for (let j = 0; j < n; j++)
      sum += volatilities[i]! * correlations[i * n + j]! * volatilities[j]! * weights[j]!
    return sum
  })
  const products = marginals.map((marginal, i) => marginal * weights[i]!)
  const variance = products.reduce((sum, product) => sum + product, 0)
  const gross = weights.reduce((sum, weight, i) => sum + Math.abs(weight) * volatilities[i]!, 0)
  return products.map((product) =>
    variance <= n * Number.EPSILON * gross * gross ? 0 : product / Math.sqrt(variance),
  )
}

const CAUSES = ['weights', 'volatilities', 'correlations'] as const
const ORDERS = [
  [0, 1, 2], [0, 2, 1], [1, 0, 2], [1, 2, 0], [2, 0, 1], [2, 1, 0],
] as const // prettier-ignore

function naiveSplit(from: RiskState, to: RiskState): readonly number[][] {
  const parts = CAUSES.map(() => Array.from(from.weights, () => 0))
  for (const order of ORDERS) {
    let here = from
    for (const k of order) {
      const next = { ...here, [CAUSES[k]!]: to[CAUSES[k]!] }
      const [was, is] = [contributionsIn(here), contributionsIn(next)]
      is.forEach((value, i) => (parts[k]![i]! += (value - was[i]!) / 6))
      here = next
    }
  }
  return parts
}

/** All mixes of two dates. */
const mixes = (from: RiskState, to: RiskState, others: readonly Float64Array[] = []): readonly RiskState[] =>
  [from, to].flatMap(({ volatilities }) =>
    [from, to].flatMap(({ correlations }) =>
      [from.weights, to.weights, ...others].map((weights) => ({ weights, volatilities, correlations })),
    ),
  )

/** The largest sum of contributions without signs; infinite where some mix is so hedged that rounding alone makes its contributions. */
function scaleOf(states: readonly RiskState[]): number {
  let scale = 0
  for (const each of states) {
    const parts = contributionsIn(each)
    const gross = each.weights.reduce((sum, weight, i) => sum + Math.abs(weight) * each.volatilities[i]!, 0)
    const volatility = parts.reduce((sum, part) => sum + part, 0)
    if (gross > 0 && volatility < 1e-3 * gross) return Infinity
    scale = Math.max(
      scale,
      parts.reduce((sum, part) => sum + Math.abs(part), 0),
    )
  }
  return scale
}

const sum = (values: ArrayLike<number>): number => Array.from(values).reduce((a, x) => a + x, 0)

test('parts by position add up to the change of its contribution, and all together to the change of volatility', () => {
  fc.assert(
    fc.property(pair(), ({ from, to }) => {
      const scale = scaleOf(mixes(from, to))
      fc.pre(scale < Infinity)
      const split = splitChange(from, to)
      const [was, is] = [contributionsIn(from), contributionsIn(to)]
      const parts = Array.from(
        split.positions,
        (part, i) => part + split.volatilities[i]! + split.correlations[i]!,
      )
      // contributions of a book hedged to a thousandth hold three digits less
      expect(
        absoluteGap(
          parts,
          is.map((value, i) => value - was[i]!),
        ),
      ).toBeLessThanOrEqual(1e-11 * scale)
      expect(Math.abs(sum(parts) - (split.to - split.from))).toBeLessThanOrEqual(1e-11 * scale)
    }),
  )
})

test('of books without short positions the parts add up to 1e-12 of the largest volatility that a mix has', () => {
  fc.assert(
    fc.property(pair(0), ({ from, to }) => {
      // contributions of a long book may still be negative where it holds what hedges
      const scale = scaleOf(mixes(from, to))
      fc.pre(scale < Infinity)
      const largest = Math.max(...mixes(from, to).map((mix) => sum(contributionsIn(mix))))
      fc.pre(scale < 10 * largest)
      const split = splitChange(from, to)
      const total = sum(split.positions) + sum(split.volatilities) + sum(split.correlations)
      expect(Math.abs(total - (split.to - split.from))).toBeLessThanOrEqual(1e-12 * largest)
    }),
  )
})

test('parts equal the average over the six orders, each walked with full covariance matrices', () => {
  fc.assert(
    fc.property(pair(), ({ from, to }) => {
      const scale = scaleOf(mixes(from, to))
      fc.pre(scale < Infinity)
      const split = splitChange(from, to)
      naiveSplit(from, to).forEach((parts, k) => {
        const ours = [split.positions, split.volatilities, split.correlations][k]!
        expect(absoluteGap(ours, parts)).toBeLessThanOrEqual(1e-11 * scale)
      })
    }),
  )
})

test('the way back has the same parts with the other sign', () => {
  fc.assert(
    fc.property(pair(), ({ from, to }) => {
      const scale = scaleOf(mixes(from, to))
      fc.pre(scale < Infinity)
      const [there, back] = [splitChange(from, to), splitChange(to, from)]
      for (const cause of ['positions', 'volatilities', 'correlations'] as const)
        expect(
          absoluteGap(
            there[cause],
            back[cause].map((part) => -part),
          ),
        ).toBeLessThanOrEqual(1e-14 * scale)
    }),
  )
})

test('a cause that did not change has no part, to the last bit', () => {
  const same = fc.record({ weights: fc.boolean(), volatilities: fc.boolean(), correlations: fc.boolean() })
  fc.assert(
    fc.property(pair(), same, ({ from, to: moved }, kept) => {
      const to = { ...moved, ...Object.fromEntries(CAUSES.filter((cause) => kept[cause]).map((cause) => [cause, from[cause].slice()])) } // prettier-ignore
      const split = splitChange(from, to)
      if (kept.weights) expect([...split.positions].every((part) => part === 0)).toBe(true)
      if (kept.volatilities) expect([...split.volatilities].every((part) => part === 0)).toBe(true)
      if (kept.correlations) expect([...split.correlations].every((part) => part === 0)).toBe(true)
    }),
  )
})

test('drift and trades add up to the part of positions, and each is nothing where there was none', () => {
  fc.assert(
    fc.property(pair(), ({ from, to, drifted }) => {
      const alone = from.weights.map((w, i) => (to.weights[i] === 0 ? 0 : w + (to.weights[i]! - drifted[i]!)))
      const scale = scaleOf(mixes(from, to, [drifted, alone]))
      fc.pre(scale < Infinity)
      const split = splitChange(from, to, drifted)
      expect(split.positions).toEqual(splitChange(from, to).positions)
      const both = split.drift!.map((part, i) => part + split.trades![i]!)
      expect(absoluteGap(both, split.positions)).toBeLessThanOrEqual(1e-12 * scale)

      const still = splitChange(from, to, from.weights)
      expect([...still.drift!].every((part) => part === 0)).toBe(true)
      const untraded = splitChange(from, to, to.weights)
      expect([...untraded.trades!].every((part) => part === 0)).toBe(true)
    }),
  )
})

test('parts scale with all volatilities, and with all weights', () => {
  fc.assert(
    fc.property(pair(), real(0.1, 20), ({ from, to, drifted }, factor) => {
      const scale = scaleOf(mixes(from, to, [drifted]))
      fc.pre(scale < Infinity)
      const split = splitChange(from, to)
      for (const what of ['weights', 'volatilities'] as const) {
        const scaled = (of: RiskState): RiskState => ({ ...of, [what]: of[what].map((x) => x * factor) })
        const larger = splitChange(scaled(from), scaled(to))
        for (const cause of ['positions', 'volatilities', 'correlations'] as const)
          expect(
            absoluteGap(
              larger[cause],
              split[cause].map((part) => part * factor),
            ),
          ).toBeLessThanOrEqual(1e-11 * scale * Math.max(1, factor))
      }
    }),
  )
})

test('the order in which positions are listed has no part in what comes out', () => {
  fc.assert(
    fc.property(pair(), fc.infiniteStream(fc.nat()), ({ from, to }, keys) => {
      const scale = scaleOf(mixes(from, to))
      fc.pre(scale < Infinity)
      const order = [...from.weights.keys()]
        .map((i) => [keys.next().value as number, i] as const)
        .sort(([a], [b]) => a - b)
        .map(([, i]) => i)
      const places = Int32Array.from(order)
      const { from: first, to: last, smallest, unknown } = joinStates(from, to, places, places)
      const stills = from.volatilities.some((v, i) => (v === 0) !== (to.volatilities[i] === 0))
      if (!stills) expect([smallest.from, smallest.to, unknown]).toEqual([null, null, null])
      fc.pre(!stills)
      const [split, moved] = [splitChange(from, to), splitChange(first, last)]
      for (const cause of ['positions', 'volatilities', 'correlations'] as const)
        expect(
          absoluteGap(
            moved[cause],
            order.map((i) => split[cause][i]!),
          ),
        ).toBeLessThanOrEqual(1e-11 * scale)
    }),
  )
})

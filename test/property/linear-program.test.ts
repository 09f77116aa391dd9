import fc from 'fast-check'
import loadHighs, { type LegacyHighs } from 'highs'
import { inOneGo } from '../../src/core'
import { leastCost, type LinearProgram } from '../../src/core/linear-program'

// Programs of any kind against HiGHS 1.15.3 (npm "highs", the solver of Huangfu & Hall (2018), Parallelizing the dual revised simplex method,
// Mathematical Programming Computation 10, 119-142), an independent computation of the same figure.

let highs: LegacyHighs

beforeAll(async () => {
  highs = await loadHighs()
})

/** A program with one list of coefficients for each row, easier to write down and to hand to another solver. */
interface Plain {
  readonly rows: readonly (readonly number[])[]
  readonly costs: readonly number[]
  readonly lower: readonly number[]
  readonly upper: readonly number[]
  readonly most: readonly number[]
  readonly equal: readonly boolean[]
}

const asProgram = ({ rows, costs, lower, upper, most, equal }: Plain): LinearProgram => ({
  rows: rows.length,
  columns: Float64Array.from(costs.flatMap((_, j) => rows.map((row) => row[j]!))),
  costs: Float64Array.from(costs),
  lower: Float64Array.from(lower),
  upper: Float64Array.from(upper),
  most: Float64Array.from(most),
  equal: Uint8Array.from(equal, Number),
  first: new Uint8Array(rows.length),
})

function byHighs({ rows, costs, lower, upper, most, equal }: Plain) {
  const sum = (values: readonly number[]) =>
    values.map((a, j) => `${a < 0 ? '-' : '+'} ${Math.abs(a)} x${j}`).join(' ')
  const side = (value: number) => (value === -Infinity ? '-inf' : value === Infinity ? '+inf' : String(value))
  return highs.solve(`Minimize
 cost: ${sum(costs)}
Subject To
${rows.map((row, r) => ` r${r}: ${sum(row)} ${equal[r] ? '=' : '<='} ${most[r]}`).join('\n')}
Bounds
${costs.map((_, j) => ` ${side(lower[j]!)} <= x${j} <= ${side(upper[j]!)}`).join('\n')}
End`)
}

/** Small numbers with few digits: ties and degenerate corners come often. */
const coefficient = fc.integer({ min: -4, max: 4 }).map((k) => k / 2)
const plain = fc
  .record({ m: fc.integer({ min: 1, max: 6 }), n: fc.integer({ min: 1, max: 12 }) })
  .chain(({ m, n }) =>
    fc.record({
      rows: fc.array(fc.array(coefficient, { minLength: n, maxLength: n }), { minLength: m, maxLength: m }),
      costs: fc.array(coefficient, { minLength: n, maxLength: n }),
      most: fc.array(fc.integer({ min: -3, max: 6 }), { minLength: m, maxLength: m }),
      equal: fc.array(fc.boolean(), { minLength: m, maxLength: m }),
      bounds: fc.array(
        fc.tuple(fc.constantFrom(-Infinity, -2, -1, 0, 0, 0, 1), fc.constantFrom(Infinity, 1, 2, 5)),
        { minLength: n, maxLength: n },
      ),
    }),
  )
  .map(({ bounds, ...rest }): Plain => ({
    ...rest,
    lower: bounds.map(([low]) => low),
    upper: bounds.map(([, high]) => high),
  }))

const sumOf = (values: ArrayLike<number>) => Array.from(values).reduce((a, b) => a + b, 0)
const valueOf = (row: readonly number[], x: Float64Array) => row.reduce((sum, a, j) => sum + a * x[j]!, 0)

describe('the least cost of any linear program', () => {
  test('is what HiGHS finds, as is whether there is one', () => {
    fc.assert(
      fc.property(plain, (p) => {
        const ours = inOneGo(leastCost(asProgram(p)))
        const theirs = byHighs(p)
        const possible = sumOf(ours.excess) < 1e-8
        if (theirs.Status === 'Optimal') {
          expect([ours.status, possible]).toEqual(['optimal', true])
          // 1e-7 is HiGHS's own tolerance
          expect(Math.abs(ours.cost - theirs.ObjectiveValue)).toBeLessThanOrEqual(
            1e-6 * (1 + Math.abs(ours.cost)),
          )
        } else {
          // its presolve does not always tell a program without solution from one without a least cost: a cost of 0 does
          const { Status } = byHighs({ ...p, costs: p.costs.map(() => 0) })
          if (Status === 'Optimal') expect([ours.status, possible]).toEqual(['unbounded', true])
          else expect([Status, possible]).toEqual(['Infeasible', false])
        }
      }),
    )
  })

  test('comes with a point within its bounds that has the excess it tells', () => {
    fc.assert(
      fc.property(plain, (p) => {
        const { x, excess, cost } = inOneGo(leastCost(asProgram(p)))
        x.forEach((value, j) => {
          expect(value).toBeGreaterThanOrEqual(p.lower[j]! - 1e-9)
          expect(value).toBeLessThanOrEqual(p.upper[j]! + 1e-9)
        })
        p.rows.forEach((row, r) => {
          const over = valueOf(row, x) - p.most[r]!
          const beyond = p.equal[r] ? Math.abs(over) : over
          expect(beyond).toBeLessThanOrEqual(excess[r]! + 1e-8)
        })
        expect(cost).toBeCloseTo(valueOf(p.costs, x), 8)
      }),
    )
  })

  test('comes with savings that prove it least (weak duality)', () => {
    fc.assert(
      fc.property(plain, (p) => {
        const { status, excess, savings, cost } = inOneGo(leastCost(asProgram(p)))
        fc.pre(status === 'optimal' && sumOf(excess) < 1e-9)
        savings.forEach((value, r) => {
          if (!p.equal[r]) expect(value).toBeGreaterThanOrEqual(-1e-9)
        })
        // the least over the bounds alone of costs with the rows priced in is a bound on the cost from below
        let bound = -savings.reduce((sum, value, r) => sum + value * p.most[r]!, 0)
        p.costs.forEach((c, j) => {
          const reduced = c + savings.reduce((sum, value, r) => sum + value * p.rows[r]![j]!, 0)
          if (Math.abs(reduced) > 1e-9) bound += reduced * (reduced > 0 ? p.lower[j]! : p.upper[j]!)
        })
        expect(Math.abs(bound - cost)).toBeLessThanOrEqual(1e-7 * (1 + Math.abs(cost)))
      }),
    )
  })

  test('where rows contradict each other, is behind the least excess that HiGHS finds as well', () => {
    fc.assert(
      fc.property(plain, (p) => {
        const m = p.rows.length
        const ours = inOneGo(leastCost({ ...asProgram(p), costs: new Float64Array(p.costs.length) }))
        // the same with the excess of each row written out: over it, and for equations short of it
        const unit = (r: number, value: number) => p.rows.map((_, k) => (k === r ? value : 0))
        const theirs = byHighs({
          rows: p.rows.map((row, r) => [...row, ...unit(r, -1), ...unit(r, 1)]),
          costs: [...p.costs.map(() => 0), ...new Array<number>(2 * m).fill(1)],
          lower: [...p.lower, ...new Array<number>(2 * m).fill(0)],
          upper: [
            ...p.upper,
            ...new Array<number>(m).fill(Infinity),
            ...p.equal.map((equal) => (equal ? Infinity : 0)),
          ],
          most: p.most,
          equal: p.equal,
        })
        expect(theirs.Status).toBe('Optimal')
        expect(sumOf(ours.excess)).toBeCloseTo(theirs.ObjectiveValue, 6)
      }),
    )
  })
})

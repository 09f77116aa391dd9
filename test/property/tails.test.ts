import fc from 'fast-check'
import {
  decompose,
  fitStudent,
  momentsOf,
  returnsModel,
  tailRisk,
  type ReturnsModel,
  type TailMethod,
} from '../../src/core'
import { relativeGap } from '../closeness'

const sum = (values: Float64Array) => values.reduce((a, x) => a + x, 0)

/** Whole numbers: sums of products are exact, dates tie often, and an oracle can count. */
const book = fc
  .record({ size: fc.integer({ min: 1, max: 5 }), dates: fc.integer({ min: 2, max: 30 }) })
  .chain(({ size, dates }) =>
    fc.record({
      size: fc.constant(size),
      dates: fc.constant(dates),
      returns: fc.array(fc.integer({ min: -6, max: 6 }), {
        minLength: size * dates,
        maxLength: size * dates,
      }),
      weights: fc.array(fc.integer({ min: -3, max: 4 }), { minLength: size, maxLength: size }),
      // in whole percents, so that p = 1 - confidence is known exactly
      percent: fc.integer({ min: 51, max: 99 }),
    }),
  )

const modelOf = (b: { returns: number[]; dates: number; size: number }): ReturnsModel =>
  returnsModel(Float64Array.from(b.returns), b.dates, b.size)
const tails = (model: ReturnsModel, weights: readonly number[], percent: number, method: TailMethod) =>
  tailRisk(model, Float64Array.from(weights), { method, confidence: percent / 100, periods: 1 }, model)

const historical: TailMethod = { kind: 'historical' }

/**
 * Acerbi & Tasche (2002), definition 2.6 (from memory), a second time: with q the smallest loss whose probability of being exceeded is below
 * p, ES = (sum of the losses above q / T + (p - share of dates above q) q) / p, and parts the same with the mean over the dates at q.
 */
function oracle({
  returns,
  dates,
  size,
  weights,
  percent,
}: typeof book extends fc.Arbitrary<infer B> ? B : never) {
  const position = (t: number, i: number) => -weights[i]! * returns[t * size + i]!
  const loss = (t: number) => weights.reduce((total, _, i) => total + position(t, i), 0)
  const all = Array.from({ length: dates }, (_, t) => t)
  // 100 x count < (100 - percent) x dates, in whole numbers: fewer dates than the tail holds
  const holds = (count: number) => 100 * count < (100 - percent) * dates
  const q = Math.min(...all.map(loss).filter((l) => holds(all.filter((t) => loss(t) > l).length)))
  const beyond = all.filter((t) => loss(t) > q)
  const cut = all.filter((t) => loss(t) === q)
  const p = (100 - percent) / 100
  const rest = p - beyond.length / dates
  const mean = (of: (t: number) => number) =>
    (beyond.reduce((total, t) => total + of(t), 0) / dates +
      (rest * cut.reduce((total, t) => total + of(t), 0)) / cut.length) /
    p
  return { valueAtRisk: q, shortfall: mean(loss), parts: weights.map((_, i) => mean((t) => position(t, i))) }
}

test('the historical tail is that of a count over the dates, ties included', () => {
  fc.assert(
    fc.property(book, (b) => {
      const t = tails(modelOf(b), b.weights, b.percent, historical)
      const expected = oracle(b)
      const gross = b.weights.reduce((total, w) => total + Math.abs(w), 0) * 6 || 1
      // rounding, in units of the largest loss there could be
      expect(Math.abs(t.valueAtRisk - expected.valueAtRisk)).toBeLessThan(1e-13 * gross)
      expect(Math.abs(t.shortfall! - expected.shortfall)).toBeLessThan(1e-12 * gross)
      t.parts!.forEach((part, i) => expect(Math.abs(part - expected.parts[i]!)).toBeLessThan(1e-12 * gross))
    }),
    { numRuns: 400 },
  )
})

test('parts add up to expected shortfall, which is no less than value at risk (Acerbi & Tasche 2002; Tasche 2008)', () => {
  const methods: TailMethod[] = [historical, { kind: 'normal' }, { kind: 'student', degrees: 3.5 }]
  fc.assert(
    fc.property(book, fc.constantFrom(...methods), (b, method) => {
      const model = modelOf(b)
      const t = tails(model, b.weights, b.percent, method)
      const scale = 1e-12 * (b.weights.reduce((total, w) => total + Math.abs(w), 0) * 6 + 1)
      expect(Math.abs(sum(t.parts!) - t.shortfall!)).toBeLessThan(scale)
      expect(t.shortfall!).toBeGreaterThanOrEqual(t.valueAtRisk - scale)
      if (t.shares) expect(sum(t.shares)).toBeCloseTo(1, 8)
      if (t.valueAtRiskParts) expect(Math.abs(sum(t.valueAtRiskParts) - t.valueAtRisk)).toBeLessThan(scale)
    }),
  )
})

// Figures that are no whole numbers: no ties, and a volatility that is more than rounding.
const spread = fc
  .record({ size: fc.integer({ min: 1, max: 6 }), dates: fc.integer({ min: 12, max: 60 }) })
  .chain(({ size, dates }) =>
    fc.record({
      size: fc.constant(size),
      dates: fc.constant(dates),
      returns: fc.array(fc.double({ min: -0.2, max: 0.2, noNaN: true }), {
        minLength: size * dates,
        maxLength: size * dates,
      }),
      weights: fc.array(fc.double({ min: 0.05, max: 1, noNaN: true }), { minLength: size, maxLength: size }),
      percent: fc.integer({ min: 60, max: 97 }),
    }),
  )
  .filter((b) => decompose(modelOf(b), Float64Array.from(b.weights)).volatility > 1e-3)

const every: TailMethod[] = [
  historical,
  { kind: 'normal' },
  { kind: 'student', degrees: 4 },
  { kind: 'student', degrees: null },
]

test('a book twice as large has twice the tail and the same shares (positive homogeneity; Tasche 2008)', () => {
  fc.assert(
    fc.property(
      spread,
      fc.constantFrom(...every),
      fc.double({ min: 0.1, max: 9, noNaN: true }),
      (b, method, factor) => {
        const model = modelOf(b)
        const one = attemptedTails(model, b.weights, b.percent, method)
        if (!one) return
        const many = tails(
          model,
          b.weights.map((w) => factor * w),
          b.percent,
          method,
        )
        // in units of the book: a tail that nearly comes to nothing has no digits of its own
        const unit = factor * decompose(model, Float64Array.from(b.weights)).volatility
        expect(Math.abs(many.valueAtRisk - factor * one.valueAtRisk)).toBeLessThan(1e-9 * unit)
        expect(Math.abs(many.shortfall! - factor * one.shortfall!)).toBeLessThan(1e-9 * unit)
        if (one.shares && many.shares && one.shortfall! * factor > 1e-3 * unit)
          expect(relativeGap(many.shares, one.shares)).toBeLessThan(1e-9)
      },
    ),
  )
})

/** null where the likeliest Student t has no volatility. */
function attemptedTails(...args: Parameters<typeof tails>) {
  const [model, weights, , method] = args
  const isFit = method.kind === 'student' && method.degrees === null
  return isFit && !fitStudent(model.portfolioReturns(Float64Array.from(weights))) ? null : tails(...args)
}

test('parts are weight times derivative, of the historical shortfall as well (Tasche 2008)', () => {
  fc.assert(
    fc.property(spread, fc.constantFrom(historical, ...every.slice(1, 3)), fc.nat(), (b, method, pick) => {
      const model = modelOf(b)
      const i = pick % b.size
      const at = (step: number) =>
        tails(
          model,
          b.weights.map((w, k) => (k === i ? w + step : w)),
          b.percent,
          method,
        ).shortfall!
      const step = 1e-6
      const [left, right] = [(at(0) - at(-step)) / step, (at(step) - at(0)) / step]
      // where the order of two dates turns within the step, the historical figure has a kink and no one derivative
      if (Math.abs(left - right) > 1e-4) return
      const part = tails(model, b.weights, b.percent, method).parts![i]!
      expect(Math.abs(part - (b.weights[i]! * (left + right)) / 2)).toBeLessThan(1e-4)
    }),
  )
})

test('shares of a normal shortfall are the shares of risk, and neither depends on the confidence (Bruder & Roncalli 2012)', () => {
  fc.assert(
    fc.property(
      spread,
      fc.constantFrom<TailMethod>({ kind: 'normal' }, { kind: 'student', degrees: 7 }),
      (b, method) => {
        const model = modelOf(b)
        const { share } = decompose(model, Float64Array.from(b.weights))
        const { parts, shortfall, valueAtRisk, valueAtRiskParts } = tails(model, b.weights, b.percent, method)
        expect(
          relativeGap(
            parts!.map((part) => part / shortfall!),
            share!,
          ),
        ).toBeLessThan(1e-12)
        expect(
          relativeGap(
            valueAtRiskParts!.map((part) => part / valueAtRisk),
            share!,
          ),
        ).toBeLessThan(1e-12)
      },
    ),
  )
})

test('a fit of Student’s t moves with the series: the same degrees for a + b x (equivariance)', () => {
  const numbers = fc.array(fc.double({ min: -1, max: 1, noNaN: true }), { minLength: 15, maxLength: 80 })
  fc.assert(
    fc.property(
      numbers,
      fc.double({ min: 0.01, max: 50, noNaN: true }),
      fc.double({ min: -5, max: 5, noNaN: true }),
      (x, b, a) => {
        const plain = Float64Array.from(x)
        fc.pre(momentsOf(plain).variance > 1e-4)
        const fit = fitStudent(plain)
        const moved = fitStudent(plain.map((value) => a + b * value))
        expect(moved === null).toBe(fit === null)
        // the rounding of a + b x is up to 5/0.01 units of the deviation of x; a flat likelihood makes more of it
        if (!fit || !moved || fit.degrees > 50) return
        expect(relativeGap(moved.degrees, fit.degrees)).toBeLessThan(1e-6)
        expect(relativeGap(moved.scale, b * fit.scale)).toBeLessThan(1e-6)
      },
    ),
  )
})

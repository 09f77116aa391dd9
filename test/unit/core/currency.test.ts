import { currencySplit, Fault, matrixModel } from '../../../src/core'

// By hand: A at home, B abroad, the currency of B, and another currency nobody holds.
//   C = [.04 .01 0 0 | .01 .09 .02 0 | 0 .02 .01 0 | 0 0 0 .01],  w = [.5 .5 0 0]:  C w = [.025 .05 .01 0],  w'C w = .0375
const model = matrixModel(
  Float64Array.of(0.04, 0.01, 0, 0, 0.01, 0.09, 0.02, 0, 0, 0.02, 0.01, 0, 0, 0, 0, 0.01),
  4,
)
const s = Math.sqrt(0.0375)

test('the currency part is the weight times the covariance of the currency with the book, over the volatility', () => {
  const split = currencySplit(model, Float64Array.of(0.5, 0.5, 0, 0), Int32Array.of(-1, 2, -1, -1))
  ;[0, 0.005 / s, 0, 0].forEach((part, i) => expect(split.currency[i]).toBeCloseTo(part, 14))
  ;[0.0125 / s, 0.02 / s, 0, 0].forEach((part, i) => expect(split.local[i]).toBeCloseTo(part, 14))
  expect(split.byCurrency).toEqual([{ series: 2, exposure: 0.5, contribution: split.currency[1] }])
})

test('currencies come in the order of their first position, with the sum of the weights in them', () => {
  const { byCurrency } = currencySplit(
    model,
    Float64Array.of(0.5, 0.5, 0.25, -0.125),
    Int32Array.of(3, 2, 2, 3),
  )
  expect(byCurrency.map(({ series, exposure }) => [series, exposure])).toEqual([
    [3, 0.375],
    [2, 0.75],
  ])
})

test('a book without risk has parts of 0', () => {
  const split = currencySplit(model, new Float64Array(4), Int32Array.of(2, 2, -1, -1))
  expect([...split.local, ...split.currency]).toEqual(Array(8).fill(0))
  expect(split.byCurrency).toEqual([{ series: 2, exposure: 0, contribution: 0 }])
})

test.each([
  [Int32Array.of(-1, 2, -1), 'shape', undefined],
  [Int32Array.of(-1, 2, -1, 4), 'out-of-range', 3],
  [Int32Array.of(-1, -2, -1, -1), 'out-of-range', 1],
])('currencies %j are refused', (currencyOf, code, row) => {
  let fault: unknown
  try {
    currencySplit(model, new Float64Array(4), currencyOf)
  } catch (error) {
    fault = error
  }
  expect(fault).toBeInstanceOf(Fault)
  expect((fault as Fault).code).toBe(code)
  expect((fault as Fault).where.row).toBe(row)
})

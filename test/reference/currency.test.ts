import { currencySplit, matrixModel } from '../../src/core'
import { absoluteGap } from '../closeness'
import { readJson } from './data'

// Jorion, Value at Risk, 3rd ed. (2007), chapter 7, two-currency example (from memory; published.json, jorion-2ccy-printed): 2m and 1m held in
// two currencies themselves, so that all the risk is the currencies'. Figures and tolerances as printed there.
test('a book of two currencies and nothing else has no local part, and each currency its component value at risk', () => {
  const { inputs, outputs, tolerance } = readJson<{
    readonly checks: readonly {
      readonly id: string
      readonly inputs: { readonly values: number[]; readonly vol: readonly number[]; readonly z: number }
      readonly outputs: { readonly componentVaR: number[]; readonly portfolioVaR: number }
      readonly tolerance: { readonly componentVaR: number; readonly portfolioVaR: number }
    }[]
  }>('published.json').checks.find(({ id }) => id === 'jorion-2ccy-printed')!
  const [a, b] = inputs.vol
  const { local, currency, byCurrency } = currencySplit(
    matrixModel(Float64Array.of(a! * a!, 0, 0, b! * b!), 2),
    Float64Array.from(inputs.values),
    Int32Array.of(0, 1),
  )
  expect([...local]).toEqual([0, 0])
  const parts = currency.map((part) => inputs.z * part)
  expect(absoluteGap(parts, outputs.componentVaR)).toBeLessThanOrEqual(tolerance.componentVaR)
  expect(absoluteGap(parts[0]! + parts[1]!, outputs.portfolioVaR)).toBeLessThanOrEqual(tolerance.portfolioVaR)
  expect(byCurrency.map(({ exposure }) => exposure)).toEqual(inputs.values)
})

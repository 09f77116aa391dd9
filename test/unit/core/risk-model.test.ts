import { correlation, covariance, kernelForm, matrixModel, returnsModel } from '../../../src/core'
import { relativeGap } from '../../closeness'
import { textbookCovariance } from '../../textbook'

// Any numbers will do below: the expected values are worked out by the textbook forms in test/textbook.ts, or by hand.
const rows = [
  [0.01, -0.02, 0.003],
  [0.02, 0.01, -0.004],
  [-0.03, 0.015, 0.001],
  [0.005, -0.01, 0.02],
  [0.012, 0.002, -0.007],
]
const block = Float64Array.from(rows.flat())
const weights = Float64Array.of(0.5, -0.2, 0.9)

describe('a model of a block of returns', () => {
  it('runs on WebAssembly in this host', () => {
    expect(kernelForm).toBe('simd')
    expect(returnsModel(block, 5, 3).form).toBe('simd')
  })

  it('has the covariance matrix of the textbook, divisor T-1', () => {
    expect(relativeGap(covariance(returnsModel(block, 5, 3)), textbookCovariance(rows).flat())).toBeLessThan(
      1e-14,
    )
  })

  it('has the exponentially weighted covariance matrix of the textbook, newest row last', () => {
    const model = returnsModel(block, 5, 3, { kind: 'exponential', decay: 0.9 })
    expect(relativeGap(covariance(model), textbookCovariance(rows, 0.9).flat())).toBeLessThan(1e-14)
  })

  it('applies that matrix to weights without forming it', () => {
    const C = textbookCovariance(rows)
    const Cw = C.map((row) => row.reduce((a, c, j) => a + c * weights[j]!, 0))
    const { marginals, variance } = returnsModel(block, 5, 3).apply(weights)
    expect(relativeGap(marginals, Cw)).toBeLessThan(1e-14)
    expect(
      relativeGap(
        variance,
        Cw.reduce((a, c, i) => a + c * weights[i]!, 0),
      ),
    ).toBeLessThan(1e-14)
  })

  it('gives back what error bands need: centred rows, portfolio returns and weights of dates', () => {
    const model = returnsModel(block, 5, 3, { kind: 'exponential', decay: 0.8 })
    const y = model.portfolioReturns(weights)
    let total = 0
    let variance = 0
    for (let t = 0; t < 5; t++) {
      const z = model.centredRow(t)
      expect(
        relativeGap(
          z.map((x, i) => x + model.means[i]!),
          rows[t]!,
        ),
      ).toBeLessThan(1e-15)
      expect(y[t]).toBeCloseTo(z[0]! * 0.5 - z[1]! * 0.2 + z[2]! * 0.9, 16)
      total += model.rowWeights[t]!
      variance += model.rowWeights[t]! * y[t]! ** 2
    }
    expect(total).toBeCloseTo(1, 15)
    expect(relativeGap(model.correction * variance, model.apply(weights).variance)).toBeLessThan(1e-14)
  })

  it('weights dates alike by default, and by powers of the decay factor otherwise', () => {
    expect(Array.from(returnsModel(block, 5, 3).rowWeights)).toEqual([0.2, 0.2, 0.2, 0.2, 0.2])
    const { rowWeights, correction } = returnsModel(block, 5, 3, { kind: 'exponential', decay: 0.5 })
    // 1, 2, 4, 8, 16 over 31
    expect(
      relativeGap(
        rowWeights,
        [1, 2, 4, 8, 16].map((x) => x / 31),
      ),
    ).toBeLessThan(1e-15)
    expect(correction).toBe(1)
  })

  it('does not change the block it is given, nor keep it', () => {
    const given = block.slice()
    const model = returnsModel(given, 5, 3)
    expect(given).toEqual(block)
    const before = model.apply(weights)
    given.fill(7)
    expect(model.apply(weights)).toEqual(before)
  })

  it('answers with copies: changing one changes no later answer', () => {
    const model = returnsModel(block, 5, 3)
    const once = model.variances()
    const kept = once.slice()
    once.fill(9)
    model.centredRow(0).fill(9)
    model.apply(weights).marginals.fill(9)
    expect(model.variances()).toEqual(kept)
    expect(model.centredRow(0)[0]).not.toBe(9)
    expect(model.apply(weights).marginals[0]).not.toBe(9)
  })

  it('gives a column that never changes a variance of exactly 0, whatever its value rounds to', () => {
    const constant = Float64Array.from(rows.flatMap(([a], t) => [a! + t, 0.1]))
    const model = returnsModel(constant, 5, 2)
    expect(model.variances()[1]).toBe(0)
    expect(model.means[1]).toBe(0.1)
    expect(model.apply(Float64Array.of(0.3, 5)).marginals[1]).toBe(0)
  })

  it('takes a block larger than one page of memory, and one of two numbers', () => {
    const large = Float64Array.from({ length: 300 * 101 }, (_, k) => Math.sin(k * k))
    const model = returnsModel(large, 300, 101)
    expect(model.form).toBe('simd')
    const y = Array.from({ length: 300 }, (_, t) => large[t * 101 + 100]!)
    expect(relativeGap(model.variances()[100]!, textbookCovariance(y.map((x) => [x])).flat())).toBeLessThan(
      1e-13,
    )
    // variance of 1 and 3 is 2
    expect(returnsModel(Float64Array.of(1, 3), 2, 1).apply(Float64Array.of(1)).variance).toBe(2)
  })

  it('keeps working when many blocks live at once', () => {
    const models = Array.from({ length: 400 }, () => returnsModel(block, 5, 3))
    const expected = models[0]!.apply(weights).variance
    for (const model of models) expect(model.apply(weights).variance).toBe(expected)
  })
})

describe('a model of a given matrix', () => {
  const C = Float64Array.of(0.04, 0.006, 0.006, 0.09)

  it('multiplies', () => {
    // by hand: C(1, -1) = (0.034, -0.084), w'Cw = 0.118
    const { marginals, variance } = matrixModel(C, 2).apply(Float64Array.of(1, -1))
    expect(relativeGap(marginals, [0.034, -0.084])).toBeLessThan(1e-15)
    expect(relativeGap(variance, 0.118)).toBeLessThan(1e-15)
  })

  it('keeps a copy and gives copies', () => {
    const given = C.slice()
    const model = matrixModel(given, 2)
    given.fill(0)
    model.matrix().fill(0)
    expect(model.matrix()).toEqual(C)
    expect(Array.from(model.variances())).toEqual([0.04, 0.09])
  })

  it('accepts asymmetry that is rounding', () => {
    expect(() => matrixModel(Float64Array.of(0.04, 0.006, 0.006 + 5e-10, 0.09), 2)).not.toThrow()
  })
})

describe('a correlation matrix', () => {
  it('has ones on its diagonal and c_ij / sqrt(c_ii c_jj) beside it', () => {
    // by hand: 0.03 / (0.2 * 0.3) = 0.5
    expect(Array.from(correlation(matrixModel(Float64Array.of(0.04, 0.03, 0.03, 0.09), 2)))).toEqual([
      1, 0.5, 0.5, 1,
    ])
  })

  it('is NaN for a riskless position, in its row, column and diagonal', () => {
    const R = correlation(matrixModel(Float64Array.of(0.04, 0, 0, 0), 2))
    expect(Array.from(R)).toEqual([1, NaN, NaN, NaN])
  })
})

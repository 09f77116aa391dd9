import {
  bootstrap,
  BOOTSTRAP_GENERATOR,
  decompose,
  Fault,
  returnsModel,
  standardErrors,
  type BootstrapChoice,
  type BootstrapResult,
} from '../../../src/core'
import { relativeGap } from '../../closeness'

const dates = 120
const rows = Array.from({ length: dates }, (_, t) => [
  Math.sin(t * t) / 50,
  Math.cos(3 * t * t) / 30 + Math.sin(t * t) / 90,
  Math.sin(7 * t + 1) ** 3 / 20,
])
const block = Float64Array.from(rows.flat())
const weights = Float64Array.of(0.6, 0.5, -0.2)
const model = returnsModel(block, dates, 3)
const choice: BootstrapChoice = { replicates: 200, seed: 42, blockLength: 1 }

function run(...args: Parameters<typeof bootstrap>): { progress: number[]; result: BootstrapResult } {
  const work = bootstrap(...args)
  const progress: number[] = []
  for (;;) {
    const step = work.next()
    if (step.done) return { progress, result: step.value }
    progress.push(step.value)
  }
}

describe('a bootstrap', () => {
  const { progress, result } = run(model, weights, choice)

  it('gives the same figures again with the same seed, on either form of the kernel, and others with another', () => {
    expect(run(model, weights, choice).result).toEqual(result)
    expect(run(returnsModel(block, dates, 3, undefined, 'plain'), weights, choice).result).toEqual(result)
    const other = run(model, weights, { ...choice, seed: 43 }).result
    expect(other.volatility.deviation).not.toBe(result.volatility.deviation)
  })

  it('says what it was asked for, and names its generator', () => {
    expect(result).toMatchObject({ ...choice, withoutRisk: 0 })
    expect(BOOTSTRAP_GENERATOR).toContain('MT19937')
  })

  it('tells how far it is, from 0 to 1', () => {
    expect(progress[0]).toBe(0)
    expect(progress.at(-1)).toBe(1)
    expect(progress).toEqual(progress.slice().sort((a, b) => a - b))
  })

  it('yields often where the block is large', () => {
    const wide = returnsModel(
      Float64Array.from({ length: 1000 * 1000 }, (_, k) => Math.sin(k * k)),
      1000,
      1000,
    )
    const yields = run(wide, new Float64Array(1000).fill(0.001), { ...choice, replicates: 40 }).progress
    // a million numbers a replicate: every fourth while drawing
    expect(yields.filter((done) => done < 0.8).length).toBeGreaterThanOrEqual(10)
  })

  it('lets nothing vary that cannot: an only position has all the risk, a riskless one none', () => {
    const cash = returnsModel(Float64Array.from(rows.flatMap(([a]) => [a!, 0.001])), dates, 2)
    const { share, contribution } = run(cash, Float64Array.of(0.5, 0.5), choice).result
    expect(relativeGap(share!.lower, [1, 0])).toBeLessThan(1e-12)
    expect(relativeGap(share!.upper, [1, 0])).toBeLessThan(1e-12)
    expect(share!.deviation[0]).toBeLessThan(1e-12)
    expect([contribution.deviation[1], contribution.upper[1]]).toEqual([0, 0])
  })

  it('has figures of zero and no shares where there is no risk', () => {
    const twins = returnsModel(Float64Array.from(rows.flatMap(([a]) => [a!, a!])), dates, 2)
    const none = run(twins, Float64Array.of(1, -1), choice).result
    expect(none).toMatchObject({ withoutRisk: 200, share: null })
    expect(none.volatility).toEqual({ deviation: 0, lower: 0, upper: 0 })
  })

  it('counts the replicates that drew one date only, and leaves them out of the shares', () => {
    const two = returnsModel(Float64Array.of(0.01, 0.02, 0.03, -0.02), 2, 2)
    const { withoutRisk, share, volatility } = run(two, Float64Array.of(0.5, 0.5), choice).result
    // two dates drawn: the same one twice in half of all cases; 200 of them: within 5 standard deviations of 7.07
    expect(Math.abs(withoutRisk - 100)).toBeLessThan(36)
    expect(volatility.lower).toBe(0)
    // with both drawn the shares are those of the history
    const p = decompose(two, Float64Array.of(0.5, 0.5)).share!
    expect(relativeGap(share!.lower, p)).toBeLessThan(1e-12)
    expect(relativeGap(share!.upper, p)).toBeLessThan(1e-12)
  })

  it('keeps exponential weights with their dates, as the closed form does', () => {
    const decaying = returnsModel(block, dates, 3, { kind: 'exponential', decay: 0.97 })
    const drawn = run(decaying, weights, { ...choice, replicates: 2000 }).result
    const closed = standardErrors(decaying, weights)
    // 61 effective dates: first-order forms are good to about a tenth there
    expect(Math.abs(drawn.volatility.deviation / closed.volatility - 1)).toBeLessThan(0.15)
    drawn.share!.deviation.forEach((deviation, i) => {
      expect(Math.abs(deviation / closed.share![i]! - 1)).toBeLessThan(0.15)
    })
  })

  it('shows with blocks what autocorrelation does to the error, and not with single dates', () => {
    // every return lasts for ten dates: the history tells as much as a tenth of its dates, errors are sqrt(10) as large
    const lasting = returnsModel(
      Float64Array.from({ length: 2000 }, (_, t) => Math.sin(Math.floor(t / 10) ** 2)),
      2000,
      1,
    )
    const one = Float64Array.of(1)
    const closed = standardErrors(lasting, one).volatility
    const deviation = (blockLength: number) =>
      run(lasting, one, { replicates: 1000, seed: 5, blockLength }).result.volatility.deviation
    // 1000 replicates: 4 standard deviations of 1/sqrt(2000) are 9%
    expect(Math.abs(deviation(1) / closed - 1)).toBeLessThan(0.1)
    // blocks of 100 catch 96.7% of the variance of runs of ten
    expect(Math.abs(deviation(100) / (closed * Math.sqrt(10)) - 1)).toBeLessThan(0.2)
  })
})

test('percentiles lie between two replicates by straight line', () => {
  // Eight dates of +1 and -1: a replicate with k times +1 has the volatility 2 sqrt(q (1-q) 8/7), q = k/8. Of 40 replicates the 2.5th
  // percentile is at place 39 x 0.025 = 0.975 from the smallest; where that one is 0 and no other is, 0.975 times the second.
  const coin = returnsModel(Float64Array.of(1, -1, 1, -1, 1, -1, 1, -1), 8, 1)
  const possible = [1, 2, 3, 4].map((k) => 2 * Math.sqrt(((k / 8) * (1 - k / 8) * 8) / 7))
  const one = Array.from({ length: 100 }, (_, seed) =>
    run(coin, Float64Array.of(1), { replicates: 40, seed, blockLength: 1 }),
  ).filter(({ result }) => result.withoutRisk === 1)
  expect(one.length).toBeGreaterThan(0)
  for (const { result } of one) {
    const second = result.volatility.lower / 0.975
    expect(Math.min(...possible.map((volatility) => Math.abs(volatility - second)))).toBeLessThan(1e-12)
  }
})

test('blocks are circular: one of all dates is the history itself, wherever it starts', () => {
  const { volatility } = run(model, weights, { ...choice, blockLength: dates }).result
  const { volatility: whole } = decompose(model, weights)
  for (const figure of [volatility.lower, volatility.upper])
    expect(relativeGap(figure, whole)).toBeLessThan(1e-13)
})

describe('a bootstrap refuses', () => {
  const refused: [string, Partial<BootstrapChoice>, string][] = [
    ['too few replicates for its percentiles', { replicates: 39 }, 'replicates'],
    ['half a replicate', { replicates: 100.5 }, 'replicates'],
    ['more figures than memory is taken for', { replicates: 1e9 }, 'replicates'],
    ['a negative seed', { seed: -1 }, 'seed'],
    ['a seed that is no number', { seed: NaN }, 'seed'],
    ['a seed beyond 32 bits, which would be another one', { seed: 2 ** 32 }, 'seed'],
    ['blocks of no dates', { blockLength: 0 }, 'block length'],
    ['blocks longer than the history', { blockLength: dates + 1 }, 'block length'],
  ]
  it.each(refused)('%s', (_name, part, argument) => {
    const attempt = () => run(model, weights, { ...choice, ...part })
    expect(attempt).toThrow(Fault)
    expect(attempt).toThrow(new RegExp(`^${argument}: `))
  })

  it('weights of another number than positions', () => {
    expect(() => run(model, Float64Array.of(1), choice)).toThrow('weights: 1 numbers')
  })
})

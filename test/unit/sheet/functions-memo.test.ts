/** A block that many cells use is centred once: counted at the door of the numerical core. */
import * as core from '../../../src/core'
import { worksheetFunctions } from '../../../src/sheet/functions'

jest.mock('../../../src/core', () => {
  const actual = jest.requireActual<typeof core>('../../../src/core')
  return { ...actual, estimateModel: jest.fn(actual.estimateModel), decompose: jest.fn(actual.decompose) }
})

const models = core.estimateModel as jest.MockedFunction<typeof core.estimateModel>
const decompositions = core.decompose as jest.MockedFunction<typeof core.decompose>
const call = (id: string, ...args: unknown[]): unknown =>
  (worksheetFunctions[id] as (...given: unknown[]) => unknown)(...args)

/** A block of its own for each seed, in fresh arrays at each call, as a host hands it over. */
const block = (seed: number, dates = 60, size = 8): number[][] =>
  Array.from({ length: dates }, (_, t) =>
    Array.from({ length: size }, (_, i) => Math.sin(seed + 3 * t + i * t)),
  )
const weights = (bump = 0): number[][] => Array.from({ length: 8 }, (_, i) => [i === 0 ? 0.2 + bump : 0.1])

beforeEach(() => {
  models.mockClear()
  decompositions.mockClear()
})

it('a thousand cells over one block centre it once', () => {
  const ids = [
    'VOLATILITY',
    'STANDALONE',
    'MARGINAL',
    'CONTRIBUTION',
    'RISKSHARE',
    'BETA',
    'DIVERSIFICATION',
    'EFFECTIVE',
  ]
  for (let k = 0; k < 1000; k++) call(ids[k % ids.length]!, weights(), block(1))
  expect(models).toHaveBeenCalledTimes(1)
  expect(decompositions).toHaveBeenCalledTimes(1)
})

it('other weights, periods or matrices of the block need no other centring', () => {
  for (let k = 0; k < 20; k++) call('CONTRIBUTION', weights(k / 100), block(2), 1 + k)
  call('COVARIANCE', block(2))
  call('CORRELATION', block(2))
  expect(models).toHaveBeenCalledTimes(1)
  expect(decompositions).toHaveBeenCalledTimes(20)
})

it('every estimator has its own', () => {
  for (let k = 0; k < 5; k++) {
    for (const estimator of ['sample', 'exponential', 'exponential 0,97'])
      call('VOLATILITY', weights(), block(3), 1, estimator)
  }
  expect(models).toHaveBeenCalledTimes(3)
})

it.each([
  ['its first number', (cells: unknown[][]) => (cells[0]![0] = 0.123)],
  ['its last number', (cells: unknown[][]) => (cells[59]![7] = 0.123)],
  ['the order of two rows', (cells: unknown[][]) => cells.push(...cells.splice(3, 1))],
])('a change of %s is seen', (_, change) => {
  const before = call('VOLATILITY', weights(), block(4), 1, 'exponential')
  const changed: unknown[][] = block(4)
  change(changed)
  expect(call('VOLATILITY', weights(), changed, 1, 'exponential')).not.toBe(before)
  expect(call('VOLATILITY', weights(), block(4), 1, 'exponential')).toBe(before)
})

it('a change of a name or of a date is seen', () => {
  const headed = (names: string[], days: unknown[]) => [
    ['Date', ...names],
    ...block(5, 3, 2).map((row, t) => [days[t], ...row]),
  ]
  const of = (name: string, cells: unknown[][]) => call('BREAKDOWN', name, 1, cells, 1, 'exponential')
  const first = of('A', headed(['A', 'B'], ['2026-01-01', '2026-01-02', '2026-01-03']))
  expect(of('A', headed(['B', 'A'], ['2026-01-01', '2026-01-02', '2026-01-03']))).not.toEqual(first)
  expect(of('A', headed(['A', 'B'], ['2026-01-04', '2026-01-02', '2026-01-03']))).not.toEqual(first)
})

it('the arrays a host hands over may be changed by it afterwards', () => {
  const cells = block(6)
  const before = call('VOLATILITY', weights(), cells)
  cells[0]![0] = 5
  expect(call('VOLATILITY', weights(), cells)).not.toBe(before)
})

it('the eight blocks used last are kept, no more', () => {
  for (let seed = 10; seed < 19; seed++) call('VOLATILITY', weights(), block(seed))
  expect(models).toHaveBeenCalledTimes(9)
  for (let seed = 18; seed > 10; seed--) call('VOLATILITY', weights(), block(seed))
  expect(models).toHaveBeenCalledTimes(9)
  call('VOLATILITY', weights(), block(10))
  expect(models).toHaveBeenCalledTimes(10)
})

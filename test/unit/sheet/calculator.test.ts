import { Fault } from '../../../src/core'
import { startJob, steppingCalculator } from '../../../src/sheet'
import { idleWork } from './blocks-of-cells'

/** Returns typed for these tests: sines of no common period. */
const returns = (dates: number, size: number) =>
  Float64Array.from({ length: dates * size }, (_, k) => 0.01 * Math.sin(1 + k * k + (k % size)))
const bootstrap = (replicates: number) => ({
  returns: returns(200, 20),
  dates: 200,
  size: 20,
  weighting: { kind: 'sample' } as const,
  weights: new Float64Array(20).fill(0.05),
  choice: { replicates, seed: 7, blockLength: 1 },
})
const setUp = (change: object) => ({
  rule: 'common dates' as const,
  repair: 'nearest' as const,
  estimator: { kind: 'sample' } as const,
  returns: returns(40, 3),
  dates: 40,
  size: 3,
  bare: false,
  common: null,
  ...change,
})

test('a computation run in slices gives what it gives in one go', async () => {
  const sliced = await steppingCalculator.run('bootstrap', bootstrap(60), idleWork())
  const steps = startJob('bootstrap', bootstrap(60))
  let step = steps.next()
  while (!step.done) step = steps.next()
  expect(sliced).toEqual(step.value)
})

test('a long computation gives way between slices and tells how far it is', async () => {
  const shares: (number | null)[] = []
  let turns = 0
  const timer = setInterval(() => turns++, 1)
  await steppingCalculator.run('bootstrap', bootstrap(6_000), {
    ...idleWork(),
    progress: (what, share) => {
      expect(what).toBe('Running the bootstrap')
      shares.push(share)
    },
  })
  clearInterval(timer)
  expect(shares.length).toBeGreaterThan(2)
  expect(turns).toBeGreaterThan(2)
  expect([...shares].sort((a, b) => a! - b!)).toEqual(shares)
  expect(shares.every((share) => share !== null && share >= 0 && share <= 1)).toBe(true)
})

test('a computation that is cancelled ends with the word that it was', async () => {
  const stop = new AbortController()
  const run = steppingCalculator.run('bootstrap', bootstrap(100_000), {
    signal: stop.signal,
    progress: () => stop.abort(),
  })
  await expect(run).rejects.toMatchObject({ code: 'cancelled' })
  await expect(run).rejects.toBeInstanceOf(Fault)
})

test('a fault of a computation is told as it is', async () => {
  await expect(
    steppingCalculator.run('bootstrap', { ...bootstrap(60), weights: new Float64Array(3) }, idleWork()),
  ).rejects.toMatchObject({ code: 'shape' })
})

test('the set-up gives what its estimator needs and no more', async () => {
  const sample = await steppingCalculator.run('set up', setUp({}), idleWork())
  expect(sample).toMatchObject({ shrinkage: null, matrix: null, pairs: null })
  expect(sample.condition?.condition).toBeGreaterThan(1)
  expect(sample.normality?.series).toHaveLength(3)

  const shrunk = await steppingCalculator.run(
    'set up',
    setUp({ estimator: { kind: 'shrinkage', target: 'correlation' } }),
    idleWork(),
  )
  expect(shrunk.shrinkage?.intensity).toBeGreaterThanOrEqual(0)
  // pulled toward equal correlations, the covariance is no worse conditioned
  expect(shrunk.condition!.condition!).toBeLessThanOrEqual(sample.condition!.condition! * 1.000001)

  const bare = await steppingCalculator.run('set up', setUp({ bare: true }), idleWork())
  expect(bare).toMatchObject({ condition: null, normality: null })
})

test('tests of normality want twenty dates', async () => {
  const few = await steppingCalculator.run(
    'set up',
    setUp({ returns: returns(19, 3), dates: 19 }),
    idleWork(),
  )
  expect(few.normality).toBeNull()
})

test('pairs that do not hold together are mended, and it is told which changed most', async () => {
  // three series seen two at a time: correlations near 1, 1 and -1 cannot all be
  const x = [0.01, -0.02, 0.03, -0.01]
  const gap = NaN
  const rows = [...x.map((r) => [r, r, gap]), ...x.map((r) => [gap, r, r]), ...x.map((r) => [r, gap, -r])]
  const { pairs, matrix } = await steppingCalculator.run(
    'set up',
    setUp({ rule: 'own overlap', returns: Float64Array.from(rows.flat()), dates: rows.length, bare: true }),
    idleWork(),
  )
  expect(pairs?.overlap?.dates).toBe(4)
  expect(pairs?.repair).toMatchObject({ changed: true, how: 'nearest' })
  expect(pairs?.repair?.smallestBefore).toBeLessThan(-0.5)
  expect(pairs?.repair?.smallestAfter).toBeGreaterThan(-1e-8)
  expect(matrix).toHaveLength(9)
})

import fc from 'fast-check'

// The same cases in every run, so that a result repeats and a failure is one of the change at hand; other cases, and more of them, when asked:
// PROPERTY_SEED=any PROPERTY_RUNS=5000 npx jest test/property

const { PROPERTY_SEED: seed = '20260901', PROPERTY_RUNS: runs } = process.env

fc.configureGlobal({
  ...(seed === 'any' ? {} : { seed: Number(seed) }),
  ...(runs === undefined ? {} : { numRuns: Number(runs) }),
})

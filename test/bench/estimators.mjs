// node test/bench/estimators.mjs: what the set-up of every estimator costs beside numpy forming the same covariance, and what a later
// change of weights costs beside the sample model's, in processor time: a few milliseconds of waiting would hide what a set-up takes.
// Runs take turns, so that a noisy machine slows all alike.
import { createRequire } from 'node:module'
import { numpy } from './numpy.mjs'

const require = createRequire(import.meta.url)
require('./typescript.cjs')
const { conditionOf, decompose, estimateModel, factorModel, inOneGo } = require('../../src/core/index.ts')

const n = 500
const T = 1260
const FACTORS = 10
const TURNS = 15
const REPEATS = 100

const print = (row) => console.log(JSON.stringify(row))
const median = (values) => values.toSorted((a, b) => a - b)[values.length >> 1]
const round = (value, digits = 3) => Number(value.toPrecision(digits))

let state = 1
const uniform = () => (state = (state * 16807) % 2147483647) / 2147483647 - 0.5
const factors = Float64Array.from({ length: T * FACTORS }, () => 0.04 * uniform())
const exposures = Float64Array.from({ length: n * FACTORS }, uniform)
const returns = Float64Array.from({ length: T * n }, (_, at) => {
  let r = 0.04 * uniform()
  const [t, i] = [Math.floor(at / n), at % n]
  for (let j = 0; j < FACTORS; j++) r += exposures[i * FACTORS + j] * factors[t * FACTORS + j]
  return r
})
const weights = Float64Array.from({ length: n }, uniform)

const estimated = (estimator) => () => estimateModel(returns, T, n, estimator)
// by the names of estimators.py
const setUps = {
  sample: estimated({ kind: 'sample' }),
  exponential: estimated({ kind: 'exponential', decay: 0.97 }),
  identity: estimated({ kind: 'shrinkage', target: 'identity' }),
  oas: estimated({ kind: 'shrinkage', target: 'oas' }),
  correlation: estimated({ kind: 'shrinkage', target: 'correlation' }),
  lagged: estimated({ kind: 'lagged', lags: 5 }),
  factors: () => factorModel(returns, T, n, factors, FACTORS),
}
const models = Object.fromEntries(Object.entries(setUps).map(([name, setUp]) => [name, setUp()]))

function timed(work) {
  const start = process.cpuUsage()
  work()
  const { user, system } = process.cpuUsage(start)
  return (user + system) / 1e3
}

const reference = await numpy('estimators.py')
print({ node: process.version, numpy: reference?.version ?? 'none: no ratios', n, T })

const times = (names) => Object.fromEntries(names.map((name) => [name, []]))
const names = Object.keys(setUps)
const ours = times(names)
const theirs = times(names)
const changes = times(names)
for (const name of names) await reference?.time(name, n, T, 1)
// compilers finish in the background
for (const model of Object.values(models)) for (let k = 0; k < 500; k++) decompose(model, weights)
for (let turn = 0; turn < TURNS; turn++) {
  for (const name of names) {
    ours[name].push(timed(setUps[name]))
    if (reference) theirs[name].push(...(await reference.time(name, n, T, 1)))
  }
  for (const name of names) {
    const all = timed(() => {
      for (let k = 0; k < REPEATS; k++) decompose(models[name], weights)
    })
    changes[name].push(all / REPEATS)
  }
}
for (const name of names) {
  print({
    estimator: name,
    set_up_ms: round(median(ours[name])),
    ...(reference && {
      numpy_ms: round(median(theirs[name])),
      to_numpy: round(median(ours[name]) / median(theirs[name])),
      to_numpy_in_the_quietest_turns: round(Math.min(...ours[name]) / Math.min(...theirs[name])),
    }),
    weight_change_ms: round(median(changes[name])),
    to_sample: round(median(changes[name]) / median(changes.sample)),
    to_sample_in_the_quietest_turns: round(Math.min(...changes[name]) / Math.min(...changes.sample)),
  })
}
const condition = Array.from({ length: 5 }, () => timed(() => inOneGo(conditionOf(models.identity))))
print({ name: 'condition number', median_ms: round(median(condition)) })
reference?.close()

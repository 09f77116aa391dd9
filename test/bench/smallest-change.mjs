// node test/bench/smallest-change.mjs: the smallest change that meets a dozen limits, in processor time, beside one covariance of the same returns formed by us
// and the longest time between two of its reports of progress.
import { createRequire } from 'node:module'

const require = createRequire(import.meta.url)
require('./typescript.cjs')
const { covariance, decompose, returnsModel, smallestChange } = require('../../src/core/index.ts')

const print = (row) => console.log(JSON.stringify(row))
const median = (values) => values.toSorted((a, b) => a - b)[values.length >> 1]
const round = (value, digits = 3) => Number(value.toPrecision(digits))
const FACTORS = 5
const GROUPS = 8

let state = 1
const uniform = () => (state = (state * 16807) % 2147483647) / 2147483647

function timed(work) {
  const start = process.cpuUsage()
  const result = work()
  const { user, system } = process.cpuUsage(start)
  return { result, ms: (user + system) / 1e3 }
}

for (const [n, T] of [
  [20, 500],
  [100, 1260],
  [500, 1260],
]) {
  const factors = Float64Array.from({ length: T * FACTORS }, () => 0.04 * (uniform() - 0.5))
  const exposures = Float64Array.from({ length: n * FACTORS }, (_, k) =>
    k % FACTORS === 0 ? 0.5 + uniform() : uniform() - 0.5,
  )
  const own = Float64Array.from({ length: n }, () => 0.01 + 0.03 * uniform())
  const returns = Float64Array.from({ length: T * n }, (_, at) => {
    const [t, i] = [Math.floor(at / n), at % n]
    let r = own[i] * (uniform() - 0.5)
    for (let j = 0; j < FACTORS; j++) r += exposures[i * FACTORS + j] * factors[t * FACTORS + j]
    return r
  })
  const model = returnsModel(returns, T, n)
  const raw = Float64Array.from({ length: n }, () => uniform() ** 3)
  const sum = raw.reduce((a, b) => a + b)
  const weights = raw.map((w) => w / sum)
  const { share, volatility } = decompose(model, weights)

  const members = Array.from({ length: GROUPS }, (_, g) =>
    Int32Array.from([...weights.keys()].filter((i) => i % GROUPS === g)),
  )
  const groupShare = members.map((group) => group.reduce((total, i) => total + share[i], 0))
  const groupWeight = members.map((group) => group.reduce((total, i) => total + weights[i], 0))
  const problems = {
    'one share': [
      {
        measure: 'share',
        members: Int32Array.of(share.indexOf(Math.max(...share))),
        most: 0.8 * Math.max(...share),
      },
    ],
    volatility: [{ measure: 'volatility', members: null, most: 0.9 * volatility }],
    'a dozen limits': [
      ...members
        .slice(0, 4)
        .map((group, g) => ({ measure: 'share', members: group, most: 0.9 * groupShare[g] })),
      ...members.slice(4).map((group, g) => ({
        measure: 'contribution',
        members: group,
        most: groupShare[g + 4] * volatility,
      })),
      ...members
        .slice(4, 7)
        .map((group, g) => ({ measure: 'weight', members: group, most: 1.05 * groupWeight[g + 4] })),
      { measure: 'volatility', members: null, most: 0.97 * volatility },
    ],
    'a limit on each share': Array.from(share, (_, i) => ({
      measure: 'share',
      members: Int32Array.of(i),
      most: share.toSorted((a, b) => b - a)[n >> 3],
    })),
  }
  const formed = median(Array.from({ length: 5 }, () => timed(() => covariance(model)).ms))
  for (const [name, limits] of Object.entries(problems)) {
    for (const kind of ['book', 'cash']) {
      let pause = 0
      const run = () => {
        const steps = smallestChange(model, { weights, limits, financing: { kind } })
        for (;;) {
          const before = performance.now()
          const step = steps.next()
          pause = Math.max(pause, performance.now() - before)
          if (step.done) return step.value
        }
      }
      run()
      pause = 0
      const runs = Array.from({ length: 3 }, () => timed(run))
      const { status, iterations, minimised } = runs[0].result
      const ms = median(runs.map((each) => each.ms))
      print({
        name,
        financing: kind,
        n,
        T,
        status,
        minimised: round(minimised, 6),
        programs: iterations,
        ms: round(ms),
        to_covariance: round(ms / formed),
        longest_pause_ms: round(pause),
      })
    }
  }
}

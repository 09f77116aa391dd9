// npm run bench: prints JSON lines {name, n, T, median_ms}, then ratios to numpy where python3 has it.
// Ours and numpy's runs take turns, so that a noisy machine slows both alike. Never part of the tests.
import { createRequire } from 'node:module'
import { numpy } from './numpy.mjs'

const require = createRequire(import.meta.url)
require('./typescript.cjs')
const { decompose, kernelForm, returnsModel } = require('../../src/core/index.ts')

const print = (row) => console.log(JSON.stringify(row))
const median = (values) => values.toSorted((a, b) => a - b)[values.length >> 1]
const round = (value, digits = 4) => Number(value.toPrecision(digits))

/** Normal by the sum of twelve uniforms; any block of numbers without pattern would do. */
function randomReturns(count, scale) {
  let state = 1
  const uniform = () => (state = (state * 16807) % 2147483647) / 2147483647
  return Float64Array.from({ length: count }, () => {
    let sum = -6
    for (let k = 0; k < 12; k++) sum += uniform()
    return sum * scale
  })
}

function timings(work, repeats) {
  const times = []
  for (let k = 0; k < repeats; k++) {
    const start = performance.now()
    work()
    times.push(performance.now() - start)
  }
  return times
}

const reference = await numpy('decomposition.py')
print({ node: process.version, kernel: kernelForm, numpy: reference?.version ?? 'none: no ratios' })

const T = 1260
for (const n of [100, 500, 1000, 5000]) {
  const returns = randomReturns(T * n, 0.01)
  const weights = randomReturns(n, 1)
  const read = (form) => returnsModel(returns, T, n, { kind: 'sample' }, form)
  const model = read()
  const plain = read('plain')

  // The two forms compared take turns, each a few times in a row as a user's edits do: caches are its own by then. What fills
  // memory (reading, the plain form's own block, the slow route) is timed after them: its garbage would be collected in ours.
  const turns = 31
  const repeats = Math.max(5, Math.round(10000 / n))
  const compared = {
    decomposition: () => timings(() => decompose(model, weights), repeats),
    'numpy two-pass': () => reference?.time('numpy two-pass', n, T, repeats),
  }
  const others = {
    'decomposition, plain form': () => timings(() => decompose(plain, weights), repeats),
    'numpy covariance': () => reference?.time('numpy covariance', n, T, 1),
    'reading the block': () => timings(() => read(), 1),
  }
  const medians = {}
  for (const [rows, count] of [
    [compared, turns],
    [others, 5],
  ]) {
    // Compilers finish in the background: ours get half a second each, numpy has none and gets one turn.
    for (const [name, run] of Object.entries(rows)) {
      medians[name] = []
      const start = performance.now()
      do await run()
      while (name.startsWith('decomposition') && performance.now() - start < 500)
    }
    for (let turn = 0; turn < count; turn++) {
      for (const [name, run] of Object.entries(rows)) {
        const times = await run()
        if (times) medians[name].push(median(times))
      }
    }
  }
  for (const [name, values] of Object.entries(medians)) {
    if (values.length) print({ name, n, T, median_ms: round(median(values)) })
  }
  if (reference) {
    const ratio = (of, name) => of(medians.decomposition) / of(medians[name])
    const fastest = (values) => Math.min(...values)
    print({
      ratio: 'decomposition',
      n,
      T,
      to_two_pass: round(ratio(median, 'numpy two-pass'), 3),
      to_two_pass_in_the_quietest_turns: round(ratio(fastest, 'numpy two-pass'), 3),
      to_covariance: `1/${round(1 / ratio(median, 'numpy covariance'), 3)}`,
    })
  }
}
reference?.close()

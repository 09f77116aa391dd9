// npm run bench: prints JSON lines {name, n, T, median_ms}, then ratios to numpy where python3 has it.
// Ours and numpy's runs take turns, so that a noisy machine slows both alike. Never part of the tests.
import { spawn } from 'node:child_process'
import { once } from 'node:events'
import { createRequire } from 'node:module'
import path from 'node:path'
import { createInterface } from 'node:readline'

const require = createRequire(import.meta.url)
require('./typescript.cjs')
const { annualise, decompose, kernelForm, returnsModel } = require('../../src/core/index.ts')

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

/** numpy in a process of its own, asked for one timing at a time; undefined where there is none. */
async function numpy() {
  const script = path.join(import.meta.dirname, 'decomposition.py')
  const child = spawn('python3', [script, '--serve'], { stdio: ['pipe', 'pipe', 'ignore'] })
  const lines = createInterface({ input: child.stdout })[Symbol.asyncIterator]()
  const failed = once(child, 'error').then(() => ({ done: true }))
  const first = await Promise.race([lines.next(), failed])
  if (first.done) return undefined
  return {
    version: JSON.parse(first.value).numpy,
    async time(name, n, T) {
      child.stdin.write(`${JSON.stringify({ name, n, T })}\n`)
      return JSON.parse((await lines.next()).value).ms
    },
    close: () => child.stdin.end(),
  }
}

const time = (work) => {
  const start = performance.now()
  work()
  return performance.now() - start
}

const reference = await numpy()
print({ node: process.version, kernel: kernelForm, numpy: reference?.version ?? 'none: no ratios' })

const T = 1260
for (const n of [100, 500, 1000, 5000]) {
  const returns = randomReturns(T * n, 0.01)
  const weights = randomReturns(n, 1)
  const reading = []
  for (let k = 0; k < 5; k++) reading.push(time(() => returnsModel(returns, T, n)))
  const model = returnsModel(returns, T, n)
  const plain = returnsModel(returns, T, n, { kind: 'sample' }, 'plain')
  const covariances = n < 5000 ? 5 : 3
  const rows = {
    decomposition: () => time(() => annualise(decompose(model, weights), 252)),
    'decomposition, plain form': () => time(() => annualise(decompose(plain, weights), 252)),
    ...(reference && { 'numpy two-pass': () => reference.time('numpy two-pass', n, T) }),
  }
  const times = Object.fromEntries(Object.keys(rows).map((name) => [name, []]))
  const repeats = Math.max(31, Math.round(150000 / n))
  for (let k = 0; k < repeats + 5; k++) {
    for (const [name, run] of Object.entries(rows)) {
      const ms = await run()
      // the first rounds warm caches and compilers
      if (k >= 5) times[name].push(ms)
    }
  }
  if (reference) {
    times['numpy covariance'] = []
    for (let k = 0; k < covariances; k++) {
      times['numpy covariance'].push(await reference.time('numpy covariance', n, T))
    }
  }
  for (const [name, values] of Object.entries(times)) print({ name, n, T, median_ms: round(median(values)) })
  print({ name: 'reading the block (centring)', n, T, median_ms: round(median(reading)) })
  if (reference) {
    const ours = median(times.decomposition)
    print({
      ratio: 'decomposition',
      n,
      T,
      to_two_pass: round(ours / median(times['numpy two-pass']), 3),
      to_covariance: `1/${round(median(times['numpy covariance']) / ours, 3)}`,
    })
  }
}
reference?.close()

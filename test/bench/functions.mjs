// node test/bench/functions.mjs: what a sheet with many worksheet functions over one block of returns costs.
// The host hands fresh arrays over at every call, as they come out of a message; they are made outside the time taken.
import { createRequire } from 'node:module'

const require = createRequire(import.meta.url)
require('./typescript.cjs')
const { worksheetFunctions } = require('../../src/sheet/functions.ts')

const n = 500
const T = 1260
const calls = 200

let state = 1
const uniform = () => (state = (state * 16807) % 2147483647) / 2147483647 - 0.5
const rows = Array.from({ length: T }, () => Array.from({ length: n }, () => 0.04 * uniform()))
const returns = JSON.stringify(rows)
const weights = Array.from({ length: n }, () => [uniform()])

const median = (values) => values.toSorted((a, b) => a - b)[values.length >> 1]
const print = (name, times) =>
  console.log(JSON.stringify({ name, n, T, median_ms: Number(median(times).toPrecision(4)) }))

function time(id, block, ...rest) {
  const fresh = JSON.parse(block)
  const start = performance.now()
  worksheetFunctions[id](...rest, fresh)
  return performance.now() - start
}

print('function, first call on a block', [time('VOLATILITY', returns, weights)])
const same = Array.from({ length: calls }, () => time('CONTRIBUTION', returns, weights))
print('function, same block and weights', same)
const other = Array.from({ length: calls }, (_, k) =>
  time(
    'CONTRIBUTION',
    returns,
    weights.map(([w], i) => [i === k % n ? w + 0.01 : w]),
  ),
)
print('function, same block, other weights', other)
const dated = JSON.stringify([
  ['Date', ...weights.map((_, i) => `Series ${i}`)],
  ...rows.map((row, t) => [40000 + t, ...row]),
])
time('VOLATILITY', dated, weights)
print(
  'function, same block with names and dates',
  Array.from({ length: calls }, () => time('CONTRIBUTION', dated, weights)),
)
const total = same.reduce((sum, ms) => sum + ms, 0)
console.log(
  JSON.stringify({
    name: 'function, 1000 such calls in all',
    n,
    T,
    median_ms: Number(((total * 1000) / calls).toPrecision(4)),
  }),
)

import { readdirSync, readFileSync } from 'node:fs'
import path from 'node:path'
import { readJson } from './data'

/** Examples that no test compares with, and why. */
const LEFT_OUT: Readonly<Record<string, string>> = {
  'enb-two-assets': 'effective numbers of uncorrelated bets, another figure than that of positions here',
  'ewma-half-life': 'a logarithm, shown by the pane and not a function of its own',
  'hull-ewma-5.2': 'updates around a mean of zero, which no estimator here does',
  'basel-1996-multipliers': 'a framework that the one of 2019 replaced',
  'srri-bands': 'a regulator’s scale that is not shown',
  'priips-mrm-classes': 'a regulator’s scale that is not shown',
}

test('every published example is compared with somewhere, or left out for a stated reason', () => {
  const texts = readdirSync(__dirname)
    .filter((name) => name.endsWith('.test.ts') && name !== path.basename(__filename))
    .map((name) => readFileSync(path.join(__dirname, name), 'utf8'))
    .join('\n')
  const ids = readJson<{ readonly checks: readonly { readonly id: string }[] }>('published.json').checks.map(
    ({ id }) => id,
  )
  const left = ids.filter((id) => !texts.includes(`'${id}'`))
  expect(left.sort()).toEqual(Object.keys(LEFT_OUT).sort())
})

import { readdirSync, readFileSync } from 'node:fs'
import path from 'node:path'

// Every `@example expression // result` in a docstring is run with the names its folder exports, and core's. Results are written as
// JSON (or strings in single quotes), numbers to as many digits as wanted: they must agree to the last digit shown. Beside JSON: NaN, undefined,
// Infinity, and `Fault "code"` for an expression that ends in one.

const source = path.join(__dirname, '../../src')

/** Folders whose docstrings are run; where `complete`, every function behind the door must have an example. */
const folders = [
  { name: 'core', complete: true },
  { name: 'sheet', complete: false },
]

interface Example {
  readonly place: string
  readonly expression: string
  readonly result: string
}

function filesUnder(folder: string): string[] {
  return readdirSync(folder, { recursive: true, encoding: 'utf8' })
    .filter((file) => /\.tsx?$/.test(file) && !file.endsWith('.d.ts'))
    .map((file) => path.join(folder, file))
}

function examplesOf(folder: string): Example[] {
  return filesUnder(folder).flatMap((file) =>
    readFileSync(file, 'utf8')
      .split('\n')
      .flatMap((line, k) => {
        const text = /^\s*\*\s*@example\s+(.*)$/.exec(line)?.[1]
        if (text === undefined) return []
        const place = `${path.relative(source, file)}:${k + 1}`
        const cut = text.lastIndexOf(' // ')
        if (cut < 0) throw new Error(`${place}: an example needs its result behind " // "`)
        return [{ place, expression: text.slice(0, cut).trim(), result: text.slice(cut + 4).trim() }]
      }),
  )
}

const evaluate = (expression: string, door: object): unknown =>
  new Function(...Object.keys(door), `'use strict'; return (${expression})`)(...Object.values(door))

/** Whether a value agrees with a result as written, numbers to half a unit of the last digit shown. */
function agrees(value: unknown, written: unknown): boolean {
  if (typeof written === 'string' && written.startsWith('#')) {
    const shown = written.slice(1)
    if (typeof value !== 'number') return false
    if (Number.isNaN(Number(shown))) return Number.isNaN(value)
    const [digits, exponent = '0'] = shown.toLowerCase().split('e') as [string, string?]
    const decimals = digits.split('.')[1]?.length ?? 0
    const unit = 10 ** (Number(exponent) - decimals)
    return value === Number(shown) || Math.abs(value - Number(shown)) <= unit * 0.5000001
  }
  if (written === '!undefined') return value === undefined
  if (Array.isArray(written)) {
    const list = ArrayBuffer.isView(value) ? Array.from(value as Float64Array) : value
    return (
      Array.isArray(list) && list.length === written.length && written.every((w, k) => agrees(list[k], w))
    )
  }
  if (written !== null && typeof written === 'object') {
    return (
      typeof value === 'object' &&
      value !== null &&
      Object.entries(written).every(([key, w]) => agrees((value as Record<string, unknown>)[key], w))
    )
  }
  return value === written
}

/** JSON with every number kept as text behind a #, so that its digits can be counted. */
const read = (result: string): unknown =>
  JSON.parse(
    result.replace(
      /"(?:[^"\\]|\\.)*"|'[^']*'|-?\d[\d.]*(?:[eE][-+]?\d+)?|NaN|-?Infinity|undefined/g,
      (token) =>
        token.startsWith('"')
          ? token
          : token.startsWith("'")
            ? JSON.stringify(token.slice(1, -1))
            : token === 'undefined'
              ? '"!undefined"'
              : `"#${token}"`,
    ),
  )

function check({ expression, result }: Example, door: object): void {
  const code = /^Fault "(.*)"$/.exec(result)?.[1]
  if (code !== undefined) {
    expect(() => evaluate(expression, door)).toThrow(expect.objectContaining({ name: 'Fault', code }))
    return
  }
  const value = evaluate(expression, door)
  if (!agrees(value, read(result)))
    throw new Error(`gives ${JSON.stringify(value, plainArrays)}, not ${result}`)
}

const plainArrays = (_key: string, value: unknown) =>
  ArrayBuffer.isView(value) ? Array.from(value as Float64Array) : value

type Names = Record<string, unknown>
const namesOf = async (files: readonly string[]): Promise<Names> =>
  Object.assign({}, ...(await Promise.all(files.map((file) => import(file) as Promise<Names>))))

describe.each(folders)('examples in the docstrings of $name', ({ name, complete }) => {
  const folder = path.join(source, name)
  const examples = examplesOf(folder)
  let names: Names = {}

  beforeAll(async () => {
    names = {
      ...(await namesOf(filesUnder(path.join(source, 'core')))),
      ...(await namesOf(filesUnder(folder))),
    }
  })

  it.each(examples)('$place: $expression', (example) => {
    check(example, names)
  })

  if (complete) {
    it('there is one for every public function', async () => {
      const text = examples.map(({ expression }) => expression).join('\n')
      const functions = Object.entries(await namesOf([path.join(folder, 'index.ts')])).filter(
        ([, value]) => typeof value === 'function',
      )
      expect(functions.length).toBeGreaterThan(0)
      expect(functions.map(([key]) => key).filter((key) => !new RegExp(`\\b${key}\\(`).test(text))).toEqual(
        [],
      )
    })
  }
})

describe('the comparison with a result', () => {
  it.each([
    [0.08944, '0.0894', true],
    [0.08946, '0.0894', false],
    [[1, 0.5], '[1, 0.5]', true],
    [[1, 0.5], '[1]', false],
    [Float64Array.of(1, NaN), '[1, NaN]', true],
    [1, 'NaN', false],
    ['a 1', '"a 1"', true],
    [null, 'null', true],
    [0, 'null', false],
    [{ a: 1.234, b: 2 }, '{"a": 1.23}', true],
    [1.5e-7, '1.5e-7', true],
    [1.6e-7, '1.5e-7', false],
  ])('%j agrees with %s: %s', (value, result, expected) => {
    expect(agrees(value, read(result))).toBe(expected)
  })
})

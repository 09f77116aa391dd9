/**
 * Faults planted one by one in copies of the demo workbook, and found at their cells. What the demo has of its own (a short history and
 * a holding valued every fourth week) was planted when it was made; see src/build/demo-workbook.mjs.
 *
 * No number is from outside: the data are invented and the faults planted here. Every address and date follows from where a test plants.
 */
import { readFileSync } from 'node:fs'
import { Workbook } from '@cj-tech-master/excelts/browser'
import { HOLDINGS } from '../../src/build/demo-workbook.mjs'
import { correlation, estimateModel } from '../../src/core'
import { unpack } from '../../src/desk/files/archive'
import { addressOf, type Block, type CellValue } from '../../src/sheet'
import { lookAt, placesOf } from '../unit/sheet/look-at-data'

type Cells = CellValue[][]

/** Days from the workbook's day 0 to that of JavaScript. */
const EPOCH = 25_569

let book: Cells
let returns: Cells
beforeAll(async () => {
  const workbook = new Workbook()
  await workbook.xlsx.loadFromFiles(await unpack(readFileSync('assets/demo.xlsx')))
  const cells = (name: string, rows: number, columns: number, top = 1): Cells =>
    Array.from({ length: rows }, (_, row) =>
      Array.from({ length: columns }, (_, column): CellValue => {
        const value = workbook.getWorksheet(name)?.getCell(top + row, column + 1).value
        if (value instanceof Date) return EPOCH + value.getTime() / 86_400_000
        if (typeof value === 'object' && value !== null && 'formula' in value) return Number(value.result)
        return typeof value === 'number' || typeof value === 'string' ? value : ''
      }),
    )
  book = cells('Book', HOLDINGS.length + 2, 7, 4)
  returns = cells('Returns', 261, HOLDINGS.length + 1)
})

const blockAt = (sheet: string, row: number, values: Cells): Block => ({
  area: { sheet, row, column: 0, rows: values.length, columns: values[0]?.length ?? 0 },
  values,
})

/** Looks at a copy of the demo after something was done to its returns. */
function after(plant: (cells: Cells) => void, settings: Parameters<typeof lookAt>[2] = {}) {
  const copy = returns.map((row) => [...row])
  plant(copy)
  const looked = lookAt(blockAt('Book', 3, book), blockAt('Returns', 0, copy), settings)
  const planted = looked.checks.filter(({ weight, names, kind }) =>
    weight !== 'notes' ? !OWN.includes(names.join()) : kind !== 'rules on history',
  )
  return { ...looked, planted }
}

const OWN = ['Tidal power projects', 'Timber and orchard land']

/** Column F: Island growth equities. */
const F = 5
const at = (row: Cells[number] | undefined, column = F): number => Number(row?.[column])
/** The sheet's rows from one to another, counted as the sheet does. */
const rowsOf = (cells: Cells, from: number, to: number): Cells => cells.slice(from - 1, to)

it('the demo has the two faults it was made with and the short history’s consequence for rules, and nothing else is told', () => {
  const { checks, returns: reading } = after(() => undefined)
  expect(checks.map(placesOf)).toEqual([
    ['short history', ['Returns!O2:O131']],
    ['stale prices', ['Returns!L2:L4']],
    ['rules on history', []],
  ])
  expect(reading.findings.filter(({ weight }) => weight !== 'notes')).toEqual([])
  const [short, stale] = checks
  expect(short?.sentence).toBe(
    'Returns!O2:O131: “Tidal power projects” starts on 7 Jun 2024 and has 130 returns where the others have 260.',
  )
  expect(short?.effect).toMatch(/^130 of 260 dates have a return for every holding/)
  expect(short?.corrections.map(({ change }) => change)).toEqual([
    { gaps: 'own overlap' },
    { gaps: 'completed' },
  ])
  expect(stale?.sentence).toBe(
    'Returns!L2:L4: “Timber and orchard land” moves every 4th week only; its return is exactly 0 in between (here 10 Dec 2021 to 24 Dec 2021).',
  )
  expect(stale?.corrections.map(({ change }) => change)).toEqual([{ estimator: { kind: 'lagged', lags: 7 } }])
})

it('the remedy for the holding valued every fourth week does what is said of it: correlations come back', () => {
  const { returns: reading, checks } = after(() => undefined)
  const change = checks.find(({ kind }) => kind === 'stale prices')?.corrections[0]?.change
  const estimator = change?.estimator
  if (estimator?.kind !== 'lagged') throw new Error('lagged terms were to be offered')
  const [timber, ...alike] = [
    'Timber and orchard land',
    'Canal and bridge tolls',
    'Grain and metals basket',
  ].map((name) => HOLDINGS.findIndex((holding) => holding.name === name))
  const [size, rows] = [reading.columns, reading.rows]
  // the short history stands aside here
  const filled = reading.values.map((value) => (Number.isNaN(value) ? 0 : value))
  const between = (of: Parameters<typeof estimateModel>[3], i: number) =>
    correlation(estimateModel(filled, rows, size, of))[(timber ?? 0) * size + i] ?? NaN
  for (const i of alike) {
    const plain = between({ kind: 'sample' }, i)
    // as valued, over four weeks at a time, which needs no lagged terms
    const sums = (column: number) =>
      Array.from({ length: rows / 4 }, (_, k) =>
        [0, 1, 2, 3].reduce((sum, week) => sum + (filled[(4 * k + week) * size + column] ?? 0), 0),
      )
    const block = Float64Array.from(sums(timber ?? 0).flatMap((x, k) => [x, sums(i)[k] ?? 0]))
    const monthly = correlation(estimateModel(block, rows / 4, 2, { kind: 'sample' }))[1] ?? NaN
    // more than half of the distance; the text says 81%, which holds on average
    expect(between(estimator, i) - plain).toBeGreaterThan(0.5 * (monthly - plain))
    expect(plain).toBeLessThan(0.35 * monthly)
  }
})

it.each<[string, (cells: Cells) => void, string, readonly string[]]>([
  ['a gap', (cells) => void (cells[99]![F] = ''), 'gaps', ['Returns!F100']],
  [
    'gaps in a row and alone',
    (cells) => [180, 200, 201].forEach((row) => (cells[row - 1]![F] = '')),
    'gaps',
    ['Returns!F180', 'Returns!F200:F201'],
  ],
  [
    'a start some weeks late',
    (cells) => rowsOf(cells, 2, 20).forEach((row) => (row[F] = '')),
    'starts late',
    ['Returns!F2:F20'],
  ],
  [
    'a short history',
    (cells) => rowsOf(cells, 2, 200).forEach((row) => (row[F] = '')),
    'short history',
    ['Returns!F2:F200'],
  ],
  [
    'an end before the others’',
    (cells) => rowsOf(cells, 260, 261).forEach((row) => (row[F] = '')),
    'ends early',
    ['Returns!F260:F261'],
  ],
  [
    'a newest row begun for one holding',
    (cells) => void cells.push([at(cells[260], 0) + 7, ...HOLDINGS.map((_, i) => (i === 4 ? 0.01 : ''))]),
    'dates',
    ['Returns!F262'],
  ],
  ['a week without a row', (cells) => void cells.splice(99, 1), 'dates', ['Returns!A100']],
  [
    'a year of monthly dates at the head',
    (cells) => rowsOf(cells, 2, 13).forEach((row, k) => (row[0] = at(cells[13], 0) - 30 * (12 - k))),
    'mixed frequency',
    ['Returns!A3:A14'],
  ],
  [
    'two months of returns of 0',
    (cells) => rowsOf(cells, 200, 208).forEach((row) => (row[F] = 0)),
    'stale prices',
    ['Returns!F200:F208'],
  ],
  [
    'smoothing',
    (cells) => rowsOf(cells, 3, 261).forEach((row, k) => (row[F] = 0.5 * at(row) + 0.5 * at(cells[k + 1]))),
    'serial correlation',
    ['Returns!F1', 'Returns!F2:F261'],
  ],
  ['a misplaced decimal point', (cells) => void (cells[199]![F] = 0.41), 'outlier', ['Returns!F200']],
  [
    'a series that never changes',
    (cells) => rowsOf(cells, 2, 261).forEach((row) => (row[F] = 0.001)),
    'constant',
    ['Returns!F1', 'Returns!F2:F261'],
  ],
  [
    'one series in percent points',
    (cells) => rowsOf(cells, 2, 261).forEach((row) => (row[F] = 100 * at(row))),
    'percents',
    ['Returns!F1', 'Returns!F2:F261'],
  ],
  [
    'a bond in percent points',
    (cells) => rowsOf(cells, 2, 261).forEach((row) => (row[7] = 100 * at(row, 7))),
    'percents',
    ['Returns!H1', 'Returns!H2:H261'],
  ],
  [
    'all returns in percent points',
    (cells) =>
      rowsOf(cells, 2, 261).forEach((row) =>
        HOLDINGS.forEach((_, i) => (row[i + 1] = row[i + 1] === '' ? '' : 100 * at(row, i + 1))),
      ),
    'percents',
    ['Returns!A1:Q261'],
  ],
  [
    'a missed split of 2 for 1',
    (cells) => void (cells[199]![F] = (1 + at(cells[199])) / 2 - 1),
    'missed split',
    ['Returns!F200'],
  ],
  [
    'prices among returns',
    (cells) => {
      let price = 100
      rowsOf(cells, 2, 261).forEach((row) => (row[F] = price *= 1 + at(row)))
    },
    'prices among returns',
    ['Returns!F1', 'Returns!F2:F261'],
  ],
  ['few dates for the holdings', (cells) => void cells.splice(1, 240), 'few dates', []],
  [
    'daily returns of a market that closes earlier',
    (cells) => {
      asDaily(cells)
      for (let k = cells.length - 1; k > 1; k--) cells[k]![F] = at(cells[k - 1])
    },
    'closing times',
    ['Returns!F1', 'Returns!F2:F261'],
  ],
])('%s is found at its cells, once', (_, plant, kind, cells) => {
  const { planted, checks } = after(plant)
  expect(planted.map(placesOf)).toEqual([[kind, cells]])
  const [check] = planted
  expect(check?.area === null ? null : addressOf(check!.area)).toBe(cells[0] ?? null)
  if (cells[0]) expect(check?.sentence.startsWith(`${cells[0]}: `)).toBe(true)
  for (const { sentence, effect, remedy } of checks)
    for (const text of [sentence, effect, remedy]) expect(text).toMatch(/^\S.*[.?]$/)
})

it('a head of monthly dates can be left out: the look-back then starts with the first return over a week', () => {
  let secondWeek = 0
  const { planted } = after((cells) => {
    rowsOf(cells, 2, 13).forEach((row, k) => (row[0] = at(cells[13], 0) - 30 * (12 - k)))
    // row 14 is a month after row 13, row 15 a week after that
    secondWeek = at(cells[14], 0)
  })
  const [correction] = planted[0]?.corrections ?? []
  expect(correction?.change).toEqual({ lookBack: { kind: 'since', date: secondWeek } })
  expect(after(() => undefined, correction?.change ?? {}).planted).toEqual([])
})

/** Working days in the place of weeks. */
function asDaily(cells: Cells): void {
  const friday = at(cells[260], 0)
  rowsOf(cells, 2, 261).forEach((row, k) => {
    const back = 259 - k
    row[0] = friday - 7 * Math.floor(back / 5) - (back % 5)
  })
}

it('daily dates alone raise no suspicion of closing times', () => {
  expect(after(asDaily).planted).toEqual([])
})

it('dates twice stop the reading and are not told again; dates out of order are read in order', () => {
  const twice = after((cells) => void (cells[99]![0] = at(cells[98], 0)))
  expect(twice.returns.findings.filter(({ weight }) => weight === 'stops')).toHaveLength(1)
  expect(twice.planted).toEqual([])
  const reversed = after((cells) => cells.splice(1, 260, ...cells.slice(1).reverse()))
  expect(reversed.planted).toEqual([])
  // the blanks of the late start lie at the end of the block then
  expect(reversed.checks.find(({ kind }) => kind === 'short history')?.area).toMatchObject({
    row: 260,
    column: 14,
  })
})

it('faults of a block that lies across are found at its cells as well', () => {
  const copy = returns.map((row) => [...row])
  copy[99]![F] = ''
  const across = (copy[0] ?? []).map((_, column) => copy.map((row) => row[column] ?? ''))
  const { checks } = lookAt(blockAt('Book', 3, book), blockAt('Returns', 0, across))
  expect(checks.map(placesOf)).toEqual([
    ['short history', ['Returns!B15:EA15']],
    ['stale prices', ['Returns!B12:D12']],
    ['gaps', ['Returns!CV6']],
    ['rules on history', []],
  ])
})

describe('in a block of prices', () => {
  /** The demo's returns as prices from 100 on. */
  function asPrices(cells: Cells): Cells {
    const level = HOLDINGS.map(() => 100)
    const started = HOLDINGS.map(() => false)
    const rows = cells.slice(1).map((row) => [
      row[0] ?? '',
      ...HOLDINGS.map((_, i): CellValue => {
        if (row[i + 1] === '') return ''
        if (!started[i]) {
          started[i] = true
          return level[i] ?? 0
        }
        return (level[i] = (level[i] ?? 0) * (1 + at(row, i + 1)))
      }),
    ])
    return [cells[0] ?? [], ...rows]
  }
  const priced = (plant: (cells: Cells) => void, settings: Parameters<typeof lookAt>[2] = {}) =>
    after((cells) => {
      const prices = asPrices(cells)
      plant(prices)
      cells.splice(0, cells.length, ...prices)
    }, settings)

  it('a missing price is one gap at its own cell, though two returns hang on it', () => {
    const { planted } = priced((cells) => void (cells[199]![F] = ''))
    expect(planted.map(placesOf)).toEqual([['gaps', ['Returns!F200']]])
    expect(planted[0]?.sentence).toMatch(/^Returns!F200: “Island growth equities” has no price on \d/)
    expect(planted[0]?.effect).toMatch(/^A missing price costs the returns on both sides of it\. 2 dates /)
  })

  it('a late start points at the blank prices', () => {
    const { checks } = priced(() => undefined)
    expect(checks.map(placesOf)[0]).toEqual(['short history', ['Returns!O2:O131']])
  })

  it.each(['simple', 'log'] as const)(
    'a missed split of 2 for 1 is found and undone (%s returns)',
    (returnKind) => {
      const { planted, returns: reading } = priced(
        (cells) => rowsOf(cells, 200, 261).forEach((row) => (row[F] = at(row) / 2)),
        { returnKind },
      )
      expect(planted.map(placesOf)).toEqual([['missed split', ['Returns!F200']]])
      expect(planted[0]?.sentence).toContain('what a split of 2 for 1 that was not adjusted for would leave')
      const clean = priced(() => undefined, { returnKind }).returns
      const mended = planted[0]?.corrections[0]?.returns?.()
      // 1e-12: the halved price and the doubled ratio round differently
      expect(
        mended?.values.every((value, k) =>
          Number.isNaN(value)
            ? Number.isNaN(clean.values[k])
            : Math.abs(value - (clean.values[k] ?? 0)) < 1e-12,
        ),
      ).toBe(true)
      // what the user has stays as it is
      expect(reading.values[198 * reading.columns - reading.columns + F - 1]).toBeLessThan(-0.4)
    },
  )

  it('one wrong price is one line, which names both returns that hang on it', () => {
    const { planted } = priced((cells) => void (cells[199]![F] = at(cells[199]) * 10))
    expect(planted.map(placesOf)).toEqual([['outlier', ['Returns!F200', 'Returns!F201']]])
    expect(planted[0]?.sentence).toMatch(/and the next one takes it back: a wrong price\?$/)
  })
})

it('three faults of one kind are one line with all their cells and holdings', () => {
  const { planted } = after((cells) => [2, 4, 6].forEach((column) => (cells[99]![column] = '')))
  expect(planted.map(placesOf)).toEqual([['gaps', ['Returns!C100', 'Returns!E100', 'Returns!G100']]])
  expect(planted[0]?.sentence).toMatch(/2 more series like it\.$/)
  expect(planted[0]?.names).toEqual([
    'Southern plains equities',
    'Harbour small companies',
    'Delta young-market equities',
  ])
})

it('what lies before the look-back is not told', () => {
  const lookBack = { kind: 'last', dates: 120 } as const
  const { checks } = after((cells) => void (cells[49]![F] = 0.9), { lookBack })
  expect(checks.map(({ kind }) => kind)).toEqual(['stale prices', 'rules on history'])
  expect(checks[0]?.area).toMatchObject({ column: 11 })
  expect(checks[0]?.area?.row).toBeGreaterThanOrEqual(141)
})

it('a series that is not held is not told of, unless it is the benchmark', () => {
  const plant = (cells: Cells) =>
    cells.forEach((row, k) => row.push(k === 0 ? 'Old basket' : k === 99 ? 0.9 : Math.sin(k * k) / 50))
  expect(after(plant).planted).toEqual([])
  const { planted } = after(plant, { benchmark: { kind: 'series', name: 'old  basket' } })
  expect(planted.map(placesOf)).toEqual([['outlier', ['Returns!R100']]])
})

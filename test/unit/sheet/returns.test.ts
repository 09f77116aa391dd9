import type { CellValue } from '../../../src/sheet'
import { readReturns } from '../../../src/sheet'
import { blockOf, ENGLISH, GERMAN } from './blocks-of-cells'

// Every block here is typed for its test. 46353 is Friday 27 November 2026 as a workbook counts days.

const FRIDAY = 46353
const found = { content: null, orientation: null, returnKind: 'simple' } as const
const read = (rows: CellValue[][], settings: Parameters<typeof readReturns>[1] = found) =>
  readReturns(blockOf(rows, 'Returns'), settings, ENGLISH)
const sentences = (reading: ReturnType<typeof read>, weight?: string): string[] =>
  reading.findings.filter((finding) => !weight || finding.weight === weight).map(({ sentence }) => sentence)

/** n weeks of returns of two series, dates down, oldest first. */
const weeks = (n: number): CellValue[][] => [
  ['Week ending', 'A', 'B'],
  ...Array.from({ length: n }, (_, t) => [
    FRIDAY - 7 * (n - 1 - t),
    t % 2 ? 0.01 : -0.02,
    t % 3 ? 0.005 : -0.01,
  ]),
]
const transposed = (rows: CellValue[][]): CellValue[][] =>
  (rows[0] ?? []).map((_, column) => rows.map((row) => row[column] ?? ''))

test('dates, names, rhythm and span are found out', () => {
  const reading = read(weeks(10))
  expect(reading).toMatchObject({
    content: 'returns',
    orientation: 'dates down',
    names: ['A', 'B'],
    frequency: 'weekly',
    proposedPeriodsPerYear: 52,
    rows: 10,
    columns: 2,
    summary: '10 weekly returns of 2 series, 25 Sep 2026 to 27 Nov 2026',
  })
  expect([...reading.values.slice(0, 4)]).toEqual([-0.02, -0.01, 0.01, 0.005])
  expect(reading.findings).toEqual([])
})

test('a block that lies across reads the same', () => {
  const across = read(transposed(weeks(10)))
  const down = read(weeks(10))
  expect(across.orientation).toBe('dates across')
  expect([...across.values]).toEqual([...down.values])
  expect(across.names).toEqual(down.names)
  expect(across.dates).toEqual(down.dates)
})

test('dates from newest to oldest are read in order of time, and told', () => {
  const [head, ...body] = weeks(10)
  const reading = read([head ?? [], ...body.reverse()])
  expect([...reading.values]).toEqual([...read(weeks(10)).values])
  expect(sentences(reading)).toEqual(['Dates run from newest to oldest; read in order of time.'])
})

test('dates typed as text are read by the culture', () => {
  const rows: CellValue[][] = [
    ['Datum', 'A'],
    ['27.11.2026', 0.01],
    ['20.11.2026', -0.01],
    ['13.11.2026', 0.02],
  ]
  const reading = readReturns(blockOf(rows, 'Returns'), found, GERMAN)
  expect(reading.dates).toEqual([FRIDAY - 14, FRIDAY - 7, FRIDAY])
})

test.each<[string, number[], string, number | null]>([
  ['business days', [0, 1, 2, 3, 4, 7, 8, 9, 10, 11, 14, 15, 16, 17, 18], 'daily', 252],
  ['every day of the week', Array.from({ length: 20 }, (_, k) => k), 'daily, weekends included', 365],
  ['month ends', [0, 31, 62, 90, 121, 151, 182], 'monthly', 12],
  ['quarter ends', [0, 92, 184, 274, 365], 'quarterly', 4],
  ['years', [0, 365, 730, 1096], 'yearly', 1],
  ['no rhythm', [0, 3, 50, 53, 100, 200], 'uneven', null],
])('%s are recognised by their spacing', (_, days, frequency, perYear) => {
  const reading = read([['Date', 'A'], ...days.map((day, k) => [FRIDAY - 1100 + day, k % 2 ? 0.01 : -0.01])])
  expect(reading).toMatchObject({ frequency, proposedPeriodsPerYear: perYear })
})

test('prices are found out by content and become returns', () => {
  const reading = read([
    ['Date', 'A'],
    [FRIDAY - 14, 100],
    [FRIDAY - 7, 110],
    [FRIDAY, 99],
  ])
  expect(reading.content).toBe('prices')
  expect(reading.values[0]).toBeCloseTo(0.1, 14)
  expect(reading.values[1]).toBeCloseTo(-0.1, 14)
  expect(reading.dates).toEqual([FRIDAY - 7, FRIDAY])
  const log = read([['A'], [100], [110], [99]], { ...found, returnKind: 'log' })
  expect(log.values[0]).toBeCloseTo(Math.log(1.1), 14)
})

test('a price that is missing leaves a gap on both sides of it', () => {
  const reading = read([
    ['Date', 'A', 'B'],
    [FRIDAY - 21, 100, 50],
    [FRIDAY - 14, '', 51],
    [FRIDAY - 7, 110, 52],
    [FRIDAY, 99, 53],
  ])
  expect([...reading.values].map(Number.isNaN)).toEqual([true, false, true, false, false, false])
  expect(sentences(reading, 'notes')[0]).toMatch(/^1 blank cell among the prices \(first in Returns!B3\)/)
})

test('a price of 0 or less stops with its cell', () => {
  const reading = read([['A'], [100], [0], [99], [98]], { ...found, content: 'prices' })
  expect(sentences(reading, 'stops')).toEqual([
    'Returns!A3: found 0 among prices; a price above 0 is needed.',
  ])
})

test.each<[string, CellValue, string]>([
  ['text', 'n.a.', 'Returns!B4: found “n.a.”; a number is needed, or a blank cell for a gap.'],
  ['an error', '#N/A', 'Returns!B4: found the error #N/A; a number is needed, or a blank cell for a gap.'],
  ['a truth value', false, 'Returns!B4: found FALSE; a number is needed, or a blank cell for a gap.'],
])('%s among the returns stops with its cell', (_, value, sentence) => {
  const rows = weeks(8)
  rows[3] = [rows[3]?.[0] ?? '', value, 0.01]
  expect(sentences(read(rows), 'stops')).toEqual([sentence])
})

test('many bad cells are one sentence with their number', () => {
  const rows = weeks(8).map((row, k) => (k > 0 && k < 5 ? [row[0] ?? '', '#N/A', row[2] ?? ''] : row))
  expect(sentences(read(rows), 'stops')).toEqual([
    'Returns!B2: found the error #N/A; a number is needed, or a blank cell for a gap. 3 more cells like it.',
  ])
})

test('a date that stands twice stops, one that is missing too', () => {
  const twice = weeks(8)
  twice[4] = [twice[3]?.[0] ?? '', 0.01, 0.01]
  expect(sentences(read(twice), 'stops')[0]).toMatch(/^Returns!A5: found 23 Oct 2026 a second time/)
  const gap = weeks(12)
  gap[4] = ['', 0.01, 0.01]
  expect(sentences(read(gap), 'stops')[0]).toBe('Returns!A5: found a blank; a date is needed.')
})

test('a series named twice stops and names both cells', () => {
  const rows = weeks(8)
  rows[0] = ['Week ending', 'A', 'A']
  expect(sentences(read(rows), 'stops')[0]).toBe(
    'Returns!C1: found “A” a second time (first in Returns!B1); one column a series is needed.',
  )
})

test('merged cells among the numbers stop', () => {
  const merged = [{ sheet: 'Returns', row: 2, column: 1, rows: 1, columns: 2 }]
  const reading = readReturns(blockOf(weeks(8), 'Returns', { merged }), found, ENGLISH)
  expect(sentences(reading, 'stops')[0]).toBe(
    'Returns!B3:C3: found merged cells among the numbers; one cell a number is needed: unmerge them.',
  )
})

test('a covariance matrix with names on both sides is told from returns', () => {
  const reading = read([
    ['', 'A', 'B'],
    ['A', 0.04, 0.01],
    ['B', 0.01, 0.09],
  ])
  expect(reading).toMatchObject({
    content: 'covariance',
    names: ['A', 'B'],
    summary: 'Covariance matrix of 2 series',
  })
  expect([...reading.values]).toEqual([0.04, 0.01, 0.01, 0.09])
})

test('a correlation matrix and a matrix that is not symmetric stop', () => {
  expect(
    sentences(
      read([
        ['A', 'B'],
        [1, 0.5],
        [0.5, 1],
      ]),
      'stops',
    )[0],
  ).toMatch(/correlation matrix/)
  expect(
    sentences(
      read([
        ['A', 'B'],
        [0.04, 0.01],
        [0.02, 0.09],
      ]),
      'stops',
    )[0],
  ).toMatch(/Returns!/)
})

test('every return knows its cell, and one made of prices that of the later price', () => {
  const [head = [], ...body] = weeks(10)
  const newestFirst = read([head, ...body.reverse()])
  expect(newestFirst.cell(0, 1)).toMatchObject({ row: 10, column: 2, rows: 1, columns: 1 })
  expect(newestFirst.cell(9, -1)).toMatchObject({ row: 1, column: 0 })
  const across = read(transposed(weeks(10)))
  expect(across.cell(3, 1)).toMatchObject({ row: 2, column: 4 })
  const prices = read([
    ['Date', 'A'],
    [FRIDAY - 14, 100],
    [FRIDAY - 7, 110],
    [FRIDAY, 99],
  ])
  expect(prices.cell(1, 0)).toMatchObject({ row: 3, column: 1 })
})

test('a block of nothing but numbers is read by place with dates down, and says so', () => {
  const reading = read(
    weeks(8)
      .slice(1)
      .map((row) => row.slice(1)),
  )
  expect(reading).toMatchObject({ names: null, dates: null, frequency: 'no dates', rows: 8, columns: 2 })
  expect(sentences(reading, 'warns')[0]).toBe(
    'Neither dates nor names tell which way the block lies; read with dates down.',
  )
})

test('what the user says about the block holds', () => {
  const square = [[0.04, 0.01], [0.01, 0.09]] // prettier-ignore
  expect(read(square).content).toBe('covariance')
  expect(read(square, { ...found, content: 'returns' }).content).toBe('returns')
  expect(read(weeks(3), { ...found, orientation: 'dates across' }).orientation).toBe('dates across')
})

test('a cell that holds no date stops, and upsets neither order nor span', () => {
  const rows = weeks(20)
  rows[6] = ['soon', 0.01, 0.02]
  const reading = read(rows)
  expect(sentences(reading)).toEqual(['Returns!A7: found “soon”; a date is needed.'])
  expect(reading.summary).toBe('20 weekly returns of 2 series, 17 Jul 2026 to 27 Nov 2026')
})

test('nothing is said of dates beside a covariance matrix, and a blank in one stops', () => {
  const matrix: CellValue[][] = [
    ['', 'A', 'B'],
    ['A', 0.04, 0.01],
    ['B', 0.01, 0.09],
  ]
  expect(sentences(read(matrix))).toEqual([])
  const holed = matrix.map((row) => [...row])
  holed[1] = ['A', 0.04, '']
  expect(sentences(read(holed, { ...found, content: 'covariance' }))).toEqual([
    'Returns!C2: found a blank among the covariances; a number is needed in every cell.',
  ])
})

test('two hundred thousand rows under repeated dates are told of like few', () => {
  const rows = Array.from({ length: 200_000 }, (_, t) => [
    FRIDAY - 25_000 + Math.floor(t / 8),
    t % 2 ? 0.01 : -0.01,
  ])
  expect(sentences(read([['Date', 'A'], ...rows]), 'stops')).toEqual([
    'Returns!A3: found 17 Jun 1958 a second time; one row a date is needed.',
  ])
})

import type { CellValue, Role } from '../../../src/sheet'
import { readHoldings } from '../../../src/sheet'
import { blockOf, ENGLISH, GERMAN } from './blocks-of-cells'

// Every block here is typed for its test.

const asProposed = { roles: {}, capital: null }
const read = (
  rows: CellValue[][],
  settings: { roles: Record<string, Role>; capital: number | null } = asProposed,
) => readHoldings(blockOf(rows), settings, ENGLISH)
const sentences = (reading: ReturnType<typeof read>, weight?: string): string[] =>
  reading.findings.filter((finding) => !weight || finding.weight === weight).map(({ sentence }) => sentence)

const PLAIN: CellValue[][] = [
  ['Holding', 'Weight'],
  ['Northern shares', 0.6],
  ['Harbour bonds', 0.4],
]

test('a plain block gives names and weights in sheet order', () => {
  const reading = read(PLAIN)
  expect(reading.holdings.map(({ name, weight }) => [name, weight])).toEqual([
    ['Northern shares', 0.6],
    ['Harbour bonds', 0.4],
  ])
  expect(reading.summary).toBe('2 holdings, net 100.0%, gross 100.0%')
  expect(reading.findings).toEqual([])
})

test('roles come from headings: a limit or a benchmark weight is no own weight', () => {
  const reading = read([
    [
      'Position',
      'Asset class',
      'Region',
      'Limit on share of risk',
      'Benchmark weight',
      'Active weight',
      'Weight',
      'Expected return',
    ],
    ['A', 'Shares', 'North', 0.3, 0.5, 0.1, 0.6, 0.07],
    ['B', 'Bonds', 'South', 0.2, 0.5, -0.1, 0.4, 0.03],
  ])
  expect(reading.columns.map(({ role }) => role)).toEqual([
    'name', 'group', 'group', 'limit', 'benchmark weight', 'ignore', 'weight', 'expected return',
  ]) // prettier-ignore
  expect(reading.holdings[0]).toMatchObject({
    weight: 0.6,
    benchmark: 0.5,
    limit: 0.3,
    expected: 0.07,
    groups: ['Shares', 'North'],
  })
  expect(reading.limitHeader).toBe('Limit on share of risk')
})

test('without headings, roles come from content', () => {
  const reading = read([
    ['A', 'Shares', 0.5],
    ['B', 'Shares', 0.3],
    ['C', 'Bonds', 0.2],
  ])
  expect(reading.columns.map(({ header, role }) => [header, role])).toEqual([
    ['Column A', 'name'],
    ['Column B', 'group'],
    ['Column C', 'weight'],
  ])
})

test('a role changed by the user holds', () => {
  const reading = read(
    [
      ['Holding', 'Weight', 'Weight after'],
      ['A', 0.5, 0.7],
      ['B', 0.5, 0.3],
    ],
    { roles: { Weight: 'ignore', 'Weight after': 'weight' }, capital: null },
  )
  expect(reading.holdings.map(({ weight }) => weight)).toEqual([0.7, 0.3])
  expect(reading.columns[2]).toMatchObject({ role: 'weight', proposed: 'ignore' })
})

test('titles, totals, subtotals, headings within the block and blank rows are left out and told', () => {
  const reading = read([
    ['A foundation'],
    [],
    ['Holding', 'Weight'],
    ['Shares'],
    ['A', 0.5],
    ['B', 0.2],
    ['Subtotal', 0.7],
    [],
    ['C', 0.3],
    ['Total', 1],
  ])
  expect(reading.holdings.map(({ name }) => name)).toEqual(['A', 'B', 'C'])
  expect(sentences(reading, 'stops')).toEqual([])
  expect(sentences(reading, 'notes')).toEqual([
    '1 title row above the headings left out.',
    'Rows 7 and 10 read as totals and left out.',
    '“Shares” read as a heading within the block and left out.',
    '1 blank row left out.',
  ])
})

test('figures of their own above the headings are left out with the titles', () => {
  const reading = read(
    [
      ['Our book', ''],
      ['Capital', 2000],
      ['', ''],
      ['Fund', 'Market value'],
      ['Northern shares', 1200],
      ['Harbour bonds', 800],
    ],
    { roles: {}, capital: 2000 },
  )
  expect(reading.holdings.map(({ name, weight }) => [name, weight])).toEqual([
    ['Northern shares', 0.6],
    ['Harbour bonds', 0.4],
  ])
  expect(sentences(reading)).toEqual(['2 title rows above the headings left out.'])
})

test('a name that begins with Total is a holding unless its figure is the sum', () => {
  const reading = read([...PLAIN, ['Total return bonds', 0.1]])
  expect(reading.holdings.map(({ name }) => name)).toContain('Total return bonds')
})

test('a name that begins with Total is a holding where it has a group, whatever its figure', () => {
  const reading = read([
    ['Holding', 'Class', 'Weight'],
    ['Meadow', 'Shares', 0.25],
    ['Total return bonds', 'Bonds', 0.25],
    ['Orchard', 'Shares', 0.5],
    ['Total portfolio', '', 1],
  ])
  expect(reading.holdings.map(({ name }) => name)).toEqual(['Meadow', 'Total return bonds', 'Orchard'])
})

test('a total that does not sum is left out with a warning at its cell', () => {
  const reading = read([...PLAIN, ['Total', 0.98]])
  expect(reading.holdings).toHaveLength(2)
  expect(reading.findings[0]).toMatchObject({
    weight: 'warns',
    sentence: 'Book!B4: the total shows 0.9800 while the holdings above it sum to 1.0000.',
    area: { row: 3, column: 1 },
  })
})

test.each<[string, CellValue, string]>([
  ['text', 'abc', 'Book!B2: found “abc”; a weight is needed.'],
  ['an error', '#N/A', 'Book!B2: found the error #N/A; a weight is needed.'],
  ['a truth value', true, 'Book!B2: found TRUE; a weight is needed.'],
])('%s among the weights stops with its cell', (_, value, sentence) => {
  const reading = read([
    ['Holding', 'Weight', 'Note'],
    ['A', value, 'x'],
    ['B', 0.4, 'x'],
    ['C', 0.6, 'x'],
  ])
  expect(sentences(reading, 'stops')).toEqual([sentence])
})

test('a blank weight beside other entries stops; with a benchmark weight it is a holding at 0', () => {
  const rows: CellValue[][] = [
    ['Holding', 'Class', 'Weight', 'Benchmark weight'],
    ['A', 'Shares', 1, 0.5],
    ['B', 'Shares', '', 0.5],
    ['C', 'Shares', '', ''],
  ]
  const reading = read(rows)
  expect(sentences(reading, 'stops')).toEqual([
    'Book!C4: found a blank; a weight is needed (0 when “C” is not held).',
  ])
  expect(reading.holdings[1]).toMatchObject({ name: 'B', weight: 0 })
  expect(sentences(reading, 'notes')).toContain('“B”: no weight but a benchmark weight; counted at weight 0.')
})

test('a name typed twice stops and names both cells', () => {
  expect(sentences(read([...PLAIN, ['Harbour bonds', 0.1]]), 'stops')).toEqual([
    'Book!A4: found “Harbour bonds” a second time (first in Book!A3); one row a holding is needed.',
  ])
})

test('numbers typed as text are read by the culture of the workbook and told', () => {
  const rows: CellValue[][] = [
    ['Holding', 'Weight'],
    ['A', '62,5 %'],
    ['B', '(2,5%)'],
    ['C', 0.4],
  ]
  const german = readHoldings(blockOf(rows), asProposed, GERMAN)
  expect(german.holdings.map(({ weight }) => weight)).toEqual([0.625, -0.025, 0.4])
  expect(sentences(german, 'notes')).toContain(
    '2 numbers typed as text read as numbers (Book!B2 and Book!B3).',
  )
  const english = readHoldings(blockOf(rows), asProposed, ENGLISH)
  expect(sentences(english, 'stops')[0]).toBe('Book!B2: found “62,5 %”; a weight is needed.')
})

test('weights that do not sum to 1 are told, net and gross, and never changed', () => {
  const reading = read([
    ['Holding', 'Weight'],
    ['A', 1.3],
    ['B', -0.4],
  ])
  expect(reading.holdings.map(({ weight }) => weight)).toEqual([1.3, -0.4])
  expect(sentences(reading)).toEqual(['Weights sum to 90.00% (gross 170.00%); they are used as they stand.'])
})

test('weights typed in percent points are suspected, not divided', () => {
  const reading = read([
    ['Holding', 'Weight'],
    ['A', 60],
    ['B', 40],
  ])
  expect(reading.net).toBe(100)
  expect(sentences(reading, 'warns')[0]).toMatch(/percent points\? They are used as they stand/)
})

test('amounts are divided by their sum while none is negative, else the capital is asked for', () => {
  const rows: CellValue[][] = [
    ['Holding', 'Market value'],
    ['A', 3000],
    ['B', 1000],
  ]
  expect(read(rows).holdings.map(({ weight }) => weight)).toEqual([0.75, 0.25])
  expect(sentences(read(rows))).toEqual(['Weights are amounts divided by their sum, 4,000.00.'])
  rows.push(['C', -500])
  expect(sentences(read(rows), 'stops')).toEqual([
    'Book!B4: found a negative amount, so that the sum is not the capital; the capital figure is needed: point at its cell.',
  ])
  const pointed = read(rows, { roles: {}, capital: 5000 })
  expect(pointed.holdings.map(({ weight }) => weight)).toEqual([0.6, 0.2, -0.1])
  expect(sentences(pointed, 'stops')).toEqual([])
})

test('without the capital no weights are told', () => {
  const reading = read([
    ['Fund', 'Market value'],
    ['Northern shares', 1200],
    ['Index hedge', -200],
  ])
  expect(reading.summary).toBe('2 holdings, weights unknown without the capital')
  expect(sentences(reading)).toEqual([
    'Book!B3: found a negative amount, so that the sum is not the capital; the capital figure is needed: point at its cell.',
  ])
})

test('an exposure takes the place of the amount for the weight', () => {
  const reading = read(
    [
      ['Holding', 'Amount', 'Exposure'],
      ['A', 900, ''],
      ['Index future', 100, -400],
    ],
    asProposed,
  )
  expect(reading.holdings.map(({ weight }) => weight)).toEqual([0.9, -0.4])
})

test('merged cells among figures stop; a merged group label counts for all its rows', () => {
  const rows: CellValue[][] = [
    ['Class', 'Holding', 'Weight'],
    ['Shares', 'A', 0.5],
    ['', 'B', 0.2],
    ['Bonds', 'C', 0.3],
  ]
  const merged = [{ sheet: 'Book', row: 1, column: 0, rows: 2, columns: 1 }]
  const fine = readHoldings(blockOf(rows, 'Book', { merged }), asProposed, ENGLISH)
  expect(fine.holdings.map(({ groups }) => groups)).toEqual([['Shares'], ['Shares'], ['Bonds']])
  expect(sentences(fine, 'notes')).toContain(
    'Group labels in merged cells count for all their 1 further row.',
  )
  const bad = [{ sheet: 'Book', row: 1, column: 2, rows: 2, columns: 1 }]
  expect(
    sentences(readHoldings(blockOf(rows, 'Book', { merged: bad }), asProposed, ENGLISH), 'stops')[0],
  ).toBe('Book!C2:C3: found merged cells; one cell a figure is needed: unmerge them.')
})

test('hidden rows are counted like the others, with a warning', () => {
  const reading = readHoldings(blockOf(PLAIN, 'Book', { hiddenRows: new Set([2]) }), asProposed, ENGLISH)
  expect(reading.holdings).toHaveLength(2)
  expect(sentences(reading, 'warns')).toEqual(['1 holding in hidden rows is counted like the others.'])
})

test('a block without any number says what is missing', () => {
  expect(
    sentences(
      read([
        ['Holding', 'Weight'],
        ['A', ''],
        ['B', ''],
      ]),
      'stops',
    ).length,
  ).toBeGreaterThan(0)
  expect(sentences(read([['A'], ['B']]), 'stops')[0]).toBe(
    'Book!A1:A2: no column of weights or amounts found; one is needed: give a column that role.',
  )
})

test('a label that begins like a formula stays the label it is', () => {
  expect(
    read([
      ['Holding', 'Weight'],
      ['=1+1', 0.5],
      ['@name', 0.5],
    ]).holdings.map(({ name }) => name),
  ).toEqual(['=1+1', '@name'])
})

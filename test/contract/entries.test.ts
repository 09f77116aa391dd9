/**
 * New values in cells of the user's own: what they change and what they leave, what is refused, how the host's undo takes them back. What
 * the host does is told by its documentation (learn.microsoft.com, Office Add-ins: "Undo support with the Excel JavaScript API", "Add data
 * validation to Excel ranges", the reference of Excel.RunOptions and Excel.Range; read). All numbers are the tests' own and compared exactly.
 */
import { excelWorkbook } from '../../src/excel'
import { parseAddress, type Area, type CellEntry, type CellValue, type WorkbookEvent } from '../../src/sheet'
import { breakdown, closeAll, open, refusal } from './workbook-fixture'

jest.setTimeout(60_000)
afterEach(closeAll)

const area = (address: string): Area => {
  const found = parseAddress(address, 'Sheet1')
  if (!found) throw new Error(address)
  return found
}
const entry = (address: string, seen: CellValue, value: CellValue): CellEntry => ({
  at: area(address),
  seen,
  value,
})
const at = { sheet: 'Sheet1', row: 1, column: 5 }

/** Weights as users type them: a percentage, a formula, a number, one that is text. */
const weights = [
  ['Alder', '5%'],
  ['Birch', '=1/4'],
  ['Cedar', 0.3],
  ['Dogwood', "'40 %"],
  ['Elm', '=B1*2'],
]

async function withWeights() {
  const opened = open()
  opened.user.type('Sheet1', 'A1', weights)
  await opened.office.Excel.run(async (context) => {
    const cell = context.workbook.worksheets.getItem('Sheet1').getRange('B3')
    cell.numberFormat = [['0.000']]
    cell.format.font.bold = true
    cell.format.fill.color = '#FFEE00'
    await context.sync()
  })
  await opened.settle()
  return opened
}

describe('An entry', () => {
  test('changes what was typed and nothing else, and the opposite entry puts it back to the letter', async () => {
    const { book, cells, portrait, settle } = await withWeights()
    const before = portrait()
    const entries = [
      entry('B1', 0.05, 0.04),
      entry('B2', '=1/4', 0.26),
      entry('B3', 0.3, '=B1*3'),
      entry('B4', '40 %', 0.4),
      entry('B5', '=B1*2', ''),
    ]
    await book.write({ patches: [], entries })
    await settle()
    const after = await cells('Sheet1', 'B1:B5')
    expect(after['formulas']).toEqual([[0.04], [0.26], ['=B1*3'], [0.4], ['']])
    expect(after['values']).toEqual([[0.04], [0.26], [0.12], [0.4], ['']])
    expect(after['numberFormat']).toEqual([['0%'], ['General'], ['0.000'], ['General'], ['General']])

    await book.write({
      patches: [],
      entries: entries.map(({ at: place, value, seen }) => ({ at: place, value: seen, seen: value })),
    })
    await settle()
    expect(portrait()).toEqual(before)
  })

  test('of text stays text, whatever it looks like, and a formula in a cell of text format a formula', async () => {
    const { book, user, cells, office, settle } = open()
    user.type('Sheet1', 'A1', [[1], [2], ["'3"], ['Fir']])
    await office.Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem('Sheet1').getRange('A3:A4')
      range.numberFormat = [['@'], ['@']]
      await context.sync()
    })
    await book.write({
      patches: [],
      entries: [
        entry('A1', 1, '12.5%'),
        entry('A2', 2, "'=1+1"),
        entry('A3', '3', '=1/2'),
        entry('A4', 'Fir', '-Elm'),
      ],
    })
    await settle()
    const { values, valueTypes, numberFormat } = await cells('Sheet1', 'A1:A4')
    expect(values).toEqual([['12.5%'], ['=1+1'], [0.5], ['-Elm']])
    expect(valueTypes).toEqual([['String'], ['String'], ['Double'], ['String']])
    expect(numberFormat).toEqual([['General'], ['General'], ['@'], ['@']])
  })

  test('of a number goes into a cell of text format and can be taken back, whether the host keeps it a number or makes digits of it', async () => {
    const { book, user, cells, office, settle } = open()
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.getItem('Sheet1').getRange('A1').numberFormat = [['@']]
      await context.sync()
    })
    user.type('Sheet1', 'A1', [['62.5 %']])
    await settle()
    await book.write({ patches: [], entries: [entry('A1', '62.5 %', 0.6)] })
    await settle()
    expect(Number((await cells('Sheet1', 'A1')).values?.[0]?.[0])).toBe(0.6)
    await book.write({ patches: [], entries: [entry('A1', 0.6, '62.5 %')] })
    await settle()
    const { values, numberFormat } = await cells('Sheet1', 'A1')
    expect(values).toEqual([['62.5 %']])
    expect(numberFormat).toEqual([['@']])
  })

  test('is written in one request and one assignment with those beside it, be they 500 and scattered', async () => {
    const filled = Array.from({ length: 1000 }, (_, r) => [r, 2 * r, 3 * r])
    const { book, office, cells, settle } = open(undefined, filled)
    // 300 down one column, 50 side by side in pairs, 100 by themselves
    const places = [
      ...Array.from({ length: 300 }, (_, k) => [k, 0]),
      ...Array.from({ length: 50 }, (_, k) => [400 + 2 * k, 1]),
      ...Array.from({ length: 50 }, (_, k) => [400 + 2 * k, 2]),
      ...Array.from({ length: 100 }, (_, k) => [600 + 3 * k, 0]),
    ] as [number, number][]
    const entries = places.map(([row, column]) => ({
      at: { sheet: 'Sheet1', row, column, rows: 1, columns: 1 },
      seen: filled[row]?.[column] ?? '',
      value: -1,
    }))
    await settle()
    office.counts.reset()
    await book.write({ patches: [], entries })
    expect(office.counts.writes).toBe(1)
    expect(office.counts.syncs).toBe(3)
    const { values } = await cells('Sheet1', 'A1:C1000')
    const wanted = filled.map((row) => [...row])
    for (const [row, column] of places) (wanted[row] as number[])[column] = -1
    expect(values).toEqual(wanted)
  })

  test('goes with a table and settings in one plan', async () => {
    const { book, cells, office } = await withWeights()
    await book.write({
      patches: [{ at, table: breakdown(), over: 'blank' }],
      entries: [entry('B1', 0.05, 0.1)],
      keep: { table: area('F2:G7') },
      remember: { applied: 1 },
    })
    expect((await cells('Sheet1', 'B1')).values).toEqual([[0.1]])
    expect((await cells('Sheet1', 'F2')).values).toEqual([['Risk of the book']])
    expect(office.settings.get('counterpoise.applied')).toBe(1)
  })

  test('may stand on several sheets, and in the corner of merged cells', async () => {
    const { book, user, cells, office } = open()
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.add('Other')
      await context.sync()
    })
    user.type('Sheet1', 'A1', 1)
    user.merge('Sheet1', 'A1:B1')
    user.type('Other', 'A1', 2)
    await book.write({
      patches: [],
      entries: [entry('A1', 1, 10), { at: { ...area('A1'), sheet: 'Other' }, seen: 2, value: 20 }],
    })
    expect((await cells('Sheet1', 'A1')).values).toEqual([[10]])
    expect((await cells('Other', 'A1')).values).toEqual([[20]])
  })

  test('echoes as ours, also where the host does not mark it; what depends on it is told as calculated', async () => {
    for (const marks of [true, false]) {
      const { book, office, settle } = await withWeights()
      const { requirements } = office.Office.context
      const supported = requirements.isSetSupported
      Object.assign(requirements, {
        isSetSupported: (set: string, version: string) =>
          (marks || version !== '1.14') && supported(set, version),
      })
      const events: WorkbookEvent[] = []
      await book.watch((event) => events.push(event))
      await book.write({ patches: [], entries: [entry('B1', 0.05, 0.1), entry('B3', 0.3, 0.25)] })
      await settle()
      expect(events.filter(({ kind }) => kind === 'edited')).toEqual([
        { kind: 'edited', sheet: 'Sheet1', area: area('B1'), ours: true },
        { kind: 'edited', sheet: 'Sheet1', area: area('B3'), ours: true },
      ])
      expect(events).toContainEqual({ kind: 'calculated', sheet: 'Sheet1' })
      closeAll()
    }
  })
})

describe('An entry is refused, with nothing changed,', () => {
  const refused = async (
    prepare: (opened: ReturnType<typeof open>) => unknown,
    entries: readonly CellEntry[],
    table = false,
  ) => {
    const opened = await withWeights()
    await prepare(opened)
    await opened.settle()
    const before = opened.portrait()
    const patches = table ? [{ at, table: breakdown(), over: 'blank' as const }] : []
    const fault = await refusal(opened.book.write({ patches, entries }))
    await opened.settle()
    expect(opened.portrait()).toEqual(before)
    return fault
  }

  test('where the cell was edited since it was looked at, naming the first and what it holds', async () => {
    const entries = [entry('B3', 0.3, 0.2), entry('B1', 0.04, 0.06), entry('B2', '=1/2', 0.1)]
    const fault = await refused(() => undefined, entries, true)
    expect(fault).toEqual({
      code: 'changed',
      message:
        'Sheet1!B1 was edited meanwhile: found 5%, 4% was expected (and 1 more cell changed); nothing was written; start again from what stands there now',
    })
    const blank = await refused(({ user }) => user.type('Sheet1', 'B2', ''), [entry('B2', '=1/4', 1)])
    expect(blank.message).toMatch(/^Sheet1!B2 was edited meanwhile: found nothing, “=1\/4” was expected;/)
  })

  test('where a formula has taken the place of the number it gives, or a text that reads the same', async () => {
    const formula = await refused(({ user }) => user.type('Sheet1', 'B3', '=0.3'), [entry('B3', 0.3, 1)])
    expect(formula.message).toContain('found “=0.3”, 0.3 was expected')
    const text = await refused(({ user }) => user.type('Sheet1', 'B3', "'0.3"), [entry('B3', 0.3, 1)])
    expect(text).toMatchObject({ code: 'changed', message: expect.stringContaining('found “0.3”') })
  })

  test('where a formula elsewhere fills the cell, or its own fills others too', async () => {
    const spill = ({ user }: ReturnType<typeof open>) => user.type('Sheet1', 'D1', '=SEQUENCE(3,1)')
    // what the host gives as the formula of a spilled cell is its value
    expect(await refused(spill, [entry('D2', 2, 7)])).toEqual({
      code: 'occupied',
      message: expect.stringContaining('Sheet1!D2 shows a result of the formula in Sheet1!D1'),
    })
    expect(await refused(spill, [entry('D1', '=SEQUENCE(3,1)', 7)])).toEqual({
      code: 'occupied',
      message: expect.stringContaining('the formula in Sheet1!D1 fills other cells as well'),
    })
  })

  test('where merged cells cover it', async () => {
    const fault = await refused(({ user }) => user.merge('Sheet1', 'D1:D3'), [entry('D2', '', 1)])
    expect(fault).toEqual({
      code: 'occupied',
      message: expect.stringContaining('Sheet1!D2 is covered by the merged cells Sheet1!D1:D3'),
    })
  })

  test('on a protected sheet, and on one that is not there', async () => {
    expect(
      await refused(({ office }) => office.protect('Sheet1', true), [entry('B1', 0.05, 1)]),
    ).toMatchObject({ code: 'protected' })
    const gone = { at: { ...area('B1'), sheet: 'Gone' }, seen: 1, value: 2 }
    expect(await refused(() => undefined, [gone])).toMatchObject({
      code: 'missing',
      message: expect.stringContaining('"Gone"'),
    })
  })

  test('where it lies in a table to be written, is named twice, is no number or no cell', async () => {
    const codes = []
    for (const entries of [
      [entry('F3', '', 1)],
      [entry('B1', 0.05, 1), entry('B3', 0.3, 1), entry('B1', 0.05, 2)],
      [entry('B1', 0.05, NaN)],
      [{ at: area('B1:B2'), seen: 0.05, value: 1 }],
    ])
      codes.push((await refused(() => undefined, entries, true)).code)
    expect(codes).toEqual(['occupied', 'twice', 'not-a-number', 'selection'])
  })
})

describe('All or nothing', () => {
  /** A small plan, as the trades of a book are applied: numbers over a percentage, a formula and a text, and a setting. */
  const entries = [
    entry('B1', 0.05, 0.04),
    entry('B2', '=1/4', 0.26),
    entry('B4', '40 %', 0.4),
    entry('B5', '=B1*2', "'text"),
  ]
  const plan = { patches: [], entries, remember: { applied: [1, 2] } }

  test('a fault before any one of its operations leaves the weights as they were', async () => {
    const { book, office, portrait, settle } = await withWeights()
    const before = portrait()
    let operation = 0
    for (;;) {
      office.faults.beforeOperation(++operation)
      const failed = await book.write(plan).then(
        () => null,
        (error: unknown) => (error as { code: string }).code,
      )
      if (failed === null) break
      expect({ operation, failed, holds: portrait() }).toEqual({ operation, failed: 'host', holds: before })
    }
    office.faults.beforeOperation(null)
    await settle()
    // the journal's beginning and end, what stands there, and a format and a value for each run at least
    expect(operation).toBeGreaterThan(20)
    expect(portrait()).not.toEqual(before)
  })

  test('where putting back fails as well, the next opening does it', async () => {
    const probe = await withWeights()
    probe.office.counts.reset()
    await probe.book.write(plan)
    const { operations } = probe.office.counts
    closeAll()
    const { office, portrait, settle } = await withWeights()
    const before = portrait()
    let recovered = 0
    for (const first of [operations - 6, operations - 2, operations])
      for (const second of [1, 12, 26, 40]) {
        const book = excelWorkbook()
        await book.recall()
        office.faults.beforeOperation(first, first + second)
        const fault = await refusal(book.write(plan))
        office.faults.beforeOperation(null)
        await settle()
        if (!fault.message.includes('nothing was changed')) {
          expect(fault.message).toContain('is put back then')
          if (await excelWorkbook().recover()) recovered++
          await settle()
        }
        expect({ first, second, holds: portrait() }).toEqual({ first, second, holds: before })
      }
    expect(recovered).toBeGreaterThan(2)
  })

  test('recovery leaves a weight the user has typed since', async () => {
    const { book, office } = await withWeights()
    office.counts.reset()
    await book.write(plan)
    const { operations } = office.counts
    closeAll()
    const other = await withWeights()
    other.office.faults.beforeOperation(operations, operations + 1)
    expect((await refusal(other.book.write(plan))).message).toContain('is put back then')
    other.office.faults.beforeOperation(null)
    other.user.type('Sheet1', 'B1', 0.07)
    await other.settle()
    await excelWorkbook().recover()
    await other.settle()
    expect((await other.cells('Sheet1', 'B1:B5')).formulas).toEqual([
      [0.07],
      ['=1/4'],
      [0.3],
      ['40 %'],
      ['=B1*2'],
    ])
  })
})

describe('The host’s undo', () => {
  test('takes back a plan of several requests, table and entries, in one step', async () => {
    const { book, user, portrait, settle } = await withWeights()
    const before = portrait()
    await book.write({
      patches: [{ at, table: breakdown(), over: 'blank' }],
      entries: [entry('B1', 0.05, 0.04), entry('B2', '=1/4', 0.26)],
    })
    await settle()
    expect(portrait()).not.toEqual(before)
    user.undo()
    await settle()
    expect(portrait()).toEqual(before)
  })

  test('is the user’s own edit to whoever follows the workbook', async () => {
    const { book, user, settle } = await withWeights()
    await book.write({ patches: [], entries: [entry('B1', 0.05, 0.04)] })
    await settle()
    const events: WorkbookEvent[] = []
    await book.watch((event) => events.push(event))
    user.undo()
    await settle()
    expect(events).toContainEqual({ kind: 'edited', sheet: 'Sheet1', area: area('B1'), ours: false })
  })

  test('is asked for only where the host has it, and no more once the host has refused it', async () => {
    for (const [version, refuses, wanted] of [
      ['1.20', false, [true, true]],
      ['1.19', false, [false, false]],
      ['1.20', true, [true, false, false]],
    ] as const) {
      const { book, office, cells } = await withWeights()
      const { requirements } = office.Office.context
      Object.assign(requirements, {
        isSetSupported: (_: string, asked: string) => Number(asked.slice(2)) <= Number(version.slice(2)),
      })
      const asked: boolean[] = []
      const run = office.Excel.run.bind(office.Excel) as unknown as (
        options: Excel.RunOptions,
        batch: (context: Excel.RequestContext) => Promise<unknown>,
      ) => Promise<unknown>
      Object.assign(office.Excel, {
        run: (options: Excel.RunOptions, batch: (context: Excel.RequestContext) => Promise<unknown>) =>
          run(options, (context) => {
            if (typeof options !== 'object' || !('delayForCellEdit' in options)) return batch(context)
            const isWrite = Boolean(options.mergeUndoGroup)
            const sync = context.sync.bind(context)
            let counted = false
            context.sync = (async () => {
              await sync()
              if (office.counts.writes === 0) return
              office.counts.reset()
              if (!counted) asked.push(isWrite)
              counted = true
              if (refuses && isWrite) throw Object.assign(new Error('no'), { code: 'UndoNotSupported' })
            }) as typeof context.sync
            return batch(context)
          }),
      })
      office.counts.reset()
      await book.write({ patches: [], entries: [entry('B1', 0.05, 0.04)] })
      await book.write({ patches: [], entries: [entry('B1', 0.04, 0.03)] })
      expect((await cells('Sheet1', 'B1')).values).toEqual([[0.03]])
      // putting back what the refused request did is a request of its own, without a group
      expect(asked.filter((_, k) => !refuses || k !== 1)).toEqual(wanted)
      closeAll()
    }
  })
})

/**
 * The Workbook port over the strict stand-in for the Office JavaScript API, promise by promise. All numbers are entered by the tests
 * themselves and handed through unchanged, so they are compared exactly.
 */
import { addressOf, parseAddress, type Area, type Table, type WorkbookEvent } from '../../src/sheet'
import {
  blank,
  breakdown,
  closeAll,
  folding,
  number,
  open,
  refusal,
  tableOf,
  text,
  valuesOf,
} from './workbook-fixture'

afterEach(closeAll)

const area = (address: string): Area => {
  const found = parseAddress(address, 'Sheet1')
  if (!found) throw new Error(address)
  return found
}
const at = { sheet: 'Sheet1', row: 1, column: 1 }

describe('The selection', () => {
  test('is one block with its place, and a single cell stays a single cell', async () => {
    const { book, user } = open()
    user.type('Sheet1', 'A1', [[1, 2, 3]])
    user.select('Sheet1', 'B2:D9')
    expect(addressOf(await book.selection())).toBe('Sheet1!B2:D9')
    user.select('Sheet1', 'C3')
    expect(addressOf(await book.selection())).toBe('Sheet1!C3')
  })

  test('of several areas is refused', async () => {
    const { book, user } = open()
    user.select('Sheet1', 'B2:B4', 'D2:D4')
    expect(await refusal(book.selection())).toMatchObject({
      code: 'selection',
      message: expect.stringContaining('select one block of cells'),
    })
  })

  test('of whole columns or rows is cut to what is used', async () => {
    const { book, user } = open()
    user.type('Sheet1', 'B3', [
      [1, 2],
      [3, 4],
    ])
    user.select('Sheet1', 'C:E')
    expect(addressOf(await book.selection())).toBe('Sheet1!C3:C4')
    user.select('Sheet1', '4:9')
    expect(addressOf(await book.selection())).toBe('Sheet1!B4:C4')
  })

  test('of whole columns with nothing in them is refused', async () => {
    const { book, user } = open()
    user.select('Sheet1', 'C:E')
    expect(await refusal(book.selection())).toMatchObject({ code: 'selection' })
  })
})

describe('Reading', () => {
  const rows = 110
  const wide = 1000
  const filled = () =>
    open(
      {},
      Array.from({ length: rows }, (_, r) => Array.from({ length: wide }, (__, c) => r + c / 1000)),
    )
  const all: Area = { sheet: 'Sheet1', row: 0, column: 0, rows, columns: wide }

  test('takes a large block in several requests, tells its progress and loses nothing', async () => {
    const { book, office } = filled()
    const shares: number[] = []
    const block = await book.read(all, { progress: (share) => shares.push(share) })
    // 110 000 numbers of about 20 bytes, 2 MB a request
    expect(office.counts.syncs).toBe(2)
    expect(shares).toEqual([100 / 110, 1])
    expect(block.area).toEqual(all)
    expect(block.values).toHaveLength(rows)
    expect(block.values[109]?.[999]).toBe(109 + 999 / 1000)
  })

  test('stops between requests when it is cancelled', async () => {
    const { book, office } = filled()
    const controller = new AbortController()
    const reading = book.read(all, { signal: controller.signal, progress: () => controller.abort() })
    expect(await refusal(reading)).toMatchObject({ code: 'cancelled' })
    expect(office.counts.syncs).toBe(1)
  })

  test('asks for smaller blocks when texts make an answer too large', async () => {
    const column = Array.from({ length: 40 }, (_, k) => ['x'.repeat(400) + k])
    const { book, office } = open({ payloadLimit: 4000 }, column)
    const { values } = await book.read(area('A1:A40'))
    expect(values).toEqual(column)
    expect(office.counts.syncs).toBeGreaterThan(4)
  })

  test('keeps blanks, errors, texts, truth values and full doubles apart', async () => {
    const { book, user, settle } = open()
    user.type('Sheet1', 'A1', [['', '=1/0', "'12", true, 0.1 + 0.2, '=NA()']])
    await settle()
    const { values } = await book.read(area('A1:F1'))
    expect(values).toEqual([['', '#DIV/0!', '12', true, 0.1 + 0.2, '#N/A']])
  })

  test('of whole columns reads what is used of them', async () => {
    const { book, user } = open()
    user.type('Sheet1', 'B3', [[1], [2]])
    const { area: read, values } = await book.read({
      sheet: 'Sheet1',
      row: 0,
      column: 1,
      rows: 1_048_576,
      columns: 1,
    })
    expect(addressOf(read)).toBe('Sheet1!B3:B4')
    expect(values).toEqual([[1], [2]])
  })

  test('finds hidden rows and merged areas when asked to', async () => {
    const { book, user } = open()
    user.type('Sheet1', 'A1', [
      [1, 2],
      [3, 4],
      [5, 6],
      [7, 8],
    ])
    user.hideRows('Sheet1', 3, 1)
    user.merge('Sheet1', 'A1:B1')
    const block = await book.read(area('A1:B4'), { shape: true })
    expect([...(block.hiddenRows ?? [])]).toEqual([2])
    expect(block.merged?.map(addressOf)).toEqual(['Sheet1!A1:B1'])
    expect((await book.read(area('A1:B4'))).hiddenRows).toBeUndefined()
  })

  test('of a sheet that is gone is refused with its address', async () => {
    const { book } = open()
    expect(await refusal(book.read({ ...area('A1:B2'), sheet: 'Gone' }))).toMatchObject({
      code: 'missing',
      message: expect.stringContaining('Gone!A1:B2'),
    })
  })
})

describe('Looking', () => {
  test('at any number of ranges takes one request, and what is gone is null', async () => {
    const { book, user, office } = open()
    user.type('Sheet1', 'B2', [
      ['a', '=1+1'],
      ['b', 5],
    ])
    await book.write({ patches: [], keep: { weights: area('C2:C3'), lost: area('F1:F2') } })
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.add('Passing')
      await context.sync()
    })
    await book.write({ patches: [], keep: { passing: { ...area('A1:A2'), sheet: 'Passing' } } })
    user.deleteSheet('Passing')
    user.deleteColumns('Sheet1', 6, 1)
    office.counts.reset()
    const [weights, plain, lost, never, passing, goneSheet] = await book.look([
      { at: { kept: 'weights' }, values: true, formulas: true, shape: true, region: true },
      { at: area('B2:B3'), values: true },
      { at: { kept: 'lost' }, values: true, shape: true, region: true },
      { at: { kept: 'never' } },
      { at: { kept: 'passing' }, formulas: true },
      { at: { ...area('A1'), sheet: 'Passing' }, values: true, shape: true },
    ])
    expect(office.counts.syncs).toBe(1)
    expect(weights).toEqual({
      area: area('C2:C3'),
      values: [[2], [5]],
      formulas: [['=1+1'], [5]],
      hiddenRows: new Set(),
      merged: [],
      region: area('B2:C3'),
      protected: false,
    })
    expect(plain).toEqual({ area: area('B2:B3'), values: [['a'], ['b']], protected: false })
    expect([lost, never, passing, goneSheet]).toEqual([null, null, null, null])
  })

  test('follows a kept range through inserted rows and a renamed sheet, and sees protection', async () => {
    const { book, user, office } = open()
    user.type('Sheet1', 'B2', [[1], [2]])
    await book.write({ patches: [], keep: { weights: area('B2:B3') } })
    user.insertRows('Sheet1', 1, 4)
    user.renameSheet('Sheet1', "Ash's book")
    office.protect("Ash's book", true)
    const [seen] = await book.look([{ at: { kept: 'weights' }, values: true }])
    expect(seen && addressOf(seen.area)).toBe("'Ash''s book'!B6:B7")
    expect(seen).toMatchObject({ values: [[1], [2]], protected: true })
  })
})

describe('A first write', () => {
  test('fills the table, keeps every label text and sets names and settings', async () => {
    const { book, cells, office } = open()
    const table = breakdown()
    const written = await book.write({
      patches: [{ at, table, over: 'blank' }],
      keep: { table: area('B2:C7') },
      remember: { links: [{ name: 'book', lookBack: null }] },
    })
    expect(written.map(addressOf)).toEqual(['Sheet1!B2:C7'])
    const { values, formulas, valueTypes, numberFormat } = await cells('Sheet1', 'B2:C7')
    expect(values).toEqual(valuesOf(table))
    expect(formulas).toEqual(valuesOf(table))
    expect(valueTypes?.map((row) => row[0])).toEqual(Array(6).fill('String'))
    expect(numberFormat?.[2]).toEqual(['@', '0.0%'])
    expect([...office.settings]).toEqual([['counterpoise.links', [{ name: 'book', lookBack: null }]]])
    expect(await book.recall()).toEqual({ links: [{ name: 'book', lookBack: null }] })
    const [seen] = await book.look([{ at: { kept: 'table' } }])
    expect(seen?.area).toEqual(area('B2:C7'))
  })

  test('sets title, heads and total off without a colour', async () => {
    const { book, office } = open()
    await book.write({ patches: [{ at, table: breakdown(), over: 'blank' }] })
    const looks = await office.Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem('Sheet1')
      const asked = ['B2', 'C3', 'B4', 'C7'].map((address) => {
        const { format } = sheet.getRange(address)
        format.load('horizontalAlignment,columnWidth')
        format.font.load('bold,color')
        format.fill.load('color')
        const edges = (['EdgeTop', 'EdgeBottom'] as const).map((edge) =>
          format.borders.getItem(edge).load('style'),
        )
        return { format, edges }
      })
      await context.sync()
      return asked.map(({ format, edges }) => ({
        bold: format.font.bold,
        align: format.horizontalAlignment,
        rules: edges.map(({ style }) => style),
        colours: [format.font.color, format.fill.color],
        width: format.columnWidth,
      }))
    })
    const colours = ['#000000', '#FFFFFF']
    // (24 * 7 + 5) pixels of 0.75 points; the narrower column was wide enough for (12 * 7 + 5) pixels or is made so
    expect(looks).toMatchObject([
      { bold: true, align: 'General', colours, width: 129.75 },
      { bold: true, align: 'Right', rules: ['None', 'Continuous'], colours, width: 66.75 },
      { bold: false, align: 'General', colours },
      { bold: true, rules: ['Continuous', 'None'], colours },
    ])
  })

  test('reads from the top where the table says so, and a plain one later from the bottom again', async () => {
    const { book, office } = open()
    const at = { sheet: 'Sheet1', row: 0, column: 0 }
    const table = { ...breakdown(), fromTop: true }
    const [ours] = await book.write({ patches: [{ at, table, over: 'blank' }] })
    const vertical = () =>
      office.Excel.run(async (context) => {
        const { format } = context.workbook.worksheets.getItem('Sheet1').getRange('A3:B4')
        format.load('verticalAlignment')
        await context.sync()
        return format.verticalAlignment
      })
    expect(await vertical()).toBe('Top')
    await book.write({ patches: [{ at, table: breakdown(), over: 'blank', ours: ours! }] })
    expect(await vertical()).toBe('Bottom')
  })

  test('makes the sheet it asks for, once', async () => {
    const { book } = open()
    const table = breakdown()
    const plan = { sheet: 'Risk', patches: [{ at: { ...at, sheet: 'Risk' }, table, over: 'blank' as const }] }
    await book.write(plan)
    expect(await book.sheets()).toEqual(['Sheet1', 'Risk'])
    const ours = { ...area('B2:C7'), sheet: 'Risk' }
    await book.write({ ...plan, patches: [{ at: { ...at, sheet: 'Risk' }, table, over: 'blank', ours }] })
    expect(await book.sheets()).toEqual(['Sheet1', 'Risk'])
  })

  test('of more than one request can hold is written whole', async () => {
    const { book, office } = open()
    const cells = Array.from({ length: 1000 }, (_, r) => [
      text(`Position ${r} ${'x'.repeat(2600)}`),
      number(r + 1 / 8, '0.00'),
    ])
    await book.write({ patches: [{ at, table: tableOf(cells), over: 'blank' }] })
    expect(office.counts.writes).toBeGreaterThan(2)
    const { values } = await book.read({ ...at, rows: 1000, columns: 2 })
    expect(values).toEqual(cells.map((row) => row.map(({ value }) => value)))
    expect(office.settings.size).toBe(0)
  })
})

describe('A write is refused, with nothing changed,', () => {
  const refused = async (
    prepare: (opened: ReturnType<typeof open>) => unknown,
    plan: Parameters<ReturnType<typeof open>['book']['write']>[0] = {
      patches: [{ at, table: breakdown(), over: 'blank' }],
    },
  ) => {
    const opened = open()
    await prepare(opened)
    await opened.settle()
    const before = opened.portrait()
    const fault = await refusal(opened.book.write(plan))
    expect(opened.portrait()).toEqual(before)
    return fault
  }

  test('over foreign cells, naming the first and how many', async () => {
    const fault = await refused(({ user }) => {
      user.type('Sheet1', 'C4', 'mine')
      user.type('Sheet1', 'B6', '=""')
    })
    expect(fault.code).toBe('occupied')
    expect(fault.message).toMatch(
      /^Sheet1!C4 is in the way of the table: it holds “.+”, and 1 more cell holds something/,
    )
  })

  test('over a cell that is not ours beside the earlier table', async () => {
    const fault = await refused(({ user }) => user.type('Sheet1', 'B7', 'mine'), {
      patches: [{ at, table: breakdown(), over: 'blank', ours: area('B2:C6') }],
    })
    expect(fault).toMatchObject({
      code: 'occupied',
      message: expect.stringContaining('Sheet1!B7 is in the way'),
    })
  })

  test('over merged cells, even where it may replace', async () => {
    const fault = await refused(({ user }) => user.merge('Sheet1', 'C5:D6'), {
      patches: [{ at, table: breakdown(), over: 'replace' }],
    })
    expect(fault).toMatchObject({
      code: 'occupied',
      message: expect.stringContaining('Sheet1!C5:D6 is merged'),
    })
  })

  test('over results that a formula outside spills, even where it may replace', async () => {
    const fault = await refused(({ user }) => user.type('Sheet1', 'A4', '=SEQUENCE(2,4)'), {
      patches: [{ at, table: breakdown(), over: 'replace' }],
    })
    expect(fault).toMatchObject({
      code: 'occupied',
      message: expect.stringContaining('Sheet1!B4 shows results of the formula in Sheet1!A4'),
    })
  })

  test('on a protected sheet', async () => {
    expect(await refused(({ office }) => office.protect('Sheet1', true))).toMatchObject({
      code: 'protected',
      message: expect.stringContaining('"Sheet1"'),
    })
  })

  test('on a sheet that is not there and that the plan does not make', async () => {
    const patches = [{ at: { ...at, sheet: 'Gone' }, table: breakdown(), over: 'blank' as const }]
    expect(await refused(() => undefined, { patches })).toMatchObject({ code: 'missing' })
  })

  test('over the end of the sheet, and with a number that is not finite', async () => {
    const patches = [{ at: { ...at, row: 1_048_572 }, table: breakdown(), over: 'blank' as const }]
    expect(await refused(() => undefined, { patches })).toMatchObject({ code: 'selection' })
    const broken = tableOf([[text('Total'), number(Infinity)]])
    expect(await refused(() => undefined, { patches: [{ at, table: broken, over: 'blank' }] })).toMatchObject(
      { code: 'not-a-number', message: expect.stringContaining('Sheet1!C2') },
    )
  })
})

describe('A later write', () => {
  test('clears what the earlier table leaves over, and only that', async () => {
    const { book, user, portrait, cells } = open()
    user.type('Sheet1', 'A1', [['mine', 1, 2, 3]])
    user.type('Sheet1', 'B9', 'mine too')
    await book.write({ patches: [{ at, table: breakdown([0.5, 0.2, 0.2, 0.1]), over: 'blank' }] })
    await book.write({ patches: [{ at, table: breakdown([1]), over: 'blank', ours: area('B2:C8') }] })
    expect((await cells('Sheet1', 'B2:C9')).values).toEqual([
      ...valuesOf(breakdown([1])),
      ['', ''],
      ['', ''],
      ['', ''],
      ['mine too', ''],
    ])
    const { cells: left = {}, rules = {} } = portrait().sheets?.[0] ?? {}
    expect(Object.keys({ ...left, ...rules }).filter((cell) => /^R[678]/.test(cell))).toEqual([])
  })

  test('of new values alone is one request, also with settings that are known', async () => {
    const { book, office, cells, user } = open()
    await book.write({ patches: [{ at, table: breakdown(), over: 'blank' }], remember: { seen: 1, gone: 2 } })
    // a user who makes the labels' cells General must not turn them into formulas
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.getItem('Sheet1').getRange('B2:B7').numberFormat = [['General']] as never
      await context.sync()
    }).catch(() => undefined)
    user.type('Sheet1', 'C4', 0.123)
    const [seen] = await book.look([{ at: area('B2:C7'), formulas: true }])
    office.counts.reset()
    const table = breakdown([0.6, 0.1, 0.3])
    await book.write({
      patches: [{ at, table, over: 'blank', ours: area('B2:C7'), seen: seen?.formulas ?? [] }],
      remember: { seen: 2, gone: null },
    })
    expect(office.counts.syncs).toBe(1)
    const { values, formulas, numberFormat } = await cells('Sheet1', 'B2:C7')
    expect(values).toEqual(valuesOf(table))
    expect(formulas).toEqual(valuesOf(table))
    expect(numberFormat?.[2]).toEqual(['@', '0.0%'])
    expect(await book.recall()).toEqual({ seen: 2 })
  })

  test('keeps a user’s own number format when only values are new', async () => {
    const { book, office, cells } = open()
    await book.write({ patches: [{ at, table: breakdown(), over: 'blank' }] })
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.getItem('Sheet1').getRange('C4').numberFormat = [['0.000']]
      await context.sync()
    })
    const seen = valuesOf(breakdown())
    await book.write({
      patches: [{ at, table: breakdown([1, 0, 0]), over: 'blank', ours: area('B2:C7'), seen }],
    })
    expect((await cells('Sheet1', 'C4:C5')).numberFormat).toEqual([['0.000'], ['0.0%']])
  })

  test('moves and removes names', async () => {
    const { book } = open()
    await book.write({ patches: [], keep: { a: area('A1:A2'), b: area('B1:B2') } })
    await book.write({ patches: [], keep: { a: { ...area('C1:D9'), sheet: 'Sheet1' }, b: null } })
    const [a, b] = await book.look([{ at: { kept: 'a' } }, { at: { kept: 'b' } }])
    expect(a?.area).toEqual(area('C1:D9'))
    expect(b).toBeNull()
  })
})

describe('Links and groups', () => {
  type Opened = ReturnType<typeof open>
  const levels = ({ portrait }: Opened, name = 'Sheet1') =>
    portrait()
      .sheets?.find((sheet) => sheet.name === name)
      ?.levels.slice(0, 8)
  const links = ({ office }: Opened, address: string, sheet = 'Sheet1') =>
    office.Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem(sheet).getRange(address)
      const properties = range.getCellProperties({ hyperlink: true })
      await context.sync()
      return properties.value.map((row) => row.map(({ hyperlink }) => hyperlink?.documentReference ?? null))
    })
  const fontOf = ({ office }: Opened, address: string, sheet = 'Sheet1') =>
    office.Excel.run(async (context) => {
      const { font } = context.workbook.worksheets.getItem(sheet).getRange(address).format
      font.load('name,size,color,underline')
      await context.sync()
      const { name, size, color, underline } = font
      return { name, size, color, underline }
    })
  const names = ({ office }: Opened) =>
    office.Excel.run(async (context) => {
      const { names: all } = context.workbook
      all.load('items/name,items/formula,items/visible')
      await context.sync()
      return all.items.map(({ name, formula, visible }) => [name, formula, visible])
    })
  const plain = { name: 'Calibri', size: 11, color: '#000000', underline: 'None' }

  test('a linked label stays the text it is, in the cell’s own font, underlined', async () => {
    const opened = open()
    const { book, office, cells } = opened
    await office.Excel.run(async (context) => {
      const { font } = context.workbook.worksheets.getItem('Sheet1').getRange('B2').format
      Object.assign(font, { name: 'Arial', size: 20, color: '#FF0000' })
      await context.sync()
    })
    const table = folding(0, 0)
    await book.write({
      sheet: 'Risk',
      patches: [
        { at, table, over: 'blank' },
        { at: { ...at, sheet: 'Risk' }, table, over: 'blank' },
      ],
    })
    for (const sheet of ['Sheet1', 'Risk']) {
      expect(await links(opened, 'B2:C3', sheet)).toEqual([
        ['Sheet1!H1', null],
        ['Sheet1!H2', null],
      ])
      const { formulas, valueTypes } = await cells(sheet, 'B2:C3')
      expect(formulas).toEqual(valuesOf(table))
      expect(valueTypes?.[0]?.[0]).toBe('String')
      expect(await fontOf(opened, 'B3', sheet)).toEqual({ ...plain, underline: 'Single' })
    }
    expect(await fontOf(opened, 'B2')).toEqual({
      name: 'Arial',
      size: 20,
      color: '#FF0000',
      underline: 'Single',
    })
  })

  test('links go with the table that had them, and with their underline', async () => {
    const opened = open()
    const { book } = opened
    await book.write({ patches: [{ at, table: folding(0, 0, 0), over: 'blank' }] })
    const table = tableOf([[text('no link'), number(1)]])
    await book.write({ patches: [{ at, table, over: 'blank', ours: area('B2:C4') }] })
    expect(await links(opened, 'B2:C4')).toEqual([
      [null, null],
      [null, null],
      [null, null],
    ])
    expect(await fontOf(opened, 'B2:C4')).toEqual(plain)
  })

  test('a link of the user’s goes where the user lets a table replace it', async () => {
    const opened = open()
    const { book, office, cells } = opened
    await office.Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem('Sheet1').getRange('B2')
      range.hyperlink = { address: 'https://example.org', textToDisplay: 'mine' }
      await context.sync()
    })
    await book.write({ patches: [{ at, table: tableOf([[text('ours')]]), over: 'replace' }] })
    expect((await cells('Sheet1', 'B2')).values).toEqual([['ours']])
    expect(await links(opened, 'B2')).toEqual([[null]])
    expect(await fontOf(opened, 'B2')).toEqual(plain)
  })

  test('rows fold under those before them, remembered in names that do not show', async () => {
    const opened = open()
    await opened.book.write({ patches: [{ at, table: folding(0, 1, 2, 2, 1, 0), over: 'blank' }] })
    expect(levels(opened)).toEqual([0, 0, 1, 2, 2, 1, 0, 0])
    expect(await names(opened)).toEqual([
      ['Poise_fold_1', '=Sheet1!$B$3:$C$6', false],
      ['Poise_fold_2', '=Sheet1!$B$4:$C$5', false],
    ])
  })

  test('groups follow the table: inserted rows, another shape, none at all', async () => {
    const opened = open()
    const { book, user } = opened
    const write = (table: Parameters<typeof valuesOf>[0], ours: string, row = 1) =>
      book.write({ patches: [{ at: { ...at, row }, table, over: 'blank', ours: area(ours) }] })
    await write(folding(0, 1, 2, 0), 'B2:C5')
    user.insertRows('Sheet1', 1, 2)
    expect(levels(opened)).toEqual([0, 0, 0, 0, 1, 2, 0, 0])
    await write(folding(0, 1, 0, 1), 'B4:C7', 3)
    expect(levels(opened)).toEqual([0, 0, 0, 0, 1, 0, 1, 0])
    await write(tableOf([[text('flat'), number(1)]]), 'B4:C7', 3)
    expect(levels(opened)).toEqual([0, 0, 0, 0, 0, 0, 0, 0])
    expect(await names(opened)).toEqual([])
  })

  test('groups that stay as they are are left alone, folded or not', async () => {
    const opened = open()
    const { book, user, office } = opened
    await book.write({ patches: [{ at, table: folding(0, 1, 1), over: 'blank' }] })
    user.hideRows('Sheet1', 3, 2)
    await book.write({ patches: [{ at, table: folding(0, 1, 1), over: 'blank', ours: area('B2:C4') }] })
    const hidden = (address: string) =>
      office.Excel.run(async (context) => {
        const range = context.workbook.worksheets.getItem('Sheet1').getRange(address).load('rowHidden')
        await context.sync()
        return range.rowHidden
      })
    expect([await hidden('3:4'), levels(opened)]).toEqual([true, [0, 0, 1, 1, 0, 0, 0, 0]])
    await book.write({ patches: [{ at, table: folding(0, 0, 1), over: 'blank', ours: area('B2:C4') }] })
    expect([await hidden('3:4'), levels(opened)]).toEqual([false, [0, 0, 0, 1, 0, 0, 0, 0]])
  })

  test('nothing folds where cells that are not the table’s stand in its rows', async () => {
    const opened = open()
    const { book, user } = opened
    user.type('Sheet1', 'A3', 'mine')
    await book.write({ patches: [{ at, table: folding(0, 1, 1), over: 'blank' }] })
    expect(levels(opened)).toEqual([0, 0, 0, 0, 0, 0, 0, 0])
    user.type('Sheet1', 'A3', '')
    user.type('Sheet1', 'A2', 'beside a row that does not fold')
    await book.write({ patches: [{ at, table: folding(0, 1, 1), over: 'blank', ours: area('B2:C4') }] })
    expect(levels(opened)).toEqual([0, 0, 1, 1, 0, 0, 0, 0])
    user.type('Sheet1', 'Z4', 'mine')
    await book.write({ patches: [{ at, table: folding(0, 1, 1), over: 'blank', ours: area('B2:C4') }] })
    expect(levels(opened)).toEqual([0, 0, 0, 0, 0, 0, 0, 0])
  })

  test('two tables written side by side do not fold each other away', async () => {
    const opened = open()
    await opened.book.write({
      sheet: 'Risk',
      patches: [
        { at: { ...at, sheet: 'Risk' }, table: folding(0, 1, 1), over: 'blank' },
        { at: { sheet: 'Risk', row: 2, column: 5 }, table: tableOf([[text('x')]]), over: 'blank' },
      ],
    })
    expect(levels(opened, 'Risk')).toEqual([0, 0, 0, 0, 0, 0, 0, 0])
  })

  test('groups that the user took away by hand, all or some, are no obstacle', async () => {
    for (const [rows, act] of [
      ['3:6', 'ungroup'],
      ['4:4', 'ungroup'],
    ] as const) {
      const opened = open()
      const { book, office } = opened
      await book.write({ patches: [{ at, table: folding(0, 1, 2, 0, 1), over: 'blank' }] })
      await office.Excel.run(async (context) => {
        const range = context.workbook.worksheets.getItem('Sheet1').getRange(rows)
        range[act]('ByRows')
        range[act]('ByRows')
        await context.sync()
      }).catch(() => undefined)
      await book.write({ patches: [{ at, table: folding(0, 0, 1), over: 'blank', ours: area('B2:C6') }] })
      expect(levels(opened)).toEqual([0, 0, 0, 1, 0, 0, 0, 0])
    }
  })

  test('a host that will not group leaves everything as it was, and says so', async () => {
    const opened = open()
    const { book, office, portrait } = opened
    await office.Excel.run(async (context) => {
      const rows = context.workbook.worksheets.getItem('Sheet1').getRange('3:4')
      for (let level = 0; level < 7; level++) rows.group('ByRows' as Excel.GroupOption)
      await context.sync()
    })
    const before = portrait()
    const fault = await refusal(book.write({ patches: [{ at, table: folding(0, 1, 1), over: 'blank' }] }))
    expect(fault).toMatchObject({ code: 'host', message: expect.stringContaining('nothing was changed') })
    expect({ ...portrait(), sheets: null }).toEqual({ ...before, sheets: null })
  })

  test('without links and groups a write takes no request more, with the same ones none either', async () => {
    const requests = async (table: Parameters<typeof valuesOf>[0]) => {
      const { book, office } = open()
      office.counts.reset()
      await book.write({ patches: [{ at, table, over: 'blank' }] })
      const first = office.counts.syncs
      await book.write({ patches: [{ at, table, over: 'blank', ours: area('B2:C4') }] })
      return [first, office.counts.syncs - first]
    }
    const { levels: _, cells, ...rest } = folding(0, 1, 1)
    const flat = { ...rest, cells: cells.map((row) => row.map(({ link: __, ...cell }) => cell)) }
    expect(await requests(folding(0, 1, 1))).toEqual(await requests(flat))
  })

  test('a refresh of values is one request and leaves links and groups alone', async () => {
    const opened = open()
    const { book, office, cells } = opened
    const table = folding(0, 1, 1)
    await book.write({ patches: [{ at, table, over: 'blank' }] })
    const seen = valuesOf(table)
    office.counts.reset()
    const fresh = {
      ...table,
      cells: table.cells.map((row) => row.map((cell, c) => (c === 1 ? number(0.5) : cell))),
    }
    await book.write({ patches: [{ at, table: fresh, over: 'blank', ours: area('B2:C4'), seen }] })
    expect(office.counts.syncs).toBe(1)
    expect((await cells('Sheet1', 'B2:C4')).values).toEqual(valuesOf(fresh))
    expect(await links(opened, 'B2:B4')).toEqual([['Sheet1!H1'], ['Sheet1!H2'], ['Sheet1!H3']])
    expect(levels(opened)).toEqual([0, 0, 1, 1, 0, 0, 0, 0])
  })
})

describe('Bars and indents', () => {
  const barred = (more: Partial<Table> = {}): Table => ({
    ...breakdown(),
    bars: [{ column: 1, row: 2, rows: 3, full: 1 }],
    ...more,
  })
  const barsOf = (office: ReturnType<typeof open>['office'], address: string) =>
    office.Excel.run(async (context) => {
      const formats = context.workbook.worksheets
        .getItem('Sheet1')
        .getRange(address)
        .conditionalFormats.load('items/type')
      await context.sync()
      const found = formats.items.map(({ dataBar, ...format }) => {
        void format
        dataBar.load('lowerBoundRule,upperBoundRule')
        dataBar.positiveFormat.load('fillColor,gradientFill')
        return dataBar
      })
      const ranges = formats.items.map((format) => format.getRanges().load('address'))
      await context.sync()
      return found.map(({ lowerBoundRule, upperBoundRule, positiveFormat }, k) => ({
        lies: ranges[k]?.address,
        from: lowerBoundRule.formula,
        to: upperBoundRule.formula,
        colour: positiveFormat.fillColor,
        fades: positiveFormat.gradientFill,
      }))
    })
  const grey = (lies: string, to = '1') => ({ lies, from: '0', to, colour: '#A6ACB5', fades: false })

  test('a bar lies behind the numbers it is for, from nothing to the whole', async () => {
    const { book, office } = open()
    await book.write({ patches: [{ at, table: barred(), over: 'blank' }] })
    expect(await barsOf(office, 'A1:F20')).toEqual([grey('Sheet1!C4:C6')])
  })

  test('a later table takes its own bars along and leaves those of the user', async () => {
    const { book, office, user } = open()
    await book.write({ patches: [{ at, table: barred(), over: 'blank' }] })
    await office.Excel.run(async (context) => {
      const { conditionalFormats } = context.workbook.worksheets.getItem('Sheet1').getRange('B4:B5')
      const { dataBar } = conditionalFormats.add('DataBar')
      dataBar.positiveFormat.fillColor = '#00FF00'
      await context.sync()
    })
    const mine = { lies: 'Sheet1!B4:B5', from: undefined, to: undefined, colour: '#00FF00', fades: true }
    user.insertRows('Sheet1', 1, 2)
    const ours = area('B4:C9')
    const moved = { ...at, row: 3 }
    const bars = [
      { column: 1, row: 2, rows: 1, full: 0.5 },
      { column: 1, row: 4, rows: 1, full: 1 },
    ]
    await book.write({ patches: [{ at: moved, table: barred({ bars }), over: 'blank', ours }] })
    expect(await barsOf(office, 'A1:F20')).toEqual([
      { ...mine, lies: 'Sheet1!B6:B7' },
      grey('Sheet1!C6', '0.5'),
      grey('Sheet1!C8'),
    ])
    await book.write({ patches: [{ at: moved, table: breakdown([1]), over: 'blank', ours }] })
    expect(await barsOf(office, 'A1:F20')).toEqual([{ ...mine, lies: 'Sheet1!B6:B7' }])
  })

  test('bars that stay as they are are left alone', async () => {
    const { book, office } = open()
    await book.write({ patches: [{ at, table: barred(), over: 'blank' }] })
    const idOf = () =>
      office.Excel.run(async (context) => {
        const { conditionalFormats } = context.workbook.worksheets.getItem('Sheet1').getRange('C4')
        conditionalFormats.load('items/id')
        await context.sync()
        return conditionalFormats.items.map(({ id }) => id)
      })
    const before = await idOf()
    await book.write({ patches: [{ at, table: barred(), over: 'blank', ours: area('B2:C7') }] })
    expect(before).toHaveLength(1)
    expect(await idOf()).toEqual(before)
  })

  test('a text stands in from the left by its indent, and a later table without one does not', async () => {
    const { book, office } = open()
    const indented = tableOf([[number(1), { ...text('a remark'), indent: 2 }]])
    const looks = () =>
      office.Excel.run(async (context) => {
        const { format } = context.workbook.worksheets.getItem('Sheet1').getRange('C2')
        format.load('indentLevel,horizontalAlignment')
        await context.sync()
        return [format.indentLevel, format.horizontalAlignment]
      })
    await book.write({ patches: [{ at, table: indented, over: 'blank' }] })
    expect(await looks()).toEqual([2, 'Left'])
    const plain = tableOf([[number(1), text('a remark')]])
    await book.write({ patches: [{ at, table: plain, over: 'blank', ours: area('B2:C2') }] })
    expect(await looks()).toEqual([0, 'General'])
  })
})

describe('The watch', () => {
  const watched = async () => {
    const opened = open()
    const events: WorkbookEvent[] = []
    const end = await opened.book.watch((event) => events.push(event))
    return { ...opened, events, end }
  }

  test('tells a user’s edits from the echo of our own writes', async () => {
    const { book, user, events, settle } = await watched()
    user.type('Sheet1', 'E5', [[1, 2]])
    await settle()
    expect(events).toEqual([{ kind: 'edited', sheet: 'Sheet1', area: area('E5:F5'), ours: false }])
    events.length = 0
    await book.write({ patches: [{ at, table: breakdown(), over: 'blank' }] })
    await settle()
    const edits = events.filter(({ kind }) => kind === 'edited')
    expect(edits.length).toBeGreaterThan(0)
    expect(edits.every((event) => event.kind === 'edited' && event.ours)).toBe(true)
  })

  test('tells them apart also where the host does not mark them, and counts each echo once', async () => {
    const opened = open()
    const supported = opened.office.Office.context.requirements.isSetSupported
    Object.assign(opened.office.Office.context.requirements, {
      isSetSupported: (set: string, version: string) => version !== '1.14' && supported(set, version),
    })
    const events: WorkbookEvent[] = []
    await opened.book.watch((event) => events.push(event))
    await opened.book.write({ patches: [{ at, table: breakdown(), over: 'blank' }] })
    await opened.settle()
    opened.user.type(
      'Sheet1',
      'B2',
      valuesOf(breakdown()).map((row) => row.map(() => 7)),
    )
    await opened.settle()
    const edits = events.flatMap((event) => (event.kind === 'edited' ? [event.ours] : []))
    expect(edits).toEqual([true, false])
  })

  test.each([
    ['at once where the host announces it', true],
    ['when the sheet is looked at next where it does not', false],
  ])('tells that a sheet has got another name, under the one it had: %s', async (_, announced) => {
    const opened = open()
    const { requirements } = opened.office.Office.context
    const supported = requirements.isSetSupported
    Object.assign(requirements, {
      isSetSupported: (set: string, version: string) =>
        version === '1.17' ? announced : supported(set, version),
    })
    const events: WorkbookEvent[] = []
    await opened.book.watch((event) => events.push(event))
    opened.user.renameSheet('Sheet1', 'Spring')
    await opened.settle()
    const moved = () => events.filter(({ kind }) => kind === 'moved')
    expect(moved()).toHaveLength(announced ? 1 : 0)
    await opened.book.look([{ at: { sheet: 'Spring', row: 0, column: 0, rows: 1, columns: 1 } }])
    expect(moved()).toEqual([{ kind: 'moved', sheet: 'Sheet1' }])
  })

  test('tells moves, recalculation, selections, new and removed sheets by the sheet’s name', async () => {
    const { user, events, office, settle } = await watched()
    user.type('Sheet1', 'A1', [[1, '=A1*2']])
    await settle()
    events.length = 0
    user.type('Sheet1', 'A1', 5)
    await settle()
    expect(events).toContainEqual({ kind: 'calculated', sheet: 'Sheet1' })
    user.insertRows('Sheet1', 1, 2)
    await settle()
    expect(events).toContainEqual({ kind: 'moved', sheet: 'Sheet1' })
    user.select('Sheet1', 'B2:C3')
    await settle()
    expect(events).toContainEqual({ kind: 'selected', area: area('B2:C3') })
    user.select('Sheet1', 'B2', 'C3')
    await settle()
    expect(events.at(-1)).toEqual({ kind: 'selected', area: null })
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.add('Later')
      await context.sync()
    })
    user.type('Later', 'A1', 1)
    await settle()
    await settle()
    expect(events).toContainEqual({
      kind: 'edited',
      sheet: 'Later',
      area: { ...area('A1'), sheet: 'Later' },
      ours: false,
    })
    user.deleteSheet('Later')
    await settle()
    expect(events).toContainEqual({ kind: 'sheet-removed', sheet: 'Later' })
  })

  test('says when a cell being edited keeps us waiting, and the work is done afterwards', async () => {
    const { book, office, events, cells } = await watched()
    office.editing = true
    const writing = book.write({ patches: [{ at, table: breakdown(), over: 'blank' }] })
    await new Promise((resolve) => setTimeout(resolve, 500))
    expect(events).toContainEqual({ kind: 'waiting', waiting: true })
    office.editing = false
    await writing
    expect(events.filter(({ kind }) => kind === 'waiting').at(-1)).toEqual({
      kind: 'waiting',
      waiting: false,
    })
    expect((await cells('Sheet1', 'B7:C7')).values).toEqual([['Total', 1]])
  })

  test('ends', async () => {
    const { user, events, end, settle } = await watched()
    await end()
    user.type('Sheet1', 'A1', 1)
    await settle()
    expect(events).toEqual([])
  })
})

describe('The rest', () => {
  test('the culture says how numbers and dates are typed', async () => {
    const { book } = open({
      culture: {
        name: 'de-DE',
        numberDecimalSeparator: ',',
        numberGroupSeparator: '.',
        dateSeparator: '.',
        shortDatePattern: 'dd.MM.yyyy',
      },
    })
    expect(await book.culture()).toEqual({ decimal: ',', group: '.', dateOrder: 'dmy' })
  })

  test('revealing an area selects it on its sheet; hidden sheets are not listed', async () => {
    const { book, office } = open()
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.add('Back').visibility = 'Hidden'
      context.workbook.worksheets.add('Front')
      await context.sync()
    })
    expect(await book.sheets()).toEqual(['Sheet1', 'Front'])
    await book.reveal({ ...area('B2:C3'), sheet: 'Front' })
    expect(addressOf(await book.selection())).toBe('Front!B2:C3')
    expect(await refusal(book.reveal({ ...area('B2'), sheet: 'Gone' }))).toMatchObject({ code: 'missing' })
  })

  test('recovering a workbook without an interrupted write does nothing', async () => {
    const { book, office } = open()
    expect(await book.recover()).toBeNull()
    expect(office.counts.writes).toBe(0)
  })

  test('a blank cell of a table leaves the cell blank', async () => {
    const { book, cells } = open()
    await book.write({ patches: [{ at, table: tableOf([[text('a'), blank]]), over: 'blank' }] })
    expect((await cells('Sheet1', 'B2:C2')).valueTypes).toEqual([['String', 'Empty']])
  })
})

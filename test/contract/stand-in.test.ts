/**
 * The stand-in keeps the host's behaviours, one test each. What the host does is told by its documentation (learn.microsoft.com,
 * Office Add-ins: the Excel object model, error handling, events, unbounded and special ranges, resource limits, and the reference of
 * each member; at second hand or from memory, not looked up again); error codes stand in `Excel.ErrorCodes` and `OfficeExtension.ErrorCodes` of @types/office-js. From memory alone: that a null object refuses writes, that an apostrophe is lost in a cell of text format too, that neighbours share a border,
 * what is undone in one step, and that a failed request delivers nothing. No test here ran against Excel itself.
 *
 * Numbers are entered by the tests themselves; nothing is rounded, so they are compared exactly.
 */
import { createOffice, levelOf, pageOf, userOf, type OfficeOptions } from '../../src/desk/office'
import { headlessGrid, type Grid } from '../../src/desk/grid'

const opened: { dispose(): void }[] = []

function desk(options?: OfficeOptions) {
  const grid = headlessGrid()
  opened.push(grid)
  const standIn = createOffice(grid, options)
  const { Excel } = standIn
  const user = userOf(grid)

  /** The cells of `address` as the API gives them, after whatever the batch did. */
  const read = (address: string, sheet = 'Sheet1') =>
    Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem(sheet).getRange(address)
      range.load('values,formulas,valueTypes,numberFormat,text')
      await context.sync()
      const { values, formulas, valueTypes, numberFormat, text } = range
      return { values, formulas, valueTypes, numberFormat, text } as Record<string, unknown[][]>
    })
  const write = (address: string, values: unknown, sheet = 'Sheet1') =>
    Excel.run(async (context) => {
      context.workbook.worksheets.getItem(sheet).getRange(address).values = values as never
      await context.sync()
    })
  return { ...standIn, standIn, grid, user, read, write }
}

afterEach(() => opened.splice(0).forEach((grid) => grid.dispose()))

/** The code of the error a promise is rejected with. */
const code = (promise: Promise<unknown>) =>
  promise.then(
    () => 'fulfilled',
    (error: unknown) => (error as { code?: string }).code ?? String(error),
  )

/** The sheet of a new workbook. */
const first = 'Sheet1'

/** How the page of a sheet is kept for the file. */
const pageIn = (grid: Grid, sheet: string) =>
  pageOf(grid.api.getActiveWorkbook()?.getSheetByName(sheet)?.getSheet().getConfig() ?? {})

describe('Requests', () => {
  test('operations wait for sync and then happen in order, reads among them', async () => {
    const { Excel, read } = desk()
    await Excel.run(async (context) => {
      const cell = context.workbook.worksheets.getItem(first).getRange('A1')
      cell.values = [[1]]
      cell.load('values')
      cell.values = [[2]]
      expect((await read('A1')).values).toEqual([['']])
      await context.sync()
      expect(cell.values).toEqual([[1]])
    })
    expect((await read('A1')).values).toEqual([[2]])
  })

  test('operations before a failing one stand and later ones do not run', async () => {
    const { Excel, read } = desk()
    const failed = Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      sheet.getRange('A1').values = [['before']]
      sheet.getRange('A2').values = [[1, 2]]
      sheet.getRange('A3').values = [['after']]
      await context.sync()
    })
    expect(await code(failed)).toBe('InvalidArgument')
    expect((await read('A1:A3')).values).toEqual([['before'], [''], ['']])
  })

  test('a rejected sync says at which member it failed', async () => {
    const { write } = desk()
    const error = await write('A1', [[1, 2]]).catch((thrown: unknown) => thrown)
    expect(error).toMatchObject({ code: 'InvalidArgument', debugInfo: { errorLocation: 'Range.values' } })
  })

  test('a property that was not loaded cannot be read, nor one loaded but not yet synced', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const cell = context.workbook.worksheets.getItem(first).getRange('A1')
      expect(() => cell.values).toThrow(expect.objectContaining({ code: 'PropertyNotLoaded' }))
      cell.load('values')
      expect(() => cell.values).toThrow(expect.objectContaining({ code: 'PropertyNotLoaded' }))
      await context.sync()
      expect(cell.values).toEqual([['']])
      expect(() => cell.text).toThrow(expect.objectContaining({ code: 'PropertyNotLoaded' }))
    })
  })

  test('a failed request delivers nothing of what it had read', async () => {
    const { Excel } = desk()
    const context = new Excel.RequestContext()
    const sheet = context.workbook.worksheets.getItem(first)
    sheet.load('name')
    context.workbook.worksheets.getItem('No such sheet')
    expect(await code(context.sync())).toBe('ItemNotFound')
    expect(() => sheet.name).toThrow(expect.objectContaining({ code: 'PropertyNotLoaded' }))
  })

  test('load takes text, lists and objects, with paths into parts and items', async () => {
    const { Excel, write } = desk()
    await write('B2', 3)
    await Excel.run(async (context) => {
      const cell = context.workbook.worksheets.getItem(first).getRange('B2')
      const sheets = context.workbook.worksheets
      cell.load('address, worksheet/name, format/fill/color')
      const again = context.workbook.worksheets.getItem(first).getRange('B2')
      again.load({ values: true, text: false, format: { font: { bold: true } } })
      const listed = context.workbook.worksheets.getItem(first).getRange('B2')
      listed.load(['rowIndex', 'columnIndex'])
      sheets.load('items/name')
      await context.sync()
      expect([cell.address, cell.worksheet.name, cell.format.fill.color]).toEqual([
        'Sheet1!B2',
        'Sheet1',
        '#FFFFFF',
      ])
      expect([again.values, again.format.font.bold]).toEqual([[[3]], false])
      expect(() => again.text).toThrow(expect.objectContaining({ code: 'PropertyNotLoaded' }))
      expect([listed.rowIndex, listed.columnIndex]).toEqual([1, 1])
      expect(sheets.items.map((sheet) => sheet.name)).toEqual(['Sheet1'])
    })
  })

  test('loading a property that does not exist is refused at sync', async () => {
    const { Excel } = desk()
    const failed = Excel.run(async (context) => {
      context.workbook.worksheets.getItem(first).getRange('A1').load('valeus')
      await context.sync()
    })
    expect(await code(failed)).toBe('InvalidArgument')
  })

  test('a member the stand-in lacks fails loudly, whether read, called or set', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const cell = context.workbook.worksheets.getItem(first).getRange('A1') as unknown as Record<
        string,
        unknown
      >
      expect(() => cell['dataValidation']).toThrow(/no Range.dataValidation/)
      expect(() => (cell['showCard'] as () => void)()).toThrow(/no Range.showCard/)
      expect(() => (cell['style'] = 'Normal')).toThrow(/no Range.style/)
      await context.sync()
    })
  })

  test('a missing item is found out at sync, not before', async () => {
    const { Excel } = desk()
    const context = new Excel.RequestContext()
    context.workbook.worksheets.getItem('Nowhere').getRange('A1').values = [[1]]
    expect(await code(context.sync())).toBe('ItemNotFound')
  })

  test('an object that may be missing is never null and says after sync whether it is', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const missing = context.workbook.worksheets.getItemOrNullObject('Nowhere')
      const there = context.workbook.worksheets.getItemOrNullObject(first)
      const under = missing.getRange('A1').worksheet
      missing.load('name')
      under.load('name')
      expect(missing).not.toBeNull()
      expect(() => missing.isNullObject).toThrow(expect.objectContaining({ code: 'PropertyNotLoaded' }))
      await context.sync()
      expect([missing.isNullObject, there.isNullObject, under.isNullObject]).toEqual([true, false, true])
      expect(missing.name).toBeUndefined()
    })
  })

  test('a null object cannot be written to', async () => {
    const { Excel } = desk()
    const context = new Excel.RequestContext()
    context.workbook.worksheets.getItemOrNullObject('Nowhere').getRange('A1').values = [[1]]
    expect(await code(context.sync())).toBe('ItemNotFound')
  })

  test('an object of one context is refused by another', async () => {
    const { Excel } = desk()
    const one = new Excel.RequestContext()
    const two = new Excel.RequestContext()
    const cell = one.workbook.worksheets.getItem(first).getRange('A1')
    expect(() => two.workbook.worksheets.getItem(first).getRange('A1').getBoundingRect(cell)).toThrow(
      expect.objectContaining({ code: 'InvalidRequestContext' }),
    )
    expect(() => two.load(cell, 'values')).toThrow(expect.objectContaining({ code: 'InvalidRequestContext' }))
  })

  test('a range cannot be used after its batch unless it was tracked', async () => {
    const { Excel } = desk()
    const kept = await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      const [loose, tracked] = [sheet.getRange('A1'), sheet.getRange('B2')]
      context.trackedObjects.add(tracked)
      await context.sync()
      return { loose, tracked }
    })
    kept.loose.load('values')
    expect(await code(kept.loose.context.sync())).toBe('InvalidObjectPath')
    kept.tracked.load('address')
    await kept.tracked.context.sync()
    expect(kept.tracked.address).toBe('Sheet1!B2')
  })

  test('a range that was let go cannot be used after the next sync', async () => {
    const { Excel } = desk()
    const failed = Excel.run(async (context) => {
      const cell = context.workbook.worksheets.getItem(first).getRange('A1').untrack()
      await context.sync()
      cell.load('values')
      await context.sync()
    })
    expect(await code(failed)).toBe('InvalidObjectPath')
  })

  test('run sends what is left in the queue and answers with what the batch answers', async () => {
    const { Excel, read } = desk()
    const answer = await Excel.run((context) => {
      context.workbook.worksheets.getItem(first).getRange('A1').values = [[5]]
      return Promise.resolve('done')
    })
    expect(answer).toBe('done')
    expect((await read('A1')).values).toEqual([[5]])
  })

  test('a batch that returns no promise is refused', async () => {
    const { Excel } = desk()
    expect(await code(Excel.run((() => undefined) as never))).toBe('InvalidOperation')
  })

  test('run goes on with the context of an object given to it', async () => {
    const { Excel } = desk()
    const sheet = await Excel.run(async (context) => {
      const found = context.workbook.worksheets.getItem(first)
      await context.sync()
      return found
    })
    await Excel.run(sheet, async (context) => {
      expect(context).toBe(sheet.context)
      sheet.load('name')
      await context.sync()
      expect(sheet.name).toBe(first)
    })
  })

  test('a method that answers with a value has it after the sync', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const count = context.workbook.worksheets.getCount()
      expect(() => count.value).toThrow(expect.objectContaining({ code: 'PropertyNotLoaded' }))
      await context.sync()
      expect(count.value).toBe(1)
    })
  })

  test('requests are served one after the other, whatever contexts they come from', async () => {
    const { Excel, read } = desk()
    const [one, two] = [new Excel.RequestContext(), new Excel.RequestContext()]
    one.workbook.worksheets.getItem(first).getRange('A1').formulas = [['=1+1']]
    two.workbook.worksheets.getItem(first).getRange('A1').values = [['second']]
    await Promise.all([one.sync(), two.sync()])
    expect((await read('A1')).values).toEqual([['second']])
  })
})

describe('Sizes', () => {
  test('a request above the limit is refused whole', async () => {
    const { write, read } = desk({ payloadLimit: 1000 })
    expect(await code(write('A1:A2', [['x'.repeat(600)], ['y'.repeat(600)]]))).toBe(
      'RequestPayloadSizeLimitExceeded',
    )
    expect((await read('A1:A2')).values).toEqual([[''], ['']])
  })

  test('an answer above the limit is refused, though the request was carried out', async () => {
    const { Excel, write, read } = desk({ payloadLimit: 1000 })
    await write('A1', 'x'.repeat(600))
    await write('A2', 'y'.repeat(600))
    const failed = Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      sheet.getRange('B1').values = [['stands']]
      sheet.getRange('A1:A2').load('values')
      await context.sync()
    })
    expect(await code(failed)).toBe('ResponsePayloadSizeLimitExceeded')
    expect((await read('B1')).values).toEqual([['stands']])
  })

  test('the limit is 5 MB unless said otherwise', async () => {
    const { write } = desk()
    expect(await code(write('A1', 'x'.repeat(5 * 1024 * 1024)))).toBe('RequestPayloadSizeLimitExceeded')
  })

  test('more than five million cells cannot be read at once', async () => {
    const { Excel } = desk()
    const failed = Excel.run(async (context) => {
      context.workbook.worksheets.getItem(first).getRangeByIndexes(0, 0, 1_000_000, 6).load('values')
      await context.sync()
    })
    expect(await code(failed)).toBe('RangeExceedsLimit')
  })

  test('a block of 252 x 500 numbers is written in parts and read back to the last digit', async () => {
    const { Excel } = desk()
    const [rows, columns, part] = [252, 500, 126]
    const number = (row: number, column: number) => (row * columns + column) / 7
    const block = (from: number) =>
      Array.from({ length: part }, (_, row) =>
        Array.from({ length: columns }, (__, column) => number(from + row, column)),
      )
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      for (let row = 0; row < rows; row += part) {
        sheet.getRangeByIndexes(row, 0, part, columns).values = block(row)
        await context.sync()
      }
      const last = sheet.getRangeByIndexes(rows - part, 0, part, columns)
      last.load('values')
      await context.sync()
      expect(last.values).toEqual(block(rows - part))
    })
  }, 60_000)
})

describe('Values', () => {
  test('values have two dimensions, blanks are empty text and kinds are told apart', async () => {
    const { write, read } = desk()
    await write('A1:E1', [[0.1 + 0.2, 'text', true, '#N/A', '']])
    const { values, valueTypes } = await read('A1:E1')
    expect(values).toEqual([[0.30000000000000004, 'text', true, '#N/A', '']])
    expect(valueTypes).toEqual([['Double', 'String', 'Boolean', 'Error', 'Empty']])
  })

  test('numbers keep every digit', async () => {
    const { write, read } = desk()
    const numbers = [1 / 3, 5e-324, 1.7976931348623157e308, 123456789.12345679]
    await write('A1:D1', [numbers])
    expect((await read('A1:D1')).values).toEqual([numbers])
  })

  test('an error of a formula is its text', async () => {
    const { write, read } = desk()
    await write('A1:B1', [['=1/0', '=NA()']])
    const { values, valueTypes } = await read('A1:B1')
    expect(values).toEqual([['#DIV/0!', '#N/A']])
    expect(valueTypes).toEqual([['Error', 'Error']])
  })

  test('dates are serial numbers and percents fractions', async () => {
    const { user, standIn, read } = desk()
    user.type(first, 'A1', '2024-01-05')
    user.type(first, 'B1', '12.5%')
    await standIn.settled()
    const { values, text, numberFormat } = await read('A1:B1')
    // 2024-01-05 is day 45296 of the 1900 date system (ECMA-376 part 1, 18.17.4.1; counted by hand).
    expect(values).toEqual([[45296, 0.125]])
    expect(numberFormat).toEqual([['yyyy-mm-dd', '0.00%']])
    expect(text).toEqual([['2024-01-05', '12.50%']])
  })

  test('text that reads as a number, a percent or a truth value is entered as such', async () => {
    const { write, read } = desk()
    await write('A1:D1', [['42', '5%', 'TRUE', ' 7 ']])
    const { values, numberFormat } = await read('A1:D1')
    expect(values).toEqual([[42, 0.05, true, 7]])
    expect(numberFormat?.[0]?.[1]).toBe('0%')
  })

  test('the shape of what is written must be the shape of the range', async () => {
    const { write } = desk()
    expect(await code(write('A1:B2', [[1, 2]]))).toBe('InvalidArgument')
    expect(await code(write('A1:B2', [[1, 2], [3]]))).toBe('InvalidArgument')
    expect(await code(write('A1:B2', [1, 2]))).toBe('InvalidArgument')
  })

  test('one value fills the range, and null leaves a cell as it is', async () => {
    const { write, read } = desk()
    await write('A1:B2', 7)
    await write('A1:B2', [
      [null, 1],
      ['', null],
    ])
    expect((await read('A1:B2')).values).toEqual([
      [7, 1],
      ['', 7],
    ])
  })

  test('what is no cell value is refused', async () => {
    const { write } = desk()
    for (const value of [NaN, Infinity, new Date(0), {}, undefined])
      expect(await code(write('A1', [[value]]))).toBe('InvalidArgument')
  })

  test('text that begins with = + - or @ becomes a formula', async () => {
    const { write, read } = desk()
    await write('A1:D1', [['=1+1', '+2*3', '-2*3', '@name']])
    const { values, formulas } = await read('A1:D1')
    expect(formulas).toEqual([['=1+1', '=2*3', '=-2*3', '=@name']])
    expect(values).toEqual([[2, 6, -6, '#NAME?']])
  })

  test('in a cell of text format such text stays text, and numbers become text', async () => {
    const { Excel, read } = desk()
    await Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem(first).getRange('A1:F1')
      range.numberFormat = [['@', '@', '@', '@', '@', '@']]
      range.values = [['=1+1', '@name', '-5', 42, true, '']]
      await context.sync()
    })
    const { values, formulas, valueTypes } = await read('A1:F1')
    expect(values).toEqual([['=1+1', '@name', '-5', '42', 'TRUE', '']])
    expect(formulas).toEqual(values)
    expect(valueTypes).toEqual([['String', 'String', 'String', 'String', 'String', 'Empty']])
  })

  test('a leading apostrophe makes text and reads back lost', async () => {
    const { write, read } = desk()
    await write('A1:C1', [["'=1+1", "'42", "'#N/A"]])
    const { values, valueTypes } = await read('A1:C1')
    expect(values).toEqual([['=1+1', '42', '#N/A']])
    expect(valueTypes).toEqual([['String', 'String', 'String']])
  })

  test('text that looks like a number stays text when the look of its cell is changed', async () => {
    const { Excel, write, read } = desk()
    await write('A1:B1', [["'42", "'TRUE"]])
    await Excel.run(async (context) => {
      context.workbook.worksheets.getItem(first).getRange('A1:B1').format.font.bold = true
      await context.sync()
    })
    expect((await read('A1:B1')).values).toEqual([['42', 'TRUE']])
  })

  test('formulas are worked out before sync resolves, and before a read in the same request', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      sheet.getRange('A1:A2').values = [[1], [2]]
      sheet.getRange('A3').formulas = [['=SUM(A1:A2)']]
      const sum = sheet.getRange('A3').load('values')
      await context.sync()
      expect(sum.values).toEqual([[3]])
      sheet.getRange('A1').values = [[10]]
      const later = sheet.getRange('A3').load('values,formulas')
      await context.sync()
      expect([later.values, later.formulas]).toEqual([[[12]], [['=SUM(A1:A2)']]])
    })
  })

  test('spilled cells have values, and the range says where they spill from and to', async () => {
    const { Excel, write } = desk()
    await write('A1:A3', [[1], [2], [3]])
    await write('C1', '=A1:A3*2')
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      const range = sheet.getRange('C1:C4').load('values,hasSpill')
      const anchor = sheet.getRange('C1').load('hasSpill')
      const to = anchor.getSpillingToRangeOrNullObject().load('address')
      const from = sheet.getRange('C3').getSpillParentOrNullObject().load('address')
      const none = sheet.getRange('A1').getSpillingToRangeOrNullObject().load('address')
      const used = sheet.getUsedRange(true).load('address')
      await context.sync()
      expect(range.values).toEqual([[2], [4], [6], ['']])
      expect([range.hasSpill, anchor.hasSpill]).toEqual([null, true])
      expect([to.address, from.address, none.isNullObject]).toEqual(['Sheet1!C1:C3', 'Sheet1!C1', true])
      expect(used.address).toBe('Sheet1!A1:C3')
    })
  })

  test('a blocked spill shows its error and leaves the blocking cell alone', async () => {
    const { write, read } = desk()
    await write('A1:A2', [[1], [2]])
    await write('B2', 'in the way')
    await write('B1', '=A1:A2*2')
    expect((await read('B1:B2')).values).toEqual([['#SPILL!'], ['in the way']])
  })

  test('whole columns and rows have no values to read and take none', async () => {
    const { Excel, write } = desk()
    await write('A1', 1)
    await Excel.run(async (context) => {
      const column = context.workbook.worksheets.getItem(first).getRange('A:B')
      column.load('values,formulas,text,numberFormat,address,rowCount,columnCount,cellCount,isEntireColumn')
      await context.sync()
      expect([column.values, column.formulas, column.text, column.numberFormat]).toEqual([
        null,
        null,
        null,
        null,
      ])
      expect([column.address, column.rowCount, column.columnCount]).toEqual(['Sheet1!A:B', 1_048_576, 2])
      expect([column.cellCount, column.isEntireColumn]).toEqual([2_097_152, true])
    })
    expect(await code(write('A:A', 1))).toBe('InvalidArgument')
  })

  test('of a merged area only the top-left cell counts', async () => {
    const { Excel, write, read } = desk()
    await write('A1:B2', [
      [1, 2],
      [3, 4],
    ])
    await Excel.run(async (context) => {
      context.workbook.worksheets.getItem(first).getRange('A1:B2').merge()
      await context.sync()
      context.workbook.worksheets.getItem(first).getRange('A1:B3').values = [
        [5, 6],
        [7, 8],
        [9, 10],
      ]
      const areas = context.workbook.worksheets.getItem(first).getRange('B2:D5').getMergedAreasOrNullObject()
      const none = context.workbook.worksheets.getItem(first).getRange('D5').getMergedAreasOrNullObject()
      areas.load('address,areaCount')
      none.load('address')
      await context.sync()
      expect([areas.address, areas.areaCount, none.isNullObject]).toEqual(['Sheet1!A1:B2', 1, true])
    })
    expect((await read('A1:B3')).values).toEqual([
      [5, ''],
      ['', ''],
      [9, 10],
    ])
  })

  test('a write beyond what the grid has stored enlarges it', async () => {
    const { write, read } = desk()
    await write('BZ5000', 'far')
    expect((await read('BZ5000')).values).toEqual([['far']])
  })

  test('cells that were never touched read as blanks of general format', async () => {
    const { read } = desk()
    const { values, numberFormat, text } = await read('XFD1048576')
    expect([values, numberFormat, text]).toEqual([[['']], [['General']], [['']]])
  })
})

describe('Ranges', () => {
  /** The address each way of going from B2:C3 leads to. */
  const ways: [string, (range: Excel.Range) => Excel.Range, string][] = [
    ['getCell', (range) => range.getCell(1, 1), 'C3'],
    ['getCell outside the range', (range) => range.getCell(2, 2), 'D4'],
    ['getRow', (range) => range.getRow(1), 'B3:C3'],
    ['getColumn', (range) => range.getColumn(0), 'B2:B3'],
    ['getLastCell', (range) => range.getLastCell(), 'C3'],
    ['getLastRow', (range) => range.getLastRow(), 'B3:C3'],
    ['getLastColumn', (range) => range.getLastColumn(), 'C2:C3'],
    ['getResizedRange', (range) => range.getResizedRange(1, -1), 'B2:B4'],
    ['getAbsoluteResizedRange', (range) => range.getAbsoluteResizedRange(3, 1), 'B2:B4'],
    ['getOffsetRange', (range) => range.getOffsetRange(-1, 2), 'D1:E2'],
    ['getRowsAbove', (range) => range.getRowsAbove(1), 'B1:C1'],
    ['getRowsBelow', (range) => range.getRowsBelow(2), 'B4:C5'],
    ['getColumnsBefore', (range) => range.getColumnsBefore(1), 'A2:A3'],
    ['getColumnsAfter', (range) => range.getColumnsAfter(2), 'D2:E3'],
    ['getEntireColumn', (range) => range.getEntireColumn(), 'B:C'],
    ['getEntireRow', (range) => range.getEntireRow(), '2:3'],
    ['getIntersection', (range) => range.getIntersection('C3:F9'), 'C3'],
    ['getBoundingRect', (range) => range.getBoundingRect('F9'), 'B2:F9'],
  ]
  test.each(ways)('%s finds its cells', async (_, go, address) => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const found = go(context.workbook.worksheets.getItem(first).getRange('B2:C3')).load('address')
      await context.sync()
      expect(found.address).toBe(`Sheet1!${address}`)
    })
  })

  test('going off the sheet is refused', async () => {
    const { Excel } = desk()
    const failed = Excel.run(async (context) => {
      context.workbook.worksheets.getItem(first).getRange('A1').getOffsetRange(-1, 0)
      await context.sync()
    })
    expect(await code(failed)).toBe('InvalidArgument')
  })

  test.each(['A', 'A0', 'Other!A1', 'A1,B2', 'XFE1', 'A1:B2:C3', 'no such name', ''])(
    '"%s" is no address',
    async (address) => {
      const { Excel } = desk()
      const failed = Excel.run(async (context) => {
        context.workbook.worksheets.getItem(first).getRange(address)
        await context.sync()
      })
      expect(await code(failed)).toBe('InvalidArgument')
    },
  )

  test('a sheet whose name needs quotes has them in its addresses', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const made = ["My book's", 'A1', '2024', 'Book'].map((name) => context.workbook.worksheets.add(name))
      const ranges = made.map((sheet) => sheet.getRange('A1').load('address'))
      await context.sync()
      expect(ranges.map((range) => range.address)).toEqual([
        "'My book''s'!A1",
        "'A1'!A1",
        "'2024'!A1",
        'Book!A1',
      ])
    })
  })

  test('two ranges that do not meet have no intersection', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      const none = sheet.getRange('A1').getIntersectionOrNullObject('B2')
      none.load('address')
      await context.sync()
      expect(none.isNullObject).toBe(true)
      sheet.getRange('A1').getIntersection('B2')
      expect(await code(context.sync())).toBe('ItemNotFound')
    })
  })

  test('the used range holds values, and formats too unless only values are asked for', async () => {
    const { Excel, write } = desk()
    await write('B2', 1)
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      sheet.getRange('D4').format.fill.color = '#FFCC00'
      const all = sheet.getUsedRange().load('address')
      const values = sheet.getUsedRange(true).load('address')
      const none = sheet.getRange('F6:G7').getUsedRangeOrNullObject()
      const blank = context.workbook.worksheets.add('Blank').getUsedRange().load('address')
      const nothing = context.workbook.worksheets.getItem('Blank').getUsedRangeOrNullObject()
      none.load('address')
      nothing.load('address')
      await context.sync()
      expect([all.address, values.address, blank.address]).toEqual(['Sheet1!B2:D4', 'Sheet1!B2', 'Blank!A1'])
      expect([none.isNullObject, nothing.isNullObject]).toEqual([true, true])
    })
  })

  test('the surrounding region ends at blank rows and columns', async () => {
    const { Excel, write } = desk()
    await write('B2:C3', 1)
    await write('D4', 1)
    await write('F2', 1)
    await Excel.run(async (context) => {
      const region = context.workbook.worksheets
        .getItem(first)
        .getRange('B2')
        .getSurroundingRegion()
        .load('address')
      await context.sync()
      expect(region.address).toBe('Sheet1!B2:D4')
    })
  })

  test('the visible view leaves hidden rows out', async () => {
    const { Excel, user, write } = desk()
    await write('A1:A4', [[1], [2], [3], [4]])
    user.hideRows(first, 2, 2)
    await Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem(first).getRange('A1:A4')
      const view = range.getVisibleView()
      range.load('rowHidden,values')
      view.load('values,rowCount,cellAddresses')
      const hidden = context.workbook.worksheets.getItem(first).getRange('A2:A3').load('rowHidden')
      await context.sync()
      expect([view.values, view.rowCount]).toEqual([[[1], [4]], 2])
      expect(view.cellAddresses).toEqual([['Sheet1!A1'], ['Sheet1!A4']])
      expect([range.rowHidden, hidden.rowHidden]).toEqual([null, true])
      expect(range.values).toEqual([[1], [2], [3], [4]])
    })
  })

  test('a format shared by all cells is told, a mixed one is null', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      const { format } = sheet.getRange('A1:B1')
      format.font.bold = true
      format.fill.color = '#ffcc00'
      format.horizontalAlignment = 'Right'
      format.wrapText = true
      format.columnWidth = 90
      sheet.getRange('A1').format.font.italic = true
      sheet.getRange('A1').format.font.color = 'red'
      const read = sheet.getRange('A1:B1')
      read.load('format/font/bold,format/font/italic,format/font/color,format/fill/color')
      read.load('format/horizontalAlignment,format/wrapText,format/columnWidth')
      await context.sync()
      expect([read.format.font.bold, read.format.font.italic, read.format.font.color]).toEqual([
        true,
        null,
        null,
      ])
      expect([read.format.fill.color, read.format.horizontalAlignment]).toEqual(['#FFCC00', 'Right'])
      expect([read.format.wrapText, read.format.columnWidth]).toEqual([true, 90])
    })
  })

  test('neighbours share the line between them', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      const edge = (address: string, at: 'EdgeTop' | 'EdgeBottom' | 'InsideHorizontal') =>
        sheet.getRange(address).format.borders.getItem(at)
      edge('A1:C1', 'EdgeBottom').style = 'Continuous'
      const [below, mixed, inside] = [
        edge('A2:C2', 'EdgeTop'),
        edge('A2:D2', 'EdgeTop'),
        edge('A1:C2', 'InsideHorizontal'),
      ]
      for (const border of [below, mixed, inside]) border.load('style,weight')
      await context.sync()
      expect([below.style, below.weight, mixed.style, inside.style]).toEqual([
        'Continuous',
        'Thin',
        null,
        'Continuous',
      ])
      edge('A2:C2', 'EdgeTop').style = 'None'
      const above = edge('A1:C1', 'EdgeBottom').load('style')
      await context.sync()
      expect(above.style).toBe('None')
    })
  })

  test('rows and columns have sizes, and columns fit their text', async () => {
    const { Excel, write } = desk()
    await write('A1:B1', [['a text of some length', 'x']])
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      sheet.getRange('2:3').format.rowHeight = 30
      sheet.getRange('A:B').format.autofitColumns()
      const [long, short] = [sheet.getRange('A1').format, sheet.getRange('B1').format]
      const [tall, mixed] = [sheet.getRange('A2:A3').format, sheet.getRange('A1:A2').format]
      for (const format of [long, short]) format.load('columnWidth')
      for (const format of [tall, mixed]) format.load('rowHeight')
      await context.sync()
      expect(long.columnWidth).toBeGreaterThan(short.columnWidth)
      expect([tall.rowHeight, mixed.rowHeight]).toEqual([30, null])
    })
  })

  test('rows can be hidden and shown, and merged cells parted', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      const rows = sheet.getRange('2:3')
      rows.rowHidden = true
      rows.load('rowHidden')
      sheet.getRange('A1:B2').merge()
      sheet.getRange('A1:B2').unmerge()
      const merged = sheet.getRange('A1:B2').getMergedAreasOrNullObject()
      merged.load('address')
      await context.sync()
      expect([rows.rowHidden, merged.isNullObject]).toEqual([true, true])
      rows.rowHidden = false
      rows.load('rowHidden')
      await context.sync()
      expect(rows.rowHidden).toBe(false)
    })
  })

  test('clear takes away contents, formats or both', async () => {
    const { Excel, read } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      sheet.getRange('A1:A3').values = [[1], [2], [3]]
      sheet.getRange('A1:A3').numberFormat = [['0.0'], ['0.0'], ['0.0']]
      sheet.getRange('A1').clear('Contents')
      sheet.getRange('A2').clear('Formats')
      sheet.getRange('A3').clear()
      await context.sync()
    })
    const { values, numberFormat } = await read('A1:A3')
    expect(values).toEqual([[''], [2], ['']])
    expect(numberFormat).toEqual([['0.0'], ['General'], ['General']])
  })

  test('inserted and deleted cells push formulas along', async () => {
    const { Excel, write, read } = desk()
    await write('A1:A2', [[1], [2]])
    await write('C5', '=SUM(A1:A2)')
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      const made = sheet.getRange('2:2').insert('Down').load('address')
      await context.sync()
      expect(made.address).toBe('Sheet1!2:2')
      sheet.getRange('A2').values = [[10]]
      await context.sync()
    })
    expect((await read('C6')).formulas).toEqual([['=SUM(A1:A3)']])
    expect((await read('C6')).values).toEqual([[13]])
    await Excel.run(async (context) => {
      context.workbook.worksheets.getItem(first).getRange('1:1').delete('Up')
      await context.sync()
    })
    expect((await read('C5')).values).toEqual([[12]])
  })

  test('a range held in a batch follows its cells when rows come and go', async () => {
    const { Excel, user, write } = desk()
    await write('A5:A6', [['here'], ['too']])
    await Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem(first).getRange('A5:A6')
      await context.sync()
      user.insertRows(first, 1, 2)
      range.load('address,values')
      await context.sync()
      expect([range.address, range.values]).toEqual(['Sheet1!A7:A8', [['here'], ['too']]])
      user.insertRows(first, 8, 1)
      user.deleteRows(first, 7, 1)
      range.load('address,values')
      await context.sync()
      expect([range.address, range.values]).toEqual(['Sheet1!A7:A8', [[''], ['too']]])
      user.deleteRows(first, 6, 5)
      range.load('address')
      expect(await code(context.sync())).toBe('InvalidObjectPath')
    })
  })
})

describe('Selection', () => {
  test('the selected range is the one block selected', async () => {
    const { Excel, user } = desk()
    user.select(first, 'B2:C5')
    await Excel.run(async (context) => {
      const range = context.workbook.getSelectedRange().load('address')
      await context.sync()
      expect(range.address).toBe('Sheet1!B2:C5')
    })
  })

  test('with several areas selected the single range is refused and the areas are given', async () => {
    const { Excel, user } = desk()
    user.select(first, 'B2:C5', 'E1')
    await Excel.run(async (context) => {
      const areas = context.workbook.getSelectedRanges()
      areas.load('address,areaCount,areas/items/address')
      await context.sync()
      expect([areas.address, areas.areaCount]).toEqual(['Sheet1!B2:C5,Sheet1!E1', 2])
      expect(areas.areas.items.map((area) => area.address)).toEqual(['Sheet1!B2:C5', 'Sheet1!E1'])
      context.workbook.getSelectedRange()
      expect(await code(context.sync())).toBe('InvalidSelection')
    })
  })

  test('a whole column selected is a whole column', async () => {
    const { Excel, user } = desk()
    user.select(first, 'C:D')
    await Excel.run(async (context) => {
      const range = context.workbook.getSelectedRange().load('address,isEntireColumn')
      await context.sync()
      expect([range.address, range.isEntireColumn]).toEqual(['Sheet1!C:D', true])
    })
  })

  test('select moves the selection and its sheet to the front', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      context.workbook.worksheets.add('Other').getRange('B3').select()
      const range = context.workbook.getSelectedRange().load('address')
      await context.sync()
      expect(range.address).toBe('Other!B3')
    })
  })
})

describe('Cell editing', () => {
  test('while a cell is edited a request is refused', async () => {
    const { standIn, write, read } = desk()
    standIn.editing = true
    expect(await code(write('A1', 1))).toBe('InvalidOperationInCellEditMode')
    standIn.editing = false
    expect((await read('A1')).values).toEqual([['']])
  })

  test('a batch that says so waits until the edit is over', async () => {
    const { Excel, standIn, read } = desk()
    standIn.editing = true
    let done = false
    const waiting = Excel.run({ delayForCellEdit: true }, async (context) => {
      context.workbook.worksheets.getItem(first).getRange('A1').values = [['waited']]
      await context.sync()
      done = true
    })
    await new Promise((resolve) => setTimeout(resolve, 50))
    expect(done).toBe(false)
    standIn.editing = false
    await waiting
    expect((await read('A1')).values).toEqual([['waited']])
  })
})

describe('Protection', () => {
  test('a protected sheet refuses writes of values, formats and structure', async () => {
    const { Excel, standIn, write, read } = desk()
    await write('A1', 'kept')
    standIn.protect(first, true)
    const tries: ((sheet: Excel.Worksheet) => void)[] = [
      (sheet) => (sheet.getRange('A1').values = [['lost']]),
      (sheet) => (sheet.getRange('A1').format.font.bold = true),
      (sheet) => sheet.getRange('A1').clear(),
      (sheet) => void sheet.getRange('1:1').insert('Down'),
      (sheet) => sheet.getRange('1:1').delete('Up'),
      (sheet) => sheet.getRange('A1:B1').merge(),
    ]
    for (const attempt of tries) {
      const failed = Excel.run(async (context) => {
        attempt(context.workbook.worksheets.getItem(first))
        await context.sync()
      })
      expect(await code(failed)).toBe('AccessDenied')
    }
    expect((await read('A1')).values).toEqual([['kept']])
  })

  test('protection can be read, set and taken off', async () => {
    const { Excel, write } = desk()
    await Excel.run(async (context) => {
      const { protection } = context.workbook.worksheets.getItem(first)
      protection.protect()
      protection.load('protected')
      await context.sync()
      expect(protection.protected).toBe(true)
      expect(await code(write('A1', 1))).toBe('AccessDenied')
      protection.unprotect()
      await context.sync()
    })
    await write('A1', 1)
  })
})

describe('Sheets', () => {
  test('sheets are found by name in any case and by id', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem('sheet1').load('id,name')
      await context.sync()
      const again = context.workbook.worksheets.getItem(sheet.id).load('name')
      await context.sync()
      expect([sheet.name, again.name]).toEqual([first, first])
    })
  })

  test('an added sheet stands last and does not come to the front', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const { worksheets } = context.workbook
      worksheets.add('Report')
      worksheets.add()
      const active = worksheets.getActiveWorksheet().load('name')
      worksheets.load('items/name,items/position,items/visibility')
      await context.sync()
      expect(worksheets.items.map(({ name, position }) => [name, position])).toEqual([
        ['Sheet1', 0],
        ['Report', 1],
        ['Sheet2', 2],
      ])
      expect(active.name).toBe(first)
    })
  })

  test('a name in use and a name no sheet can have are refused', async () => {
    const { Excel } = desk()
    const add = (name: string) =>
      Excel.run(async (context) => {
        context.workbook.worksheets.add(name)
        await context.sync()
      })
    expect(await code(add('SHEET1'))).toBe('ItemAlreadyExists')
    expect(await code(add('a/b'))).toBe('InvalidArgument')
    expect(await code(add('x'.repeat(32)))).toBe('InvalidArgument')
  })

  test('a sheet can be hidden so that only code shows it, but not the last visible one', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const { worksheets } = context.workbook
      const store = worksheets.add('Store')
      store.visibility = 'VeryHidden'
      store.load('visibility')
      const visible = worksheets.getCount(true)
      await context.sync()
      expect([store.visibility, visible.value]).toEqual(['VeryHidden', 1])
      worksheets.getItem(first).visibility = 'Hidden'
      expect(await code(context.sync())).toBe('InvalidOperation')
      store.visibility = 'Visible'
      store.load('visibility')
      await context.sync()
      expect(store.visibility).toBe('Visible')
    })
  })

  test('a sheet has a place, a colour, gridlines and frozen panes', async () => {
    const { Excel, grid } = desk()
    await Excel.run(async (context) => {
      const { worksheets } = context.workbook
      const sheet = worksheets.add('Front')
      sheet.position = 0
      sheet.tabColor = '#112233'
      sheet.showGridlines = false
      sheet.freezePanes.freezeRows(2)
      sheet.activate()
      sheet.load('position,tabColor,showGridlines')
      const active = worksheets.getActiveWorksheet().load('name')
      const [firstOf, lastOf] = [worksheets.getFirst().load('name'), worksheets.getLast().load('name')]
      await context.sync()
      expect([sheet.position, sheet.tabColor, sheet.showGridlines]).toEqual([0, '#112233', false])
      expect([active.name, firstOf.name, lastOf.name]).toEqual(['Front', 'Front', first])
    })
    expect(grid.api.getActiveWorkbook()?.getSheetByName('Front')?.getFreeze().ySplit).toBe(2)
  })

  /** Excel.PageLayout, Excel.HeaderFooter */
  test('the page is kept for the file, what is set of it and nothing else', async () => {
    const { Excel, grid } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      const { pageLayout } = sheet
      pageLayout.orientation = 'Landscape'
      pageLayout.paperSize = 'Letter'
      pageLayout.zoom = { horizontalFitToPages: 1 }
      pageLayout.topMargin = 36
      pageLayout.setPrintArea('A1:D20')
      pageLayout.setPrintTitleRows(sheet.getRange('1:2'))
      pageLayout.headersFooters.defaultForAllPages.centerFooter = 'an estimate'
      pageLayout.load('orientation,zoom,bottomMargin')
      const area = pageLayout.getPrintArea().load('address')
      const rows = pageLayout.getPrintTitleRowsOrNullObject()
      const columns = pageLayout.getPrintTitleColumnsOrNullObject()
      rows.load('address')
      columns.load('address')
      await context.sync()
      expect(pageLayout.orientation).toBe('Landscape')
      expect(pageLayout.zoom).toEqual({ scale: null, horizontalFitToPages: 1, verticalFitToPages: null })
      // from memory
      expect(pageLayout.bottomMargin).toBe(54)
      expect([area.address, rows.address, columns.isNullObject]).toEqual([
        'Sheet1!A1:D20',
        'Sheet1!1:2',
        true,
      ])
    })
    expect(pageIn(grid, first)).toEqual({
      orientation: 'Landscape',
      paper: 'Letter',
      zoom: { scale: null, horizontalFitToPages: 1, verticalFitToPages: null },
      margins: { top: 36 },
      printArea: '$A$1:$D$20',
      titleRows: '$1:$2',
      texts: { centerFooter: 'an estimate' },
    })
  })

  test('what is printed follows inserted rows, and is unset by deleting the name it is kept under', async () => {
    const { Excel, user, grid } = desk()
    await Excel.run(async (context) => {
      const { pageLayout } = context.workbook.worksheets.getItem(first)
      pageLayout.setPrintArea('B2:D20')
      pageLayout.setPrintTitleRows('$2:$3')
      await context.sync()
    })
    user.insertRows(first, 1, 2)
    expect(pageIn(grid, first)).toEqual({ printArea: '$B$4:$D$22', titleRows: '$4:$5' })
    await Excel.run(async (context) => {
      const names = context.workbook.worksheets.getItem(first).names.load('items/name')
      await context.sync()
      expect(names.items.map(({ name }) => name)).toEqual(['Print_Area', 'Print_Titles'])
      names.getItem('Print_Area').delete()
      await context.sync()
      const gone = names.getItemOrNullObject('Print_Area').load('name')
      await context.sync()
      expect(gone.isNullObject).toBe(true)
    })
    expect(pageIn(grid, first)).toEqual({ titleRows: '$4:$5' })
  })

  test.each([
    ['titles that are no whole rows', (layout: Excel.PageLayout) => layout.setPrintTitleRows('A1:B2')],
    [
      'a scale beside a number of pages',
      (layout: Excel.PageLayout) => void (layout.zoom = { scale: 50, verticalFitToPages: 1 }),
    ],
    ['a paper nobody knows', (layout: Excel.PageLayout) => void (layout.paperSize = 'A0' as 'A4')],
    ['a negative margin', (layout: Excel.PageLayout) => void (layout.leftMargin = -1)],
  ])('the page refuses %s', async (_, set) => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      set(context.workbook.worksheets.getItem(first).pageLayout)
      expect(await code(context.sync())).toBe('InvalidArgument')
    })
  })

  /** Excel.Worksheet.delete: "if the worksheet's visibility is set to VeryHidden, the delete operation will fail with an InvalidOperation" */
  test('a very hidden sheet is deleted only after it is hidden as others are', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.add('Kept')
      sheet.visibility = 'VeryHidden'
      await context.sync()
      sheet.delete()
      expect(await code(context.sync())).toBe('InvalidOperation')
      sheet.visibility = 'Hidden'
      sheet.delete()
      await context.sync()
    })
  })

  test('cells are found by place as well as by address', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      const found = [sheet.getCell(1, 2), sheet.getRangeByIndexes(1, 2, 3, 4), sheet.getRange('$C$2:D5')]
      for (const range of found) range.load('address')
      await context.sync()
      expect(found.map(({ address }) => address)).toEqual(['Sheet1!C2', 'Sheet1!C2:F4', 'Sheet1!C2:D5'])
    })
  })

  test('what lies on a deleted sheet is gone at the next sync', async () => {
    const { Excel, user } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.add('Gone')
      const range = sheet.getRange('A1')
      await context.sync()
      user.deleteSheet('Gone')
      sheet.load('name')
      expect(await code(context.sync())).toBe('ItemNotFound')
      range.load('values')
      expect(await code(context.sync())).toBe('InvalidObjectPath')
    })
  })

  test('the last visible sheet cannot be deleted', async () => {
    const { Excel } = desk()
    const failed = Excel.run(async (context) => {
      context.workbook.worksheets.getItem(first).delete()
      await context.sync()
    })
    expect(await code(failed)).toBe('InvalidOperation')
  })

  test('renaming a sheet carries formulas and names along', async () => {
    const { Excel, write, read } = desk()
    await Excel.run(async (context) => {
      const other = context.workbook.worksheets.add('Other')
      other.getRange('A1').values = [[4]]
      context.workbook.names.add('theirs', other.getRange('A1'))
      await context.sync()
    })
    await write('A1', '=Other!A1*2')
    await Excel.run(async (context) => {
      context.workbook.worksheets.getItem('Other').name = 'New name'
      await context.sync()
      const name = context.workbook.names.getItem('theirs').load('formula')
      const range = context.workbook.names.getItem('theirs').getRange().load('address,values')
      await context.sync()
      expect(name.formula).toBe("='New name'!$A$1")
      expect([range.address, range.values]).toEqual(["'New name'!A1", [[4]]])
    })
    const { formulas, values } = await read('A1')
    expect([formulas, values]).toEqual([[["='New name'!A1*2"]], [[8]]])
  })
})

/**
 * learn.microsoft.com, "Excel.RangeHyperlink interface", "Excel.ClearApplyTo enum" (its example: clearing a link "does not update text
 * format") and "Group ranges for an outline using the Excel JavaScript API" (eight levels; a group is what will be collapsed, without the
 * row of its control); read. From memory: the font of the style for links, that an empty cell shows where its link leads, that contents
 * and formats can be cleared from around a link, and that ungrouping is refused where nothing is grouped and otherwise takes one level
 * from each row that has one.
 */
describe('Links and groups', () => {
  const link = { documentReference: 'Sheet1!D9', screenTip: 'Shows D9' }
  const at = async (
    { Excel }: ReturnType<typeof desk>,
    address: string,
    act?: (range: Excel.Range) => void,
  ) =>
    Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem(first).getRange(address)
      act?.(range)
      range.load('hyperlink,values,numberFormat')
      range.format.font.load('underline,color,bold,name,size')
      await context.sync()
      const { underline, color, bold, name, size } = range.format.font
      return { link: range.hyperlink, values: range.values, font: { underline, color, bold, name, size } }
    })
  const levels = ({ grid }: ReturnType<typeof desk>, from: number, to: number) => {
    const { rowData } = grid.api.getActiveWorkbook()?.getActiveSheet().getSheet().getConfig() ?? {}
    return Array.from({ length: to - from + 1 }, (_, k) => levelOf(rowData?.[from + k - 1]))
  }
  const group = ({ Excel }: ReturnType<typeof desk>, ...steps: readonly [string, 'group' | 'ungroup'][]) =>
    Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      for (const [address, act] of steps) sheet.getRange(address)[act]('ByRows')
      await context.sync()
    })

  test('a link leads to a place, shows its text and takes on the font of links', async () => {
    const host = desk()
    await at(host, 'B2', (range) => {
      range.values = [['old']]
      range.format.font.bold = true
      range.format.font.size = 20
    })
    const shown = await at(host, 'B2', (range) => (range.hyperlink = { ...link, textToDisplay: 'Go' }))
    expect(shown).toEqual({
      link: { ...link, textToDisplay: 'Go' },
      values: [['Go']],
      font: { underline: 'Single', color: '#0563C1', bold: false, name: 'Calibri', size: 11 },
    })
    expect((await at(host, 'B3')).link).toBeNull()
  })

  test('without a text to display a filled cell keeps its own and an empty one shows where the link leads', async () => {
    const host = desk()
    await host.write('B2', '=1+1')
    expect(await at(host, 'B2', (range) => (range.hyperlink = link))).toMatchObject({
      values: [[2]],
      link: { textToDisplay: '2' },
    })
    expect((await at(host, 'B3', (range) => (range.hyperlink = link))).values).toEqual([['Sheet1!D9']])
  })

  test('its text is an entry like any other: one that begins with = is a formula', async () => {
    const host = desk()
    const shown = await at(host, 'B2', (range) => (range.hyperlink = { ...link, textToDisplay: '=1+1' }))
    expect(shown.values).toEqual([[2]])
  })

  test('a link needs one target', async () => {
    const host = desk()
    const set = (given: Excel.RangeHyperlink | null) =>
      code(at(host, 'B2', (range) => (range.hyperlink = given as Excel.RangeHyperlink)))
    expect(await set({ screenTip: 'x' })).toBe('InvalidArgument')
    expect(await set(null)).toBe('InvalidArgument')
    expect(await set({ ...link, address: 'https://example.org' })).toBe('InvalidArgument')
  })

  test.each([
    ['Contents', true, '', 'Single'],
    ['Formats', true, 'text', 'None'],
    ['Hyperlinks', false, 'text', 'Single'],
    ['RemoveHyperlinks', false, 'text', 'None'],
    ['All', false, '', 'None'],
  ] as const)('clear("%s") keeps the link: %s', async (applyTo, kept, value, underline) => {
    const host = desk()
    await at(host, 'B2', (range) => (range.hyperlink = { ...link, textToDisplay: 'text' }))
    const left = await at(host, 'B2', (range) => range.clear(applyTo))
    expect(left.link !== null).toBe(kept)
    expect([left.values, left.font.underline]).toEqual([[[value]], underline])
  })

  test('a link moves with its cell, stays under what is typed and is told cell by cell', async () => {
    const host = desk()
    await at(host, 'B2', (range) => (range.hyperlink = { ...link, textToDisplay: 'text' }))
    host.user.insertRows(first, 1, 1)
    host.user.type(first, 'B3', 'typed')
    const found = await host.Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem(first).getRange('B2:B3')
      const properties = range.getCellProperties({ hyperlink: true })
      await context.sync()
      return properties.value.map(([cell]) => cell?.hyperlink)
    })
    expect(found).toEqual([null, { ...link, textToDisplay: 'typed' }])
  })

  test('a press goes where a link in the workbook leads, and nowhere from other cells', async () => {
    const host = desk()
    await at(host, 'B2', (range) => (range.hyperlink = link))
    await at(host, 'B3', (range) => (range.hyperlink = { address: 'https://example.org' }))
    const selected = () =>
      host.Excel.run(async (context) => {
        const range = context.workbook.getSelectedRange().load('address')
        await context.sync()
        return range.address
      })
    host.standIn.press(first, 2, 1)
    host.standIn.press(first, 5, 5)
    expect(await selected()).toBe('Sheet1!A1')
    host.standIn.press(first, 1, 1)
    expect(await selected()).toBe('Sheet1!D9')
  })

  test('groups nest, move with their rows and are taken away level by level', async () => {
    const host = desk()
    await group(host, ['3:6', 'group'], ['B4:B5', 'group'])
    expect(levels(host, 2, 7)).toEqual([0, 1, 2, 2, 1, 0])
    host.user.insertRows(first, 1, 1)
    expect(levels(host, 3, 8)).toEqual([0, 1, 2, 2, 1, 0])
    await group(host, ['1:20', 'ungroup'])
    expect(levels(host, 3, 8)).toEqual([0, 0, 1, 1, 0, 0])
    host.user.undo()
    expect(levels(host, 3, 8)).toEqual([0, 1, 2, 2, 1, 0])
  })

  test('what cannot be grouped or ungrouped is refused', async () => {
    const host = desk()
    expect(await code(group(host, ['3:6', 'ungroup']))).toBe('InvalidOperation')
    expect(await code(group(host, ['C:D', 'group']))).toBe('InvalidArgument')
    const deep = Array.from({ length: 7 }, (): [string, 'group'] => ['3:6', 'group'])
    await group(host, ...deep)
    expect(await code(group(host, ['6:9', 'group']))).toBe('InvalidOperation')
    host.standIn.protect(first, true)
    expect(await code(group(host, ['3:6', 'ungroup']))).toBe('AccessDenied')
    expect(levels(host, 6, 7)).toEqual([7, 0])
  })
})

describe('Names', () => {
  const withName = async (parts: ReturnType<typeof desk>, address: string) =>
    parts.Excel.run(async (context) => {
      context.workbook.names.add(
        'linked',
        context.workbook.worksheets.getItem(first).getRange(address),
        'why',
      )
      await context.sync()
    })
  const nameOf = (parts: ReturnType<typeof desk>) =>
    parts.Excel.run(async (context) => {
      const name = context.workbook.names.getItem('linked').load('name,formula,value,type,visible,comment')
      const range = name.getRangeOrNullObject().load('address')
      await context.sync()
      return {
        ...name.toJSON(),
        isNull: range.isNullObject,
        range: range.isNullObject ? null : range.address,
      }
    })

  test('a name tells what it refers to', async () => {
    const parts = desk()
    await withName(parts, 'B2:C4')
    expect(await nameOf(parts)).toMatchObject({
      name: 'linked',
      formula: '=Sheet1!$B$2:$C$4',
      value: 'Sheet1!$B$2:$C$4',
      type: 'Range',
      visible: true,
      comment: 'why',
      range: 'Sheet1!B2:C4',
    })
  })

  test('a name follows inserted rows and columns, and grows with those inserted inside', async () => {
    const parts = desk()
    await withName(parts, 'B2:C4')
    parts.user.insertRows(first, 1, 2)
    parts.user.insertColumns(first, 1, 1)
    expect((await nameOf(parts)).range).toBe('Sheet1!C4:D6')
    parts.user.insertRows(first, 5, 3)
    expect((await nameOf(parts)).range).toBe('Sheet1!C4:D9')
    parts.user.deleteRows(first, 4, 1)
    expect((await nameOf(parts)).range).toBe('Sheet1!C4:D8')
  })

  test('a name whose cells were deleted refers to nothing', async () => {
    const parts = desk()
    await withName(parts, 'B2:C4')
    parts.user.deleteRows(first, 1, 6)
    expect(await nameOf(parts)).toMatchObject({ isNull: true, type: 'Error' })
    const failed = parts.Excel.run(async (context) => {
      context.workbook.names.getItem('linked').getRange()
      await context.sync()
    })
    expect(await code(failed)).toBe('InvalidReference')
  })

  test('a name whose sheet was deleted refers to nothing', async () => {
    const parts = desk()
    await parts.Excel.run(async (context) => {
      const range = context.workbook.worksheets.add('Other').getRange('A1:A3')
      context.workbook.names.add('linked', range)
      await context.sync()
    })
    parts.user.deleteSheet('Other')
    expect(await nameOf(parts)).toMatchObject({ isNull: true })
  })

  test('names are usable in formulas, also those that are functions too', async () => {
    const { Excel, write, read } = desk()
    await write('A1:A2', [[1], [2]])
    await Excel.run(async (context) => {
      context.workbook.names.add('Rate', context.workbook.worksheets.getItem(first).getRange('A1:A2'))
      context.workbook.names.add('half', '=0.5')
      await context.sync()
    })
    await write('B1', '=SUM(Rate)*half')
    expect((await read('B1')).values).toEqual([[1.5]])
  })

  test('a constant has its value', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      const { names } = context.workbook
      const made = [names.add('n', '=0.5'), names.add('t', '="text"'), names.add('b', '=TRUE')]
      for (const name of made) name.load('value,type')
      await context.sync()
      expect(made.map(({ value, type }) => [value, type])).toEqual([
        [0.5, 'Double'],
        ['text', 'String'],
        [true, 'Boolean'],
      ])
    })
  })

  test.each(['A1', 'has space', '1st', 'R1C1', ''])('"%s" cannot be a name', async (name) => {
    const { Excel } = desk()
    const failed = Excel.run(async (context) => {
      context.workbook.names.add(name, context.workbook.worksheets.getItem(first).getRange('A1'))
      await context.sync()
    })
    expect(await code(failed)).toBe('InvalidArgument')
  })

  test('a name can be changed, hidden and deleted, and not made twice', async () => {
    const parts = desk()
    const { Excel } = parts
    await withName(parts, 'A1')
    expect(await code(withName(parts, 'A2'))).toBe('ItemAlreadyExists')
    await Excel.run(async (context) => {
      const name = context.workbook.names.getItem('LINKED')
      name.formula = '=Sheet1!$B$7'
      name.visible = false
      await context.sync()
    })
    expect(await nameOf(parts)).toMatchObject({ range: 'Sheet1!B7', visible: false, comment: 'why' })
    await Excel.run(async (context) => {
      context.workbook.names.getItem('linked').delete()
      const gone = context.workbook.names.getItemOrNullObject('linked')
      await context.sync()
      expect(gone.isNullObject).toBe(true)
    })
  })

  test('a range is found on its sheet by a name', async () => {
    const parts = desk()
    await withName(parts, 'B2')
    await parts.Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem(first).getRange('linked').load('address')
      await context.sync()
      expect(range.address).toBe('Sheet1!B2')
    })
  })
})

describe('Settings', () => {
  test('a setting holds what JSON can hold, is changed by adding it anew and can be deleted', async () => {
    const { Excel, standIn } = desk()
    const value = { list: [1, 'two', null, true], nested: { half: 0.5 } }
    await Excel.run(async (context) => {
      const { settings } = context.workbook
      settings.add('link', 'old')
      settings.add('link', value)
      const setting = settings.getItem('link').load('key,value')
      settings.load('items/key')
      await context.sync()
      expect([setting.key, setting.value]).toEqual(['link', value])
      expect(settings.items.map(({ key }) => key)).toEqual(['link'])
      expect([...standIn.settings]).toEqual([['link', value]])
      setting.delete()
      const gone = settings.getItemOrNullObject('link')
      await context.sync()
      expect(gone.isNullObject).toBe(true)
    })
  })

  test('a setting read is a copy: changing it does not change the workbook', async () => {
    const { Excel } = desk()
    const mine = { list: [1] }
    await Excel.run(async (context) => {
      const setting = context.workbook.settings.add('copy', mine)
      setting.load('value')
      await context.sync()
      mine.list.push(2)
      ;(setting.value as { list: number[] }).list.push(3)
      setting.load('value')
      await context.sync()
      expect(setting.value).toEqual({ list: [1] })
    })
  })
})

describe('Tables', () => {
  test('a table tells its ranges', async () => {
    const { Excel, grid, write } = desk()
    await write('B2:C4', [
      ['name', 'weight'],
      ['x', 0.5],
      ['y', 0.5],
    ])
    const range = { startRow: 1, endRow: 3, startColumn: 1, endColumn: 2 }
    await grid.api.getActiveWorkbook()?.addTable('sheet-1', 'Holdings', range, 'table-1')
    await Excel.run(async (context) => {
      const table = context.workbook.tables.getItemOrNullObject('holdings').load('name')
      const parts = [table.getRange(), table.getHeaderRowRange(), table.getDataBodyRange()]
      for (const part of parts) part.load('address')
      const none = context.workbook.tables.getItemOrNullObject('other')
      await context.sync()
      expect(table.name).toBe('Holdings')
      expect(parts.map(({ address }) => address)).toEqual(['Sheet1!B2:C4', 'Sheet1!B2:C2', 'Sheet1!B3:C4'])
      expect(none.isNullObject).toBe(true)
    })
  })
})

describe('Events', () => {
  type Changed = Excel.WorksheetChangedEventArgs

  async function listening(options?: OfficeOptions) {
    const parts = desk(options)
    const changes: Changed[] = []
    const calculated: Excel.WorksheetCalculatedEventArgs[] = []
    const handlers = await parts.Excel.run(async (context) => {
      const { worksheets } = context.workbook
      const added = [
        worksheets.onChanged.add((args) => Promise.resolve(void changes.push(args))),
        worksheets.onCalculated.add((args) => Promise.resolve(void calculated.push(args))),
      ] as const
      await context.sync()
      return added
    })
    const heard = async () => {
      await parts.standIn.settled()
      return changes.splice(0)
    }
    return { ...parts, heard, calculated, handlers }
  }

  test('a handler is added by the sync, not by the call', async () => {
    const { Excel, user, standIn } = desk()
    const heard: string[] = []
    await Excel.run(async (context) => {
      context.workbook.worksheets.onChanged.add(({ address }) => Promise.resolve(void heard.push(address)))
      user.type(first, 'A1', 1)
      await standIn.settled()
      await context.sync()
      user.type(first, 'A2', 1)
      await standIn.settled()
    })
    expect(heard).toEqual(['A2'])
  })

  test("a user's edit of one cell is told a task later, with the values before and after", async () => {
    const { user, heard, write } = await listening()
    await write('B2', 1)
    await heard()
    user.type(first, 'B2', 2)
    const [change, ...more] = await heard()
    expect(more).toEqual([])
    expect(change).toMatchObject({
      type: 'WorksheetChanged',
      address: 'B2',
      worksheetId: 'sheet-1',
      changeType: 'RangeEdited',
      source: 'Local',
      triggerSource: 'Unknown',
      details: { valueBefore: 1, valueAfter: 2, valueTypeBefore: 'Double', valueTypeAfter: 'Double' },
    })
  })

  test('events come after the change, never during it', async () => {
    const { user, standIn, Excel } = desk()
    let heard = 0
    await Excel.run(async (context) => {
      context.workbook.worksheets.onChanged.add(() => Promise.resolve(void heard++))
      await context.sync()
    })
    user.type(first, 'A1', 1)
    expect(heard).toBe(0)
    await standIn.settled()
    expect(heard).toBe(1)
  })

  test('a change of several cells carries no details', async () => {
    const { user, heard } = await listening()
    user.type(first, 'B2', [
      [1, 2],
      [3, 4],
    ])
    const [change] = await heard()
    expect(change?.address).toBe('B2:C3')
    expect(change?.details).toBeUndefined()
  })

  test("the add-in's own writes are told too, marked as its own", async () => {
    const { write, heard } = await listening()
    await write('A1:B2', [
      [1, null],
      [null, 2],
    ])
    expect(await heard()).toMatchObject([
      { address: 'A1:B2', source: 'Local', triggerSource: 'ThisLocalAddin' },
    ])
  })

  test('a recalculated formula is not a change, but is told as calculated', async () => {
    const { user, write, heard, calculated } = await listening()
    await write('C1', '=A1*2')
    await heard()
    calculated.splice(0)
    user.type(first, 'A1', 3)
    expect((await heard()).map(({ address }) => address)).toEqual(['A1'])
    expect(calculated).toMatchObject([{ type: 'WorksheetCalculated', worksheetId: 'sheet-1', address: 'C1' }])
  })

  test('a formula typed in tells its value', async () => {
    const { user, heard } = await listening()
    user.type(first, 'A1', '=2*21')
    expect(await heard()).toMatchObject([{ address: 'A1', details: { valueBefore: '', valueAfter: 42 } }])
  })

  test('a change of look is no change', async () => {
    const { Excel, grid, write, heard } = await listening()
    await write('A1', 1)
    await heard()
    await Excel.run(async (context) => {
      const { format } = context.workbook.worksheets.getItem(first).getRange('A1')
      format.font.bold = true
      format.fill.color = '#112233'
      context.workbook.worksheets.getItem(first).getRange('A1').numberFormat = [['0.00']]
      await context.sync()
    })
    grid.api.getActiveWorkbook()?.getActiveSheet().getRange('A1').setFontStyle('italic')
    expect(await heard()).toEqual([])
  })

  test('inserted and deleted rows and columns are told as such, and moved references are no edits', async () => {
    const { user, write, heard } = await listening()
    await write('C9', '=A9')
    await heard()
    user.insertRows(first, 2, 3)
    user.deleteRows(first, 2, 1)
    user.insertColumns(first, 2, 1)
    user.deleteColumns(first, 2, 1)
    expect((await heard()).map(({ changeType, address }) => [changeType, address])).toEqual([
      ['RowInserted', '2:4'],
      ['RowDeleted', '2:2'],
      ['ColumnInserted', 'B:B'],
      ['ColumnDeleted', 'B:B'],
    ])
  })

  test('an undo is a change by the user', async () => {
    const { user, write, heard, read } = await listening()
    await write('A1', 1)
    await write('A1', 2)
    await heard()
    user.undo()
    expect(await heard()).toMatchObject([{ address: 'A1', triggerSource: 'Unknown' }])
    expect((await read('A1')).values).toEqual([[1]])
  })

  test('one request of several writes is undone in one step', async () => {
    const { Excel, user, read } = desk()
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      sheet.getRange('A1').values = [[1]]
      sheet.getRange('A1').numberFormat = [['0.00']]
      sheet.getRange('B1').values = [[2]]
      await context.sync()
    })
    user.undo()
    const { values, numberFormat } = await read('A1:B1')
    expect([values, numberFormat]).toEqual([[['', '']], [['General', 'General']]])
  })

  // learn.microsoft.com, "Undo support with the Excel JavaScript API" and the reference of Excel.RunOptions (read)
  test('a batch whose undo is merged is undone in one step, requests, formats, widths and new sheets together', async () => {
    const { Excel, user, read, write } = desk()
    await write('A1', 'before')
    const widthOf = () =>
      Excel.run(async (context) => {
        const { format } = context.workbook.worksheets
          .getItem(first)
          .getRange('A1')
          .load('format/columnWidth')
        await context.sync()
        return format.columnWidth
      })
    const width = await widthOf()
    await Excel.run({ mergeUndoGroup: true }, async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      sheet.getRange('A1').values = [['once']]
      await context.sync()
      sheet.getRange('A1').format.columnWidth = 2 * width
      context.workbook.worksheets.add('Made').getRange('A1').values = [[1]]
      await context.sync()
      sheet.getRange('A1').values = [['twice']]
      sheet.getRange('A1').format.font.bold = true
      await context.sync()
    })
    expect([(await read('A1')).values, await widthOf()]).toEqual([[['twice']], 2 * width])
    user.undo()
    expect([(await read('A1')).values, await widthOf()]).toEqual([[['before']], width])
    expect(await code(read('A1', 'Made'))).toBe('ItemNotFound')
    user.undo()
    expect((await read('A1')).values).toEqual([['']])
  })

  test('a command of the user parts such a batch, and both are undone in turn', async () => {
    const { Excel, user, read } = desk()
    await Excel.run({ mergeUndoGroup: true }, async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      sheet.getRange('A1').values = [[1]]
      await context.sync()
      user.type(first, 'B1', 'mine')
      sheet.getRange('C1').values = [[3]]
      await context.sync()
    })
    const left = []
    for (let undone = 0; undone < 3; undone++) {
      user.undo()
      left.push((await read('A1:C1')).values?.[0])
    }
    expect(left).toEqual([
      [1, 'mine', ''],
      [1, '', ''],
      ['', '', ''],
    ])
  })

  test('what cannot be undone is refused in such a batch, and nowhere else', async () => {
    const { Excel } = desk()
    const deleting = (mergeUndoGroup: boolean) =>
      Excel.run({ mergeUndoGroup }, async (context) => {
        context.workbook.worksheets.add('Made')
        await context.sync()
        context.workbook.worksheets.getItem('Made').delete()
        await context.sync()
      })
    expect(await code(deleting(false))).toBe('fulfilled')
    expect(await code(deleting(true))).toBe('UndoNotSupported')
  })

  test('a handler is removed only through the context that added it', async () => {
    const { Excel, user, heard, handlers } = await listening()
    const handler = handlers[0]
    handler.remove()
    await Excel.run(async (context) => {
      context.workbook.load('name')
      await context.sync()
    })
    user.type(first, 'A1', 1)
    expect(await heard()).toHaveLength(1)
    await Excel.run(handler.context, (context) => context.sync())
    user.type(first, 'A1', 2)
    expect(await heard()).toEqual([])
  })

  test("a sheet's own handler hears nothing of other sheets", async () => {
    const { Excel, user, standIn } = desk()
    const heard: string[] = []
    await Excel.run(async (context) => {
      context.workbook.worksheets.add('Other')
      context.workbook.worksheets
        .getItem(first)
        .onChanged.add(({ address }) => Promise.resolve(void heard.push(address)))
      await context.sync()
    })
    user.type('Other', 'A1', 1)
    user.type(first, 'B2', 1)
    await standIn.settled()
    expect(heard).toEqual(['B2'])
  })

  test('the range of an event is had in a context of its own', async () => {
    const { Excel, user, heard } = await listening()
    user.type(first, 'B2', 'found')
    const [change] = await heard()
    await Excel.run(async (context) => {
      const range = change?.getRange(context).load('values')
      await context.sync()
      expect(range?.values).toEqual([['found']])
    })
  })

  test('selections, added, renamed, activated and deleted sheets are told', async () => {
    const { Excel, user, standIn } = desk()
    const heard: string[] = []
    const tell = (what: string) => () => Promise.resolve(void heard.push(what))
    await Excel.run(async (context) => {
      const { worksheets } = context.workbook
      context.workbook.onSelectionChanged.add(tell('selection'))
      worksheets.onSelectionChanged.add(({ address }) => Promise.resolve(void heard.push(address)))
      worksheets.onAdded.add(tell('added'))
      worksheets.onDeleted.add(tell('deleted'))
      worksheets.onNameChanged.add(tell('renamed'))
      worksheets.onActivated.add(tell('activated'))
      await context.sync()
    })
    user.select(first, 'B2:C3', 'E5')
    await standIn.settled()
    expect(heard.splice(0)).toEqual(['selection', 'B2:C3,E5'])
    await Excel.run(async (context) => {
      context.workbook.worksheets.add('Other')
      await context.sync()
    })
    user.renameSheet('Other', 'Another')
    user.select('Another', 'A1')
    user.deleteSheet('Another')
    await standIn.settled()
    expect(heard).toEqual(expect.arrayContaining(['added', 'renamed', 'activated', 'deleted']))
  })

  test('events can be switched off and on again', async () => {
    const { Excel, user, heard } = await listening()
    const enable = (on: boolean) =>
      Excel.run(async (context) => {
        context.runtime.enableEvents = on
        context.runtime.load('enableEvents')
        await context.sync()
        expect(context.runtime.enableEvents).toBe(on)
      })
    await enable(false)
    user.type(first, 'A1', 1)
    expect(await heard()).toEqual([])
    await enable(true)
    user.type(first, 'A2', 1)
    expect((await heard()).map(({ address }) => address)).toEqual(['A2'])
  })

  test('scattered cells changed at once are told as the areas they are', async () => {
    const { user, write, heard } = await listening()
    await write('A1:C3', 1)
    await heard()
    user.select(first, 'A1', 'C2:C3')
    user.clearSelected()
    expect((await heard()).map(({ address }) => address)).toEqual(['A1,C2:C3'])
  })

  test('after a reset nobody is told of anything', async () => {
    const { user, heard, standIn } = await listening()
    standIn.reset()
    user.type(first, 'A1', 1)
    expect(await heard()).toEqual([])
  })
})

describe('Injected faults and counts', () => {
  const threeWrites = (Excel: ReturnType<typeof desk>['Excel']) =>
    Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      for (const address of ['A1', 'A2', 'A3']) sheet.getRange(address).values = [[address]]
      await context.sync()
    })

  test('the chosen operation fails, those before it stand, and the next request is whole again', async () => {
    // One sheet, then a range and a write each: operation 5 is the second write.
    const { Excel, faults, read } = desk()
    faults.beforeOperation(5)
    expect(await code(threeWrites(Excel))).toBe('GeneralException')
    expect((await read('A1:A3')).values).toEqual([['A1'], [''], ['']])
    await threeWrites(Excel)
    expect((await read('A1:A3')).values).toEqual([['A1'], ['A2'], ['A3']])
  })

  test('a second fault can strike what follows the first', async () => {
    const { Excel, faults, read } = desk()
    faults.beforeOperation(5, 8)
    expect(await code(threeWrites(Excel))).toBe('GeneralException')
    expect(await code(threeWrites(Excel))).toBe('GeneralException')
    expect((await read('A1:A3')).values).toEqual([['A1'], [''], ['']])
  })

  test('a fault taken back does not strike', async () => {
    const { Excel, faults } = desk()
    faults.beforeOperation(1)
    faults.beforeOperation(null)
    expect(await code(threeWrites(Excel))).toBe('fulfilled')
  })

  test('a lost answer leaves everything done and the caller in the dark', async () => {
    const { Excel, faults, read } = desk()
    faults.loseAnswer()
    expect(await code(threeWrites(Excel))).toBe('GeneralException')
    expect((await read('A1:A3')).values).toEqual([['A1'], ['A2'], ['A3']])
  })

  test('requests, reads, writes and operations are counted, and a sync with nothing queued is none', async () => {
    const { Excel, counts, read } = desk()
    counts.reset()
    await threeWrites(Excel)
    await Excel.run((context) => context.sync())
    expect(counts).toMatchObject({ syncs: 1, reads: 0, writes: 1, operations: 7 })
    await read('A1')
    expect(counts).toMatchObject({ syncs: 2, reads: 1, writes: 1, operations: 10 })
  })
})

describe('The application and the host', () => {
  test('the culture is the one the desk was opened with', async () => {
    const culture = {
      name: 'de-DE',
      numberDecimalSeparator: ',',
      numberGroupSeparator: '.',
      dateSeparator: '.',
      shortDatePattern: 'dd.MM.yyyy',
    }
    const { Excel, write, read } = desk({ culture })
    await Excel.run(async (context) => {
      const { cultureInfo } = context.application
      cultureInfo.load('name,numberFormat/numberDecimalSeparator,datetimeFormat/shortDatePattern')
      await context.sync()
      expect([
        cultureInfo.name,
        cultureInfo.numberFormat.numberDecimalSeparator,
        cultureInfo.datetimeFormat.shortDatePattern,
      ]).toEqual(['de-DE', ',', 'dd.MM.yyyy'])
      context.workbook.worksheets.getItem(first).getRange('A1').numberFormat = [['0.00']]
      await context.sync()
    })
    await write('A1', 1.5)
    expect((await read('A1')).text).toEqual([['1,50']])
  })

  test('calculation is automatic, and calculate works formulas out anew', async () => {
    const { Excel } = desk()
    await Excel.run(async (context) => {
      context.application.load('calculationMode')
      context.application.calculate('Full')
      await context.sync()
      expect(context.application.calculationMode).toBe('Automatic')
      context.application.calculationMode = 'Manual'
      expect(await code(context.sync())).toBe('NotImplemented')
    })
  })

  test('a read sees old results while calculation is suspended, until the sync is over', async () => {
    const { Excel, write } = desk()
    await write('A1:B1', [[1, '=A1*2']])
    await Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem(first)
      context.application.suspendApiCalculationUntilNextSync()
      context.application.suspendScreenUpdatingUntilNextSync()
      sheet.getRange('A1').values = [[10]]
      const during = sheet.getRange('B1').load('values')
      await context.sync()
      const after = sheet.getRange('B1').load('values')
      await context.sync()
      expect([during.values, after.values]).toEqual([[[2]], [[20]]])
    })
  })

  test('requirement sets are claimed up to what is there', () => {
    const { isSetSupported } = desk().Office.context.requirements
    expect([
      isSetSupported('ExcelApi', '1.12'),
      isSetSupported('ExcelApi', '1.20'),
      isSetSupported('ExcelApi', '1.21'),
    ]).toEqual([true, true, false])
    expect([isSetSupported('SharedRuntime', '1.1'), isSetSupported('CustomFunctionsRuntime', '1.2')]).toEqual(
      [true, true],
    )
    expect([isSetSupported('ExcelApi', '2.0'), isSetSupported('NoSuchApi')]).toEqual([false, false])
  })

  test('the host is ready and says what it is', async () => {
    const { Office } = desk()
    const seen: unknown[] = []
    const info = await Office.onReady((ready) => seen.push(ready))
    expect(info).toEqual({ host: 'Excel', platform: 'PC' })
    expect(seen).toEqual([info])
  })

  test('the theme may be missing, and a change of it is told', () => {
    const { Office, standIn } = desk()
    const dark = {
      bodyBackgroundColor: '#111111',
      bodyForegroundColor: '#EEEEEE',
      controlBackgroundColor: '#222222',
      controlForegroundColor: '#FFFFFF',
      isDarkTheme: true,
    }
    const seen: unknown[] = []
    expect(Office.context.officeTheme).toBeUndefined()
    Office.context.document.addHandlerAsync(
      Office.EventType.OfficeThemeChanged,
      (args: { officeTheme: unknown }) => seen.push(args.officeTheme),
    )
    standIn.setOfficeTheme(dark)
    expect([Office.context.officeTheme, ...seen]).toEqual([dark, dark])
  })

  test('the ribbon button runs the action that was associated with it', async () => {
    const { Office, standIn } = desk()
    const shown: boolean[] = []
    Office.actions.associate('show', (event: { completed(): void }) => {
      shown.push(true)
      event.completed()
    })
    await standIn.runAction('show')
    expect(shown).toEqual([true])
    await expect(standIn.runAction('other')).rejects.toThrow(/"other"/)
  })

  test('showing and hiding the pane is told', async () => {
    const panes: boolean[] = []
    const { Office } = desk({ onPane: (shown) => panes.push(shown) })
    const modes: string[] = []
    const stop = await Office.addin.onVisibilityModeChanged(({ visibilityMode }) =>
      modes.push(visibilityMode),
    )
    await Office.addin.showAsTaskpane()
    await Office.addin.hide()
    await stop()
    await Office.addin.showAsTaskpane()
    expect([panes, modes]).toEqual([
      [true, false, true],
      ['Taskpane', 'Hidden'],
    ])
  })
})

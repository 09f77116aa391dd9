/**
 * Opening and saving .xlsx in the desk.
 *
 * Values here are echoed, so they are compared exactly. What a file must contain is stated from ECMA-376 part 1 and [MS-XLSX] (both
 * from memory), with the paragraph beside it; that other programs open the file is checked with LibreOffice where it is installed.
 */
import { Workbook } from '@cj-tech-master/excelts/browser'
import { BooleanNumber, CellValueType, type ICellData, type IWorkbookData } from '@univerjs/core'
import { FormulaDataModel, IDefinedNamesService } from '@univerjs/engine-formula'
import { openWorkbook, saveWorkbook, sentenceOf, type Settings } from '../../src/desk/files'
import { pack, textOf, unpack } from '../../src/desk/files/archive'
import { needsArray, shownFormula, storedFormula } from '../../src/desk/files/formula-text'
import { createCustomFunctions, type CustomFunctionsStandIn } from '../../src/desk/functions'
import { headlessGrid, type Grid } from '../../src/desk/grid'
import { barOf, levelOf, linkOf, withBar, withLevel, withLink } from '../../src/desk/office'
import { itInCalc, recalculated } from '../calc'

let grid: Grid
let functions: CustomFunctionsStandIn
let settings: Settings

beforeEach(() => {
  grid = headlessGrid()
  functions = createCustomFunctions(grid)
  functions.associate({
    DOUBLED: (block: number[][]) => block.map((row) => row.map((value) => value * 2)),
    TOTAL: (block: number[][]) => block.flat().reduce((sum, value) => sum + value, 0),
  })
  const parameters = [{ name: 'block', type: 'any', dimensionality: 'matrix' }]
  functions.register(
    { functions: ['DOUBLED', 'TOTAL'].map((name) => ({ id: name, name, parameters })) },
    'POISE',
  )
  settings = new Map()
})

afterEach(() => {
  functions.dispose()
  grid.dispose()
})

const book = () => {
  const active = grid.api.getActiveWorkbook()
  if (!active) throw new Error('no workbook')
  return active
}
const calculated = () => grid.api.getFormula().onCalculationResultApplied()

async function show(cells: Record<string, ICellData>, more: Partial<IWorkbookData['sheets'][string]> = {}) {
  grid.api.disposeUnit(book().getId())
  grid.api.createWorkbook({
    id: 'made',
    name: 'Made',
    sheetOrder: ['a'],
    sheets: { a: { id: 'a', name: 'My sheet', rowCount: 100, columnCount: 30, ...more } },
  })
  for (const [address, cell] of Object.entries(cells))
    book().getActiveSheet().getRange(address).setValue(cell)
  await calculated()
}

/** Saves, and opens what was saved. */
async function again() {
  const bytes = await saveWorkbook(grid, settings)
  const report = await openWorkbook(grid, bytes, settings)
  return { bytes, report }
}

const cell = (address: string, sheet = book().getActiveSheet()) => {
  const range = sheet.getRange(address)
  const own = sheet.getSheet().getCellMatrix().getValue(range.getRow(), range.getColumn())
  const spilled = grid.univer.__getInjector().get(FormulaDataModel).getArrayFormulaCellData()
  const value =
    own?.v ?? spilled[book().getId()]?.[sheet.getSheetId()]?.[range.getRow()]?.[range.getColumn()]?.v
  return { ...own, v: value }
}
const look = (address: string) => book().getActiveSheet().getRange(address).getCellStyleData()
const parsed = async (bytes: ArrayBuffer) => {
  const workbook = new Workbook()
  await workbook.xlsx.loadFromFiles(await unpack(bytes))
  return workbook
}

describe('values', () => {
  it('come back with every digit and type', async () => {
    await show({
      A1: { v: 0.1 + 0.2 },
      A2: { v: 1e-300 },
      A3: { v: 'Größe <&> "x"' },
      A4: { v: 1, t: CellValueType.BOOLEAN },
      A5: { v: 45_000.25, s: { n: { pattern: 'yyyy-mm-dd hh:mm' } } },
      A6: { v: -0.125, s: { n: { pattern: '0.0%;[Red]-0.0%' } } },
    })
    await again()
    expect(cell('A1').v).toBe(0.1 + 0.2)
    expect(cell('A2').v).toBe(1e-300)
    expect(cell('A3').v).toBe('Größe <&> "x"')
    expect(cell('A4')).toMatchObject({ v: 1, t: CellValueType.BOOLEAN })
    expect(cell('A5').v).toBe(45_000.25)
    expect(look('A5')?.n).toEqual({ pattern: 'yyyy-mm-dd hh:mm' })
    expect(cell('A6').v).toBe(-0.125)
    expect(look('A6')?.n).toEqual({ pattern: '0.0%;[Red]-0.0%' })
  })

  it.each(['=1+1', '+3', '-3', '@name', '00123', '#N/A or so'])(
    'that are the text %s stay text',
    async (text) => {
      await show({ A1: { v: text, t: CellValueType.FORCE_STRING }, B1: { f: '=ISTEXT(A1)' } })
      await again()
      expect(cell('A1').f ?? null).toBeNull()
      expect(cell('A1').v).toBe(text)
      expect(cell('B1').v).toBe(1)
    },
  )

  it('that are errors come back as errors', async () => {
    await show({ A1: { f: '=1/0' }, B1: { f: '=NA()' }, C1: { f: '=IFERROR(A1,"caught")' } })
    const { bytes } = await again()
    expect([cell('A1').v, cell('B1').v, cell('C1').v]).toEqual(['#DIV/0!', '#N/A', 'caught'])
    expect((await parsed(bytes)).getWorksheet('My sheet')?.getCell('A1').result).toEqual({ error: '#DIV/0!' })
  })
})

describe('formulas', () => {
  it('come back with their results, and calculate again', async () => {
    await show({ A1: { v: 2 }, A2: { v: 3 }, B1: { f: '=SUM(A1:A2)*10' } })
    const { bytes, report } = await again()
    expect((await parsed(bytes)).getWorksheet('My sheet')?.getCell('B1').result).toBe(50)
    expect(cell('B1')).toMatchObject({ f: '=SUM(A1:A2)*10', v: 50 })
    book().getActiveSheet().getRange('A1').setValue(4)
    await calculated()
    expect(cell('B1').v).toBe(70)
    expect(report.notCalculated).toEqual([])
  })

  it('that spill come back as one formula that spills, without anything in its way', async () => {
    await show({ A1: { v: 1 }, A2: { v: 2 }, A3: { v: 3 }, C1: { f: '=POISE.DOUBLED(A1:A3)' } })
    const { bytes } = await again()
    expect([cell('C1').v, cell('C2').v, cell('C3').v]).toEqual([2, 4, 6])
    book().getActiveSheet().getRange('A3').setValue(30)
    await calculated()
    expect([cell('C1').v, cell('C2').v, cell('C3').v]).toEqual([2, 4, 60])
    const parts = await unpack(bytes)
    // 18.3.1.40 (f): t="array" with the covered cells in ref; 18.3.1.4 (c): cm points into the cell metadata.
    expect(textOf(parts, 'xl/worksheets/sheet1.xml')).toContain(
      '<c r="C1" cm="1"><f t="array" ref="C1:C3">_xldudf_POISE_DOUBLED(A1:A3)</f><v>2</v></c>',
    )
    expect(textOf(parts, 'xl/worksheets/sheet1.xml')).toContain('<c r="C3"><v>6</v></c>')
    expect(textOf(parts, 'xl/metadata.xml')).toContain('fDynamic="1"')
  })

  it('of an add-in are read in the form of the file and in the form of the screen', async () => {
    const workbook = new Workbook()
    const sheet = workbook.addWorksheet('S')
    sheet.getCell('A1').value = 21
    sheet.getCell('B1').value = { formula: '_xldudf_POISE_TOTAL(A1)', result: 1 }
    sheet.getCell('B2').value = { formula: 'POISE.TOTAL(A1)', result: 1 }
    sheet.getCell('B3').value = { formula: '_xlfn.XLOOKUP(21,A1,A1)+_xlfn._xlws.FILTER(A1,A1>0)', result: 1 }
    await openWorkbook(grid, new Uint8Array(await workbook.xlsx.writeBuffer()), settings)
    expect([cell('B1').f, cell('B2').f]).toEqual(['=POISE.TOTAL(A1)', '=POISE.TOTAL(A1)'])
    expect([cell('B1').v, cell('B2').v, cell('B3').v]).toEqual([21, 21, 42])
  })

  it('that the desk cannot calculate are named with their place', async () => {
    const workbook = new Workbook()
    workbook.addWorksheet('S').getCell('B7').value = { formula: 'NOSUCHFUNCTION(1)', result: 5 }
    const report = await openWorkbook(grid, new Uint8Array(await workbook.xlsx.writeBuffer()), settings)
    expect(report.notCalculated).toEqual(['S!B7'])
    expect(sentenceOf(report)).toBe('Opened 1 sheet. 1 formula cannot be calculated here, first S!B7.')
  })

  // Prefixes of newer functions: [MS-XLSX] 2.2.2, future-function-list (from memory); LET's variables likewise.
  it.each([
    ['=XLOOKUP(A1,B1:B3,C1:C3)', '_xlfn.XLOOKUP(A1,B1:B3,C1:C3)'],
    ['=SORT(FILTER(A1:A3,A1:A3>0))', '_xlfn._xlws.SORT(_xlfn._xlws.FILTER(A1:A3,A1:A3>0))'],
    ['=LET(x,A1*2,y,x+1,x&"x"&y)', '_xlfn.LET(_xlpm.x,A1*2,_xlpm.y,_xlpm.x+1,_xlpm.x&"x"&_xlpm.y)'],
    ['=BYROW(A1:B2,LAMBDA(r,SUM(r)))', '_xlfn.BYROW(A1:B2,_xlfn.LAMBDA(_xlpm.r,SUM(_xlpm.r)))'],
    ['=STDEV.S(A1:A9)+NORM.S.INV(0.9)', '_xlfn.STDEV.S(A1:A9)+_xlfn.NORM.S.INV(0.9)'],
    ['=\'POISE.TOTAL(x\'!A1&"POISE.TOTAL(1)"', '\'POISE.TOTAL(x\'!A1&"POISE.TOTAL(1)"'],
    ['=SUM(POISE.TOTAL(A1:A2),1)', 'SUM(_xldudf_POISE_TOTAL(A1:A2),1)'],
    ['=Table1[POISE.TOTAL]', 'Table1[POISE.TOTAL]'],
  ])('%s is stored as %s, and shown as before', (shown, stored) => {
    expect(storedFormula(shown, (name) => name === 'POISE.TOTAL')).toBe(stored)
    expect(shownFormula(stored)).toBe(shown)
  })

  it.each([
    ['=SUM(A1:A3)', false],
    ['=A1*B1+SUM(A1:A3)', false],
    ['=SUM(A1:A3*B1:B3)', true],
    ['=SUM((A1:A3>0)*1)', true],
    ["=SUM(1-'My sheet'!A1:A3)", true],
    ['=POISE.TOTAL(A1:A3)', true],
    ['=A1&"x*A1:A3"', false],
  ])('%s is stored as an array formula: %s', (formula, array) => {
    expect(needsArray(formula, (name) => name === 'POISE.TOTAL')).toBe(array)
  })
})

describe('look', () => {
  it('of cells comes back, empty ones included', async () => {
    const style = {
      bl: 1,
      it: 1,
      cl: { rgb: '#C00000' },
      bg: { rgb: '#DDEBF7' },
      ht: 3,
      tb: 3,
      bd: { t: { s: 1, cl: { rgb: '#333333' } }, b: { s: 7, cl: { rgb: '#000000' } } },
    }
    await show({ B2: { v: 1, s: style }, B3: { s: { bg: { rgb: '#FFFF00' } } } })
    await again()
    expect(look('B2')).toMatchObject(style)
    expect(look('B3')).toMatchObject({ bg: { rgb: '#FFFF00' } })
  })

  it('of sheets comes back: widths, heights, hidden rows and columns, merged cells, frozen panes, gridlines, tab colour', async () => {
    await show(
      { A1: { v: 'title' }, D9: { v: 1 } },
      {
        columnData: { 0: { w: 180 }, 2: { hd: BooleanNumber.TRUE } },
        rowData: { 0: { h: 40 }, 4: { hd: BooleanNumber.TRUE }, 8: { ah: 36 } },
        mergeData: [{ startRow: 0, endRow: 0, startColumn: 0, endColumn: 3 }],
        freeze: { xSplit: 1, ySplit: 3, startRow: 3, startColumn: 1 },
        showGridlines: BooleanNumber.FALSE,
        tabColor: '#00AA55',
      },
    )
    const { bytes } = await again()
    const sheet = book().getActiveSheet().getSheet().getConfig()
    expect(sheet.columnData[0]?.w).toBe(180)
    expect(sheet.columnData[2]?.hd).toBe(BooleanNumber.TRUE)
    expect(sheet.rowData[0]).toMatchObject({ h: 40, ia: BooleanNumber.FALSE })
    // the height that a row's texts ask for, which follows them: 18.3.1.73, ht without customHeight
    expect(sheet.rowData[8]).toEqual({ ah: 36 })
    expect((await parsed(bytes)).worksheets[0]?.getRow(9)).toMatchObject({ height: 27 })
    expect(sheet.rowData[4]?.hd).toBe(BooleanNumber.TRUE)
    expect(sheet.mergeData).toMatchObject([{ startRow: 0, endRow: 0, startColumn: 0, endColumn: 3 }])
    expect(sheet.freeze).toMatchObject({ xSplit: 1, ySplit: 3 })
    expect(sheet.showGridlines).toBe(BooleanNumber.FALSE)
    expect(sheet.tabColor).toBe('#00AA55')
  })

  it('of theme colours is read through the theme and its tint', async () => {
    const workbook = new Workbook()
    const target = workbook.addWorksheet('S').getCell('A1')
    target.value = 1
    target.fill = { type: 'pattern', pattern: 'solid', fgColor: { theme: 1, tint: 0.5 } as { theme: number } }
    await openWorkbook(grid, new Uint8Array(await workbook.xlsx.writeBuffer()), settings)
    // Black half-way to white, 18.8.19: L' = L(1 - tint) + tint = 0.5, so 128 of 255 by rounding.
    expect(look('A1')?.bg).toEqual({ rgb: '#808080' })
  })

  it('of the three kinds of hidden sheet is kept apart', async () => {
    const workbook = new Workbook()
    workbook.addWorksheet('Shown')
    workbook.addWorksheet('Hidden', { state: 'hidden' })
    workbook.addWorksheet('Deep', { state: 'veryHidden' })
    await openWorkbook(grid, new Uint8Array(await workbook.xlsx.writeBuffer()), settings)
    const { bytes } = await again()
    const states = (await parsed(bytes)).worksheets.map(({ name, state }) => [name, state])
    expect(states).toEqual([
      ['Shown', 'visible'],
      ['Hidden', 'hidden'],
      ['Deep', 'veryHidden'],
    ])
    expect(book().getActiveSheet().getSheetName()).toBe('Shown')
  })
})

describe('names and tables', () => {
  it('come back: names of ranges, constants and formulas, with their visibility', async () => {
    await show({ A1: { v: 5 } })
    book().insertDefinedName('Spread_base', "'My sheet'!$A$1:$A$1")
    book().insertDefinedName('Half', '=0.5')
    book().insertDefinedName('Twice', "=2*'My sheet'!$A$1")
    grid.univer.__getInjector().get(IDefinedNamesService).registerDefinedName('made', {
      id: 'hidden',
      name: 'Link_1',
      formulaOrRefString: "'My sheet'!$A$1",
      comment: 'kept for the add-in',
      hidden: true,
      localSheetId: 'AllDefaultWorkbook',
    })
    book().getActiveSheet().getRange('B1').setValue({ f: '=Spread_base*Half' })
    await calculated()
    const { bytes } = await again()
    expect(textOf(await unpack(bytes), 'xl/workbook.xml')).toContain(
      '<definedName name="Half">0.5</definedName>',
    )
    const names = book()
      .getDefinedNames()
      .map((name) => [name.getName(), name.getFormulaOrRefString()])
    expect(names).toEqual([
      ['Spread_base', "'My sheet'!$A$1:$A$1"],
      ['Half', '=0.5'],
      ['Twice', "=2*'My sheet'!$A$1"],
      ['Link_1', "'My sheet'!$A$1"],
    ])
    const hidden = grid.univer
      .__getInjector()
      .get(IDefinedNamesService)
      .getValueByName(book().getId(), 'Link_1')
    expect(hidden).toMatchObject({ hidden: true, comment: 'kept for the add-in' })
    expect(cell('B1').v).toBe(2.5)
  })

  it('come back: tables, with their name and place', async () => {
    await show({
      A1: { v: 'Name' },
      B1: { v: 'Weight' },
      A2: { v: 'x' },
      B2: { v: 0.5 },
      A3: { v: 'y' },
      B3: { v: 0.25 },
    })
    await book().addTable('a', 'Holdings', { startRow: 0, endRow: 2, startColumn: 0, endColumn: 1 })
    const { report } = await again()
    expect(report.notKept).toEqual([])
    expect(book().getTableList()).toMatchObject([
      { name: 'Holdings', range: { startRow: 0, endRow: 2, startColumn: 0, endColumn: 1 } },
    ])
    expect([cell('A1').v, cell('B1').v, cell('B3').v]).toEqual(['Name', 'Weight', 0.25])
  })
})

describe('data bars', () => {
  const bar = (id: string, full: string) => ({
    id,
    lower: { type: 'Number', formula: '0' },
    upper: { type: 'Number', formula: full },
    fill: '#A6ACB5',
    border: '',
    gradient: false,
    direction: 'Context',
  })
  const filled = () =>
    show({
      A1: { v: 0.5, ...withBar(bar('one', '1')) },
      A2: { v: 1.2, ...withBar(bar('one', '1')) },
      B2: { v: 'out', ...withBar(bar('two', '2.5'), withLink({ address: 'https://example.org' })) },
      A4: { v: 0.1, ...withBar(bar('one', '1')) },
    })

  it('come back with their ends and colour, beside links', async () => {
    await filled()
    const { report } = await again()
    expect(report.notKept).toEqual([])
    const one = barOf(cell('A1'))
    expect(one).toEqual(bar(one?.id ?? '', '1'))
    expect(['A2', 'A4', 'B1'].map((address) => barOf(cell(address))?.id)).toEqual([
      one?.id,
      one?.id,
      undefined,
    ])
    const two = barOf(cell('B2'))
    expect(two).toEqual(bar(two?.id ?? '', '2.5'))
    expect(two?.id).not.toBe(one?.id)
    expect(linkOf(cell('B2'))).toEqual({ address: 'https://example.org' })
  })

  it('stand in the file as the format has them', async () => {
    await filled()
    const sheet = textOf(await unpack((await again()).bytes), 'xl/worksheets/sheet1.xml')
    // 18.3.1.18 (conditionalFormatting), 18.3.1.28 (dataBar); solid bars are [MS-XLSX] 2.6.27
    expect(sheet).toContain('<conditionalFormatting sqref="A1:A2 A4"><cfRule type="dataBar"')
    expect(sheet).toContain(
      '<dataBar><cfvo type="num" val="0"/><cfvo type="num" val="1"/><color rgb="FFA6ACB5"/></dataBar>',
    )
    expect(sheet).toMatch(/<x14:dataBar [^>]*gradient="0"/)
  })
})

describe('links and folded rows', () => {
  const inside = { documentReference: "'My sheet'!D9", screenTip: 'Go to "D9" & <more>' }
  const outside = { address: 'https://example.org/?a=1&b=2' }
  const shape = {
    rowData: {
      1: withLevel(1),
      2: { ...withLevel(2), hd: BooleanNumber.TRUE },
      // a row without cells
      6: withLevel(1),
    },
    columnData: { 3: withLevel(1) },
  }
  const filled = () =>
    show(
      {
        A1: { v: '=here', t: CellValueType.FORCE_STRING, ...withLink(inside) },
        A2: { v: 'out', ...withLink(outside) },
        A3: { f: '=1+1', ...withLink(inside) },
        A4: withLink(inside),
        B1: { v: 1 },
      },
      shape,
    )
  const levels = (rows: number) => {
    const { rowData } = book().getActiveSheet().getSheet().getConfig()
    return Array.from({ length: rows }, (_, row) => levelOf(rowData[row]))
  }

  it('come back, whatever stands in the cells', async () => {
    await filled()
    const { report } = await again()
    expect(report.notKept).toEqual([])
    expect(['A1', 'A2', 'A3', 'A4', 'B1'].map((address) => linkOf(cell(address)))).toEqual([
      inside,
      outside,
      inside,
      inside,
      null,
    ])
    expect([cell('A1').v, cell('A2').v, cell('A3').f]).toEqual(['=here', 'out', '=1+1'])
    expect(levels(8)).toEqual([0, 1, 2, 0, 0, 0, 1, 0])
    const { rowData, columnData } = book().getActiveSheet().getSheet().getConfig()
    expect([rowData[2]?.hd, levelOf(columnData[3])]).toEqual([BooleanNumber.TRUE, 1])
  })

  it('stand in the file as the format has them', async () => {
    await filled()
    const parts = await unpack((await again()).bytes)
    const sheet = textOf(parts, 'xl/worksheets/sheet1.xml')
    // 18.3.1.47 (hyperlink): location for a place in the workbook, a relationship for one outside it
    expect(sheet).toContain(
      '<hyperlink ref="A1" location="\'My sheet\'!D9" tooltip="Go to &quot;D9&quot; &amp; &lt;more&gt;"/>'.replaceAll(
        "'",
        '&apos;',
      ),
    )
    expect(sheet).toContain('<hyperlink ref="A2" r:id="rIdLink1"/>')
    expect(textOf(parts, 'xl/worksheets/_rels/sheet1.xml.rels')).toContain(
      'Target="https://example.org/?a=1&amp;b=2" TargetMode="External"',
    )
    // 18.3.1.99 (worksheet): links come before the margins of the page
    expect(sheet.indexOf('<hyperlinks>')).toBeLessThan(sheet.indexOf('<pageMargins'))
    expect(sheet.indexOf('</sheetData>')).toBeLessThan(sheet.indexOf('<hyperlinks>'))
    // 18.3.1.73 (row) and 18.3.1.81 (sheetFormatPr)
    expect(sheet).toMatch(/<row r="3"[^>]* hidden="1"[^>]* outlineLevel="2"/)
    expect(sheet).toContain('outlineLevelRow="2"')
    expect(sheet).not.toContain('collapsed')
  })

  it('are read from a link on several cells and from an outline with its control above', async () => {
    const workbook = new Workbook()
    const made = workbook.addWorksheet('S')
    made.addRows([[1], [2], [3]])
    made.getRow(2).outlineLevel = 1
    made.properties.outlineProperties = { summaryBelow: false, summaryRight: true }
    const parts = await unpack(new Uint8Array(await workbook.xlsx.writeBuffer()))
    const path = 'xl/worksheets/sheet1.xml'
    // without a relationship and with a name for its text, as other programs write it
    const link = '<hyperlinks><hyperlink ref="A1:A2" location="S!A3" display="3"/></hyperlinks>'
    parts[path] = new TextEncoder().encode(textOf(parts, path).replace('<pageMargins', `${link}<pageMargins`))
    await openWorkbook(grid, await pack(parts), settings)
    const found = ['A1', 'A2', 'A3'].map((address) => linkOf(cell(address)))
    expect(found).toEqual([{ documentReference: 'S!A3' }, { documentReference: 'S!A3' }, null])
    expect(levels(3)).toEqual([0, 1, 0])
    const { bytes } = await again()
    expect(textOf(await unpack(bytes), path)).toContain('<outlinePr summaryBelow="0" summaryRight="1"/>')
  })
})

describe('settings', () => {
  it('travel with the file, whatever their length, and show nowhere', async () => {
    await show({ A1: { v: 1 } })
    settings.set('link', { ranges: ['A', 'B'], on: true })
    settings.set('long', 'é'.repeat(100_000))
    const bytes = await saveWorkbook(grid, settings)
    settings.clear()
    settings.set('of another workbook', 1)
    await openWorkbook(grid, bytes, settings)
    expect([...settings.keys()]).toEqual(['link', 'long'])
    expect(settings.get('link')).toEqual({ ranges: ['A', 'B'], on: true })
    expect(settings.get('long')).toBe('é'.repeat(100_000))
    expect(
      book()
        .getSheets()
        .map((sheet) => sheet.getSheetName()),
    ).toEqual(['My sheet'])
    expect((await parsed(bytes)).getWorksheet('Counterpoise settings')?.state).toBe('veryHidden')
  })
})

describe('what is not kept', () => {
  it('is said in one sentence', async () => {
    const workbook = new Workbook()
    const sheet = workbook.addWorksheet('S')
    sheet.getCell('A1').value = { richText: [{ text: 'a' }, { text: 'b', font: { bold: true } }] }
    sheet.getCell('A2').note = 'a note'
    sheet.addConditionalFormatting({
      ref: 'A1:A2',
      rules: [{ type: 'cellIs', operator: 'greaterThan', formulae: [1], priority: 1, style: {} }],
    })
    sheet.getCell('A3').dataValidation = { type: 'whole', operator: 'between', formulae: [1, 2] }
    const report = await openWorkbook(grid, new Uint8Array(await workbook.xlsx.writeBuffer()), settings)
    expect(cell('A1').v).toBe('ab')
    expect(sentenceOf(report)).toBe(
      'Opened 1 sheet. Not kept here: 1 sheet with comments, 1 cell with formats on part of its text, 1 conditional format, 1 data validation.',
    )
  })

  it('a file that is no workbook is refused, and the grid keeps what it has', async () => {
    await show({ A1: { v: 'mine' } })
    settings.set('mine', 1)
    await expect(openWorkbook(grid, new TextEncoder().encode('Name,Weight'), settings)).rejects.toThrow(
      'The file is not an .xlsx workbook that can be read here.',
    )
    expect(cell('A1').v).toBe('mine')
    expect(settings.get('mine')).toBe(1)
  })
})

describe('another program', () => {
  itInCalc('LibreOffice opens a saved file with the same values, and its own file comes back', async () => {
    await show({
      A1: { v: 'Größe, "x"' },
      A2: { v: 0.125 },
      A3: { v: 3 },
      B1: { v: '=1+1', t: CellValueType.FORCE_STRING },
      C1: { f: '=TRANSPOSE(A2:A3)' },
    })
    const link = { documentReference: "'My sheet'!A3" }
    book().getActiveSheet().getRange('A1').setValue(withLink(link))
    const rows = book().getActiveSheet().getSheet().getConfig().rowData
    for (const row of [1, 2]) rows[row] = withLevel(row)
    // The name first: a formula entered before it stays #NAME? in the engine.
    book().insertDefinedName('Half', '=0.5')
    book().getActiveSheet().getRange('B2').setValue({ f: '=SUM(A2:A3)*Half' })
    await calculated()
    settings.set('kept', 1)
    const found = await recalculated(new Uint8Array(await saveWorkbook(grid, settings)))
    // all of them have at most 15 digits
    const expected = ['Größe, "x"', '=1+1', 1.5625, 0.125, 3]
    const addresses = ['A1', 'B1', 'B2', 'C1', 'D1']
    expect(addresses.map((address) => found.value('My sheet', address))).toEqual(expected)
    // And what it writes itself is opened here, with the same values and the same names.
    const report = await openWorkbook(grid, await pack(found.parts), settings)
    expect(sentenceOf(report)).toBe('Opened 1 sheet.')
    expect(addresses.map((address) => cell(address).v)).toEqual(expected)
    expect(
      book()
        .getDefinedNames()
        .map((name) => [name.getName(), name.getFormulaOrRefString()]),
    ).toEqual([['Half', '=0.5']])
    expect(settings.get('kept')).toBe(1)
    expect(linkOf(cell('A1'))).toEqual(link)
    const { rowData } = book().getActiveSheet().getSheet().getConfig()
    expect([0, 1, 2].map((row) => levelOf(rowData[row]))).toEqual([0, 1, 2])
  })
})

/**
 * Charts and printed pages in .xlsx files.
 *
 * Values are echoed, so they are compared exactly. What a file must contain is stated from ECMA-376 part 1 (from memory), with the
 * paragraph beside it; what another program makes of it is asked of LibreOffice where it is installed.
 */
import { Workbook } from '@cj-tech-master/excelts/browser'
import type { ICellData } from '@univerjs/core'
import { openWorkbook, saveWorkbook, sentenceOf } from '../../src/desk/files'
import { namesIn, pack, textOf, unpack } from '../../src/desk/files/archive'
import { headlessGrid, type Grid } from '../../src/desk/grid'
import { chartsOf, pageOf, withDrawn, type SheetChart, type SheetPage } from '../../src/desk/office'
import { itInCalc, pagesOf, recalculated } from '../calc'

let grid: Grid
beforeEach(() => (grid = headlessGrid()))
afterEach(() => grid.dispose())

const book = () => {
  const active = grid.api.getActiveWorkbook()
  if (!active) throw new Error('no workbook')
  return active
}
const config = (name = "Board's page") => {
  const sheet = book().getSheetByName(name)
  if (!sheet) throw new Error(`no sheet ${name}`)
  return sheet.getSheet().getConfig()
}

const on = (reference: string): string => `'Board''s page'!${reference}`
const bars: SheetChart = {
  name: 'Weight & share of risk: <North> runs most of it.',
  kind: 'bars',
  title: 'Weight and share of risk',
  from: { row: 8, column: 0 },
  to: { row: 22, column: 4 },
  categories: on('$A$2:$A$5'),
  series: [
    { name: 'Weight', values: on('$B$2:$B$5'), look: 'outline' },
    { name: 'Share of risk', values: on('$C$2:$C$5'), look: 'solid' },
  ],
  format: '0%',
  reversed: true,
  legend: true,
}
const columns: SheetChart = {
  ...bars,
  name: 'The same as columns.',
  kind: 'columns',
  title: '',
  from: { row: 8, column: 4, x: 12, y: 3.5 },
  to: { row: 22, column: 8, x: 1 },
  reversed: false,
  legend: false,
}
const waterfall: SheetChart = {
  ...columns,
  name: 'From one date to the other.',
  kind: 'stacked columns',
  title: 'What changed',
  series: [
    { name: 'Under', values: on('$B$2:$B$5'), look: 'unseen' },
    { name: 'Up', values: on('$C$2:$C$5'), look: 'outline' },
    { name: 'Down', values: on('$C$2:$C$5'), look: 'solid' },
  ],
  legend: true,
  minimum: 0.05,
}
const line: SheetChart = {
  ...columns,
  name: 'Risk through time.',
  kind: 'line',
  title: 'Risk through time',
  categories: on('$D$2:$D$5'),
  series: [
    { name: 'Volatility', values: on('$E$2:$E$5'), look: 'solid' },
    { name: 'Limit', values: on('$B$2:$B$5'), look: 'outline' },
  ],
  format: '0.0%',
}
const page: SheetPage = {
  paper: 'A4',
  orientation: 'Landscape',
  zoom: { horizontalFitToPages: 1, verticalFitToPages: null },
  margins: { left: 36, top: 40.5 },
  texts: { leftHeader: 'Board && co. 5%', rightHeader: '2026-11-30', rightFooter: 'Page &P of &N' },
  printArea: '$A$1:$H$24',
  titleRows: '$1:$2',
  titleColumns: '$A:$A',
  centerHorizontally: true,
}

/** A sheet with four holdings and their figures, in the workbook beside one of returns. */
async function show(charts: readonly SheetChart[], printed: SheetPage): Promise<void> {
  const rows: (string | number | null)[][] = [
    ['Holding', 'Weight', 'Share', 'Date', 'Volatility'],
    ['North', 0.4, null, 46_000, 0.081],
    ['South', 0.3, null, 46_030, 0.084],
    ['East', 0.2, null, 46_060, null],
    ['West', -0.1, null, 46_090, 0.079],
  ]
  const cellData: Record<number, Record<number, ICellData>> = {}
  rows.forEach((row, r) => {
    const cells: Record<number, ICellData> = {}
    row.forEach((v, c) => {
      if (v !== null) cells[c] = { v, ...(c === 3 && r > 0 ? { s: { n: { pattern: 'yyyy-mm-dd' } } } : {}) }
    })
    cellData[r] = cells
  })
  for (const row of [1, 2, 3, 4])
    cellData[row]![2] = { f: `=B${row + 1}/SUM($B$2:$B$5)`, s: { n: { pattern: '0.0%' } } }
  grid.api.disposeUnit(book().getId())
  grid.api.createWorkbook({
    id: 'made',
    name: 'Made',
    sheetOrder: ['other', 'page'],
    sheets: {
      other: {
        id: 'other',
        name: 'Returns',
        rowCount: 400,
        columnCount: 20,
        cellData: { 300: { 0: { v: 1 } } },
      },
      page: {
        id: 'page',
        name: "Board's page",
        rowCount: 100,
        columnCount: 30,
        cellData,
        ...withDrawn({ charts, page: printed }),
      },
    },
  })
  book().insertDefinedName('Net', on('$B$2:$B$5'))
  await grid.api.getFormula().onCalculationResultApplied()
}

const saved = async () => new Uint8Array(await saveWorkbook(grid, new Map()))
const opened = async (bytes: Uint8Array) => sentenceOf(await openWorkbook(grid, bytes, new Map()))

it('charts of every kind and the page come back as they were', async () => {
  const charts = [bars, columns, waterfall, line]
  await show(charts, page)
  expect(await opened(await saved())).toBe('Opened 2 sheets.')
  expect(chartsOf(config())).toEqual(charts)
  expect(pageOf(config())).toEqual(page)
  expect([chartsOf(config('Returns')), pageOf(config('Returns'))]).toEqual([[], {}])
})

it('a page set to a scale, and a sheet that is not set up, come back as they were', async () => {
  for (const printed of [{ zoom: { scale: 80 }, paper: 'Letter', printGridlines: true }, {}] as const) {
    await show([], printed)
    expect(await opened(await saved())).toBe('Opened 2 sheets.')
    expect(pageOf(config())).toEqual(printed)
  }
})

it('stand in the file as the format has them', async () => {
  await show([bars, line], page)
  const parts = await unpack(await saved())
  const sheet = textOf(parts, 'xl/worksheets/sheet2.xml')
  // 18.3.1.99 (worksheet): the page's parts, then the drawing
  const order = ['<printOptions', '<pageMargins', '<pageSetup', '<headerFooter', '<drawing']
  expect(order.map((name) => sheet.indexOf(name))).toEqual(
    order.map((name) => sheet.indexOf(name)).sort((a, b) => a - b),
  )
  expect(order.every((name) => sheet.includes(name))).toBe(true)
  // 18.3.1.46 (headerFooter): sections by &L, &C, &R; a sign that is printed stands twice
  expect(sheet).toContain('<oddFooter>&amp;RPage &amp;P of &amp;N</oddFooter>')
  // 18.3.1.63 (pageSetup): 9 is A4; 0 pages tall is as many as it takes; 18.3.1.65 (pageSetUpPr)
  expect(sheet).toMatch(/<pageSetup paperSize="9" orientation="landscape"[^>]* fitToHeight="0"/)
  expect(sheet).toContain('<pageSetUpPr fitToPage="1"/>')
  // 18.2.5 (definedName): names of the sheet that the program gives itself
  expect(textOf(parts, 'xl/workbook.xml').match(/<definedNames>/g)).toHaveLength(1)
  expect(namesIn(parts)).toEqual([
    { name: 'Net', formula: "'Board''s page'!$B$2:$B$5" },
    { name: '_xlnm.Print_Area', formula: "'Board''s page'!$A$1:$H$24", sheet: 1 },
    { name: '_xlnm.Print_Titles', formula: "'Board''s page'!$A:$A,'Board''s page'!$1:$2", sheet: 1 },
  ])
  // 20.5.2.33 (twoCellAnchor), 20.1.2.2.8 (cNvPr: descr is the alternative text)
  const name = 'Weight &amp; share of risk: &lt;North&gt; runs most of it.'
  expect(textOf(parts, 'xl/drawings/drawing1.xml')).toContain(`name="${name}" descr="${name}"`)
  const chart = textOf(parts, 'xl/charts/chart1.xml')
  // 21.2.2.16 (barChart), 21.2.2.17 (barDir): bars that lie across
  expect(chart).toContain('<c:barDir val="bar"/><c:grouping val="clustered"/>')
  // 21.2.2.134 (orientation) and 21.2.2.33 (crosses): the first category on top, the values' axis at the bottom all the same
  expect(chart).toContain('<c:orientation val="maxMin"/>')
  expect(chart).toContain('<c:crosses val="max"/>')
  // 21.2.2.65 (f) with a copy of what stands there, 21.2.2.121 (numCache)
  expect(chart).toContain(
    '<c:f>&apos;Board&apos;&apos;s page&apos;!$C$2:$C$5</c:f><c:numCache><c:formatCode>0.0%',
  )
  expect(chart).toContain('<c:ptCount val="4"/><c:pt idx="0"><c:v>0.5</c:v></c:pt>')
  // a figure that is not there leaves its place free, and dates are shown in the format of their cells
  const second = textOf(parts, 'xl/charts/chart2.xml')
  expect(second).toContain('<c:pt idx="1"><c:v>0.084</c:v></c:pt><c:pt idx="3"><c:v>0.079</c:v></c:pt>')
  expect(second).toContain('<c:numFmt formatCode="yyyy-mm-dd" sourceLinked="1"/>')
})

describe("another program's charts", () => {
  /** The file of one chart with something in its part replaced. */
  async function changed(from: string | RegExp, to: string): Promise<string> {
    await show([bars], {})
    const parts = await unpack(await saved())
    const path = 'xl/charts/chart1.xml'
    const before = textOf(parts, path)
    parts[path] = new TextEncoder().encode(before.replace(from, to))
    expect(textOf(parts, path)).not.toBe(before)
    return opened(new Uint8Array(await pack(parts)))
  }

  it('are drawn with the looks of the desk, and it is said', async () => {
    expect(await changed('404040', 'C00000')).toBe(
      'Opened 2 sheets. Not kept here: colours, labels and lines of charts (their figures, title and place are kept).',
    )
    expect(chartsOf(config())).toEqual([bars])
  })

  it('are read whatever the prefix of their names', async () => {
    await show([bars], {})
    const parts = await unpack(await saved())
    const path = 'xl/charts/chart1.xml'
    const xml = textOf(parts, path)
      .replace(/<(\/?)c:/g, '<$1')
      .replace('xmlns:c=', 'xmlns=')
    parts[path] = new TextEncoder().encode(xml)
    await opened(new Uint8Array(await pack(parts)))
    expect(chartsOf(config())).toEqual([bars])
  })

  it.each([
    ['that are no XML', '</c:chart>', ''],
    ['of another kind', /<(\/?)c:barChart>/g, '<$1c:radarChart>'],
    ['that stand on one another lying down', 'val="clustered"', 'val="stacked"'],
    ['that draw several blocks at once', '$C$2:$C$5</c:f>', '$C$2:$C$3,Returns!$A$1</c:f>'],
    ['whose series have different categories', '$A$2:$A$5</c:f>', '$A$2:$A$4</c:f>'],
  ])('%s are left, and it is said', async (_, from, to) => {
    expect(await changed(from, to)).toBe('Opened 2 sheets. Not kept here: 1 chart.')
    expect(chartsOf(config())).toEqual([])
  })
})

it('what of a page is not kept is said', async () => {
  const workbook = new Workbook()
  const sheet = workbook.addWorksheet('S', {
    headerFooter: { differentFirst: true, firstHeader: 'First', oddHeader: 'A && B &"Arial,Bold"C&R&D' },
    pageSetup: { paperSize: 70 as never },
  })
  sheet.getCell('A1').value = 1
  const bytes = new Uint8Array(await workbook.xlsx.writeBuffer())
  expect(await opened(bytes)).toBe('Opened 1 sheet. Not kept here: 2 print settings.')
  expect(pageOf(config('S'))).toEqual({
    texts: { centerHeader: 'A && B &"Arial,Bold"C', rightHeader: '&D' },
  })
})

describe('another program', () => {
  itInCalc(
    'LibreOffice opens a saved page with all it has, prints it on one page, and its own file comes back',
    async () => {
      const charts = [bars, line]
      await show(charts, { ...page, zoom: { horizontalFitToPages: 1, verticalFitToPages: 1 } })
      await book().addTable(
        config().id,
        'Holdings',
        { startRow: 0, endRow: 4, startColumn: 0, endColumn: 2 },
        'table-1',
      )
      const file = await saved()
      const found = await recalculated(file)
      expect(found.formula("Board's page", 'C2')).toBe('B2/SUM($B$2:$B$5)')
      // 0.4 / 0.8, computed here
      expect(found.value("Board's page", 'C2')).toBe(0.5)
      const parts = Object.keys(found.parts)
      expect(parts.filter((path) => /charts\/chart\d+\.xml/.test(path))).toHaveLength(2)
      expect(parts.filter((path) => /tables\/table\d+\.xml/.test(path))).toHaveLength(1)
      expect(textOf(found.parts, 'xl/styles.xml')).toContain('formatCode="0.0%"')
      const names = namesIn(found.parts).map(({ name, formula }) => `${name} ${formula}`)
      expect(names.sort()).toEqual([
        "Net 'Board''s page'!$B$2:$B$5",
        "_xlnm.Print_Area 'Board''s page'!$A$1:$H$24",
        "_xlnm.Print_Titles 'Board''s page'!$A:$A,'Board''s page'!$1:$2",
      ])
      expect((await pagesOf(file, { sheet: "Board's page", keep: 'counterpoise-page' })).count).toBe(1)

      const theirs = new Uint8Array(await pack(found.parts))
      expect(await opened(theirs)).toBe(
        'Opened 2 sheets. Not kept here: colours, labels and lines of charts (their figures, title and place are kept).',
      )
      const alike = (chart: SheetChart) => ({ ...chart, from: null, to: null })
      expect(chartsOf(config()).map(alike)).toEqual(charts.map(alike))
      expect(pageOf(config())).toMatchObject({
        orientation: 'Landscape',
        printArea: '$A$1:$H$24',
        paper: 'A4',
      })
    },
  )
})

/** What a report needs of the workbook besides cells: charts, the page, a sheet out of sight. All numbers are the tests' own. */
import { chartsOf, pageOf } from '../../src/desk/office'
import type { Fault } from '../../src/core'
import { excelWorkbook } from '../../src/excel'
import type { Area, PageSetup, Span, Table, TableChart, WritePlan } from '../../src/sheet'
import { blank, closeAll, number, open, refusal, tableOf, text } from './workbook-fixture'

jest.setTimeout(120_000)
afterEach(closeAll)

const at = { sheet: 'Report', row: 2, column: 1 }

const span = (row: number, column: number, rows: number, columns: number): Span => ({
  row,
  column,
  rows,
  columns,
})

const shares = (chart: Partial<TableChart> = {}): TableChart => ({
  kind: 'bars',
  title: 'Largest',
  alt: 'Bar chart: the weight and the share of risk of the three largest.',
  over: span(5, 0, 8, 3),
  categories: span(1, 0, 3, 1),
  series: [
    { name: 'Weight', values: span(1, 1, 3, 1) },
    { name: 'Share of risk', values: span(1, 2, 3, 1) },
  ],
  format: '0%',
  ...chart,
})

const page: PageSetup = {
  paper: 'Letter',
  orientation: 'portrait',
  onePage: true,
  header: { left: 'Book of Alder & Beech', right: 'Data to 2024-05-31' },
  footer: 'An estimate, not advice.',
}

/** Three holdings with a chart of them, on a page. */
function report(
  charts: readonly TableChart[] = [shares()],
  setUp: PageSetup | null = page,
  weight = 0.5,
): Table {
  const rows = [
    [text('Holding', 'head'), text('Weight', 'head'), text('Share of risk', 'head')],
    [text('Alder'), number(weight), number(0.6)],
    [text('Beech'), number(0.3), number(0.3)],
    [text('Cedar'), number(0.2), number(0.1)],
    ...Array.from({ length: 9 }, () => [blank, blank, blank]),
  ]
  return { ...tableOf(rows), charts, ...(setUp && { page: setUp }) }
}

const ours: Area = { ...at, rows: 13, columns: 3 }

/** A plan that writes a report onto its own sheet. */
const plan = (table: Table, patch: { ours?: Area } = {}): WritePlan => ({
  sheet: 'Report',
  patches: [{ at, table, over: 'blank', ...patch }],
})

function opened() {
  const workbook = open()
  const config = (sheet: string) =>
    workbook.grid.api.getActiveWorkbook()?.getSheetByName(sheet)?.getSheet().getConfig() ?? {}
  return {
    ...workbook,
    charts: (sheet = 'Report') => chartsOf(config(sheet)),
    page: (sheet = 'Report') => pageOf(config(sheet)),
  }
}

describe('Charts of a table', () => {
  test('lie over its cells and draw its figures; the sentence that says what they show is their name', async () => {
    const { book, charts, office } = opened()
    await book.write(plan(report()))
    expect(charts()).toEqual([
      {
        name: 'Bar chart: the weight and the share of risk of the three largest.',
        kind: 'bars',
        title: 'Largest',
        from: { row: 7, column: 1 },
        to: { row: 15, column: 4 },
        categories: 'Report!$B$4:$B$6',
        // the weight is hollow beside a filled share of risk: told apart in black and white
        series: [
          { name: 'Weight', values: 'Report!$C$4:$C$6', look: 'outline' },
          { name: 'Share of risk', values: 'Report!$D$4:$D$6', look: 'solid' },
        ],
        format: '0%',
        reversed: true,
        legend: true,
      },
    ])
    expect(await book.recall()).toEqual({})
    expect([...office.settings.keys()]).toEqual(['counterpoise.drawn'])
  })

  test.each([
    [
      'columns of one series are filled and need no legend',
      { kind: 'columns', series: [{ name: 'Weight', values: span(1, 1, 3, 1) }] },
      ['solid'],
      false,
    ],
    [
      'steps of stacked columns stand on one that is not drawn',
      {
        kind: 'stacked columns',
        series: [
          { name: 'below', values: span(1, 1, 3, 1), unseen: true },
          { name: 'Up', values: span(1, 1, 3, 1) },
          { name: 'Down', values: span(1, 2, 3, 1) },
        ],
      },
      ['unseen', 'solid', 'outline'],
      true,
    ],
    ['the second line is broken', { kind: 'line' }, ['solid', 'outline'], true],
  ] as const)('%s', async (_, chart, looks, legend) => {
    const { book, charts } = opened()
    await book.write(plan(report([shares(chart as Partial<TableChart>)])))
    expect(charts()[0]).toMatchObject({ kind: chart.kind, legend, reversed: false })
    expect(charts()[0]?.series.map(({ look }) => look)).toEqual(looks)
  })

  test('two of one sentence have names that differ', async () => {
    const { book, charts } = opened()
    await book.write(plan(report([shares(), shares({ kind: 'columns' })])))
    const { alt } = shares()
    expect(charts().map(({ name }) => name)).toEqual([alt, `${alt} (2)`])
  })

  test('stay as they are, with what their user made of them, when a second write draws the same of the same cells', async () => {
    const { book, charts, office } = opened()
    await book.write(plan(report()))
    await office.Excel.run(async (context) => {
      const chart = context.workbook.worksheets.getItem('Report').charts.getItemAt(0)
      chart.title.text = 'my own title'
      chart.setPosition('H1', 'L9')
      await context.sync()
    })
    await book.write(plan(report([shares({ alt: 'Bar chart of June.' })], page, 0.4), { ours }))
    expect(charts()).toHaveLength(1)
    expect(charts()[0]).toMatchObject({
      name: 'Bar chart of June.',
      title: 'my own title',
      from: { row: 0, column: 7 },
    })
  })

  test('are replaced when they draw something else, and the user’s own stays', async () => {
    const { book, charts, office } = opened()
    await book.write(plan(report([shares(), shares({ kind: 'columns', alt: 'Column chart.' })])))
    await office.Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem('Report')
      sheet.charts.add('Line', sheet.getRange('C4:C6')).name = 'mine'
      await context.sync()
    })
    await book.write(plan(report([shares({ kind: 'line', alt: 'Line chart.' })]), { ours }))
    expect(charts().map(({ name, kind }) => [name, kind])).toEqual([
      ['mine', 'line'],
      ['Line chart.', 'line'],
    ])
    await book.write(plan(report([]), { ours }))
    expect(charts().map(({ name }) => name)).toEqual(['mine'])
    expect(office.settings.size).toBe(0)
  })

  test('are known again after rows came above them, their sheet got another name and the workbook was opened anew', async () => {
    const { book, charts, user } = opened()
    await book.write(plan(report()))
    user.insertRows('Report', 1, 3)
    user.renameSheet('Report', 'June')
    const moved = { sheet: 'June', row: 5, column: 1 }
    await excelWorkbook().write({
      patches: [
        {
          at: moved,
          table: report([shares({ kind: 'columns', alt: 'Column chart.' })]),
          over: 'blank',
          ours: { ...ours, ...moved },
        },
      ],
    })
    expect(book).toBeDefined()
    expect(charts('June').map(({ name, categories }) => [name, categories])).toEqual([
      ['Column chart.', 'June!$B$7:$B$9'],
    ])
  })

  test('that their user deleted are drawn again, and one deleted with its sheet is forgotten', async () => {
    const { book, charts, user, office } = opened()
    await book.write(plan(report()))
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.getItem('Report').charts.getItemAt(0).delete()
      await context.sync()
    })
    await book.write(plan(report(), { ours }))
    expect(charts()).toHaveLength(1)
    user.deleteSheet('Report')
    await book.write(plan(report()))
    expect(charts()).toHaveLength(1)
    expect(office.settings.get('counterpoise.drawn')).toHaveLength(1)
  })

  test('that the host made and had no time to name are taken away again', async () => {
    const bare: WritePlan = {
      patches: [{ at: { ...at, sheet: 'Sheet1' }, table: report([shares()], null), over: 'blank' }],
    }
    const probe = opened()
    await probe.book.write(bare)
    const { operations } = probe.office.counts
    const { book, office, portrait, settle } = opened()
    const before = portrait()
    const locations: unknown[] = []
    // the naming of a chart is the first of what makes it up: looked for from about there
    for (
      let operation = operations - 41;
      !locations.includes('Chart.name') && operation < operations;
      operation++
    ) {
      office.faults.beforeOperation(operation)
      const fault = await book.write(bare).catch((error: unknown) => error as Fault)
      await settle()
      const { debugInfo } = ((fault as Fault).cause as Fault).cause as OfficeExtension.Error
      locations.push(debugInfo.errorLocation)
      expect(portrait()).toEqual(before)
    }
    expect(locations).toContain('Chart.name')
  })

  test('a list of charts that somebody has spoilt is none of ours', async () => {
    const { book, charts, office } = opened()
    office.settings.set('counterpoise.drawn', [null, { name: 4 }, 'spoilt'])
    await book.write(plan(report()))
    expect(charts()).toHaveLength(1)
  })
})

describe('The page of a table', () => {
  test('is set up with the table as what is printed, its texts free of codes', async () => {
    const { book, page: kept } = opened()
    await book.write(plan(report([], { ...page, repeatedRows: 2, orientation: 'landscape', onePage: false })))
    expect(kept()).toEqual({
      orientation: 'Landscape',
      paper: 'Letter',
      zoom: { scale: null, horizontalFitToPages: 1, verticalFitToPages: null },
      margins: { top: 54, bottom: 54, left: 36, right: 36, header: 22, footer: 22 },
      printArea: '$B$3:$D$15',
      titleRows: '$3:$4',
      texts: {
        leftHeader: 'Book of Alder && Beech',
        centerHeader: '',
        rightHeader: 'Data to 2024-05-31',
        leftFooter: 'An estimate, not advice.',
        centerFooter: '',
        rightFooter: 'Page &P of &N',
      },
    })
  })

  test('fits one page where it is to', async () => {
    const { book, page: kept } = opened()
    await book.write(plan(report([])))
    expect(kept().zoom).toEqual({ scale: null, horizontalFitToPages: 1, verticalFitToPages: 1 })
    expect(kept().titleRows).toBeUndefined()
  })

  test('is left alone by a host that does not know it', async () => {
    const { book, page: kept, office, cells } = opened()
    const { requirements } = office.Office.context
    const known = requirements.isSetSupported.bind(requirements)
    Object.assign(requirements, {
      isSetSupported: (name: string, version: string) => version !== '1.9' && known(name, version),
    })
    await book.write(plan(report([])))
    expect(kept()).toEqual({})
    expect((await cells('Report', 'B3')).values).toEqual([['Holding']])
  })
})

describe('A sheet out of sight', () => {
  const hidden: WritePlan = {
    sheet: 'Records',
    outOfSight: true,
    patches: [
      {
        at: { sheet: 'Records', row: 0, column: 0 },
        table: tableOf([[text('=kept'), number(1)]]),
        over: 'blank',
      },
    ],
  }
  const seen = { sheet: 'Records', row: 0, column: 0, rows: 1, columns: 2 }

  test('is made, read and written like any other, and is in no list of sheets', async () => {
    const { book, portrait } = opened()
    await book.write(hidden)
    expect(await book.sheets()).toEqual(['Sheet1'])
    expect(portrait().sheets?.find(({ name }) => name === 'Records')?.visibility).toBe('veryHidden')
    expect((await book.read(seen)).values).toEqual([['=kept', 1]])
    await book.write({
      patches: [{ at: seen, table: tableOf([[text('more'), number(2)]]), over: 'blank', ours: seen }],
    })
    expect((await book.look([{ at: seen, values: true }]))[0]?.values).toEqual([['more', 2]])
    expect(portrait().sheets?.find(({ name }) => name === 'Records')?.visibility).toBe('veryHidden')
  })

  test('that is there already stays as visible as its user made it', async () => {
    const { book, office } = opened()
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.add('Records')
      await context.sync()
    })
    await book.write(hidden)
    expect(await book.sheets()).toEqual(['Sheet1', 'Records'])
  })

  test('leaves other writes one step of undo each', async () => {
    const { book, user, cells, settle } = opened()
    await book.write(hidden)
    await book.write({
      patches: [{ at: { ...at, sheet: 'Sheet1' }, table: report([], null), over: 'blank' }],
    })
    await settle()
    user.undo()
    await settle()
    expect((await cells('Sheet1', 'B3:B4')).values).toEqual([[''], ['']])
  })
})

test('a page of ninety rows and twelve columns with three charts goes in by one request that changes something', async () => {
  const { book, office, charts } = opened()
  const rows = Array.from({ length: 90 }, (_, r) =>
    Array.from({ length: 12 }, (_, c) =>
      r % 9 === 0 ? text(`Part ${r}`, 'head') : c % 4 === 0 ? text(`Holding ${r}`) : number(r / 90 + c),
    ),
  )
  const three = (['bars', 'stacked columns', 'line'] as const).map((kind, k) =>
    shares({ kind, alt: `Chart ${k} of the page.`, over: span(20 * k, 0, 18, 6) }),
  )
  office.counts.reset()
  await book.write({
    sheet: 'Report',
    patches: [
      { at: { ...at, row: 0, column: 0 }, table: { ...tableOf(rows), charts: three, page }, over: 'blank' },
    ],
  })
  expect(office.counts.writes).toBe(1)
  expect(charts()).toHaveLength(3)
})

describe('Before anything is changed', () => {
  test('a protected sheet is refused', async () => {
    const { book, office, portrait, settle } = opened()
    await book.write(plan(report()))
    office.protect('Report', true)
    await settle()
    const before = portrait()
    office.counts.reset()
    expect(await refusal(book.write(plan(report([shares({ kind: 'line' })]), { ours })))).toMatchObject({
      code: 'protected',
    })
    expect(office.counts.writes).toBe(0)
    expect(portrait()).toEqual(before)
  })

  test('foreign cells are refused', async () => {
    const { book, office, user, portrait, settle } = opened()
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.add('Report')
      await context.sync()
    })
    user.type('Report', 'C5', 'mine')
    await settle()
    const before = portrait()
    office.counts.reset()
    expect(await refusal(book.write(plan(report())))).toMatchObject({
      code: 'occupied',
      message: expect.stringContaining('Report!C5') as string,
    })
    expect(office.counts.writes).toBe(0)
    expect(portrait()).toEqual(before)
  })
})

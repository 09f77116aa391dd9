/**
 * Charts as the stand-in has them. The members and what they refuse are those of @types/office-js (Excel.Chart, ChartCollection, ChartSeries,
 * ChartSeriesCollection, ChartAxis, ChartLegend, ChartFill, ChartLineFormat); what a new chart begins with is from memory. Nothing here ran
 * against Excel itself. All numbers are the tests' own.
 */
import { chartsOf, createOffice, userOf } from '../../src/desk/office'
import { headlessGrid } from '../../src/desk/grid'

const opened: { dispose(): void }[] = []
afterEach(() => opened.splice(0).forEach((grid) => grid.dispose()))

const code = (promise: Promise<unknown>) =>
  promise.then(
    () => 'fulfilled',
    (error: unknown) => (error as { code?: string }).code ?? String(error),
  )

/** A workbook with names in A1:A3, weights in B1:B3 and shares in C1:C3 of Sheet1. */
async function desk() {
  const grid = headlessGrid()
  opened.push(grid)
  const office = createOffice(grid)
  const { Excel } = office
  await Excel.run(async (context) => {
    context.workbook.worksheets.getItem('Sheet1').getRange('A1:C3').values = [
      ['Alder', 0.5, 0.6],
      ['Beech', 0.3, 0.3],
      ['Cedar', 0.2, 0.1],
    ]
    await context.sync()
  })
  const kept = (sheet = 'Sheet1') =>
    chartsOf(grid.api.getActiveWorkbook()?.getSheetByName(sheet)?.getSheet().getConfig() ?? {})
  /** Does something with a sheet in a request of its own. */
  const on = (work: (sheet: Excel.Worksheet) => void, name = 'Sheet1') =>
    Excel.run(async (context) => {
      work(context.workbook.worksheets.getItem(name))
      await context.sync()
    })
  return { office, Excel, user: userOf(grid), kept, on }
}

/** Bars of two series over E2:H10. */
function bars(sheet: Excel.Worksheet): Excel.Chart {
  const chart = sheet.charts.add('BarClustered', sheet.getRange('B1:B3'), 'Columns')
  chart.name = 'Weight and share of risk'
  chart.title.text = 'Largest'
  chart.setPosition('E2', 'H10')
  const first = chart.series.getItemAt(0)
  first.name = 'Weight'
  first.setXAxisValues(sheet.getRange('A1:A3'))
  first.format.fill.clear()
  first.format.line.color = '#262626'
  const second = chart.series.add('Share of risk')
  second.setValues(sheet.getRange('C1:C3'))
  second.setXAxisValues(sheet.getRange('A1:A3'))
  chart.axes.categoryAxis.reversePlotOrder = true
  chart.axes.valueAxis.numberFormat = '0%'
  chart.axes.valueAxis.minimum = -0.25
  return chart
}

const drawnBars = {
  name: 'Weight and share of risk',
  kind: 'bars',
  title: 'Largest',
  from: { row: 1, column: 4 },
  to: { row: 10, column: 8 },
  categories: 'Sheet1!$A$1:$A$3',
  series: [
    { name: 'Weight', values: 'Sheet1!$B$1:$B$3', look: 'outline' },
    { name: 'Share of risk', values: 'Sheet1!$C$1:$C$3', look: 'solid' },
  ],
  format: '0%',
  reversed: true,
  legend: true,
  minimum: -0.25,
}

test('a chart is kept with its sheet as it was described', async () => {
  const { on, kept } = await desk()
  await on(bars)
  expect(kept()).toEqual([drawnBars])
})

test('charts are found by name and place, counted, told and deleted', async () => {
  const { Excel, on, kept } = await desk()
  await on(bars)
  await on((sheet) => void sheet.charts.add('Line', sheet.getRange('B1:C3')))
  await Excel.run(async (context) => {
    const { charts } = context.workbook.worksheets.getItem('Sheet1')
    charts.load('items/name,items/chartType,count')
    const second = charts.getItemAt(1)
    second.series.load('items/name')
    const none = charts.getItemOrNullObject('No such')
    none.load('name')
    await context.sync()
    expect(charts.items.map(({ name, chartType }) => [name, chartType])).toEqual([
      ['Weight and share of risk', 'BarClustered'],
      ['Chart 1', 'Line'],
    ])
    expect([charts.count, none.isNullObject]).toEqual([2, true])
    expect(second.series.items.map(({ name }) => name)).toEqual(['Series1', 'Series2'])
    charts.getItem('Weight and share of risk').delete()
    await context.sync()
    charts.getItem('Weight and share of risk')
    expect(await code(context.sync())).toBe('ItemNotFound')
  })
  expect(kept().map(({ name }) => name)).toEqual(['Chart 1'])
})

test('nothing of it is there before the sync, and properties that were not loaded cannot be read', async () => {
  const { Excel, kept } = await desk()
  await Excel.run(async (context) => {
    const chart = bars(context.workbook.worksheets.getItem('Sheet1'))
    expect(kept()).toEqual([])
    expect(() => chart.chartType).toThrow(expect.objectContaining({ code: 'PropertyNotLoaded' }))
    await context.sync()
    expect(kept()).toHaveLength(1)
  })
})

test.each([
  [
    'a second chart of one name',
    'InvalidArgument',
    (sheet: Excel.Worksheet) => void (bars(sheet), bars(sheet)),
  ],
  [
    'a kind it does not draw',
    'NotImplemented',
    (sheet: Excel.Worksheet) => void sheet.charts.add('Pie', sheet.getRange('B1:B3')),
  ],
  [
    'a series of a whole block',
    'InvalidArgument',
    (sheet: Excel.Worksheet) => bars(sheet).series.getItemAt(0).setValues(sheet.getRange('A1:C3')),
  ],
  [
    'other categories for a second series',
    'NotImplemented',
    (sheet: Excel.Worksheet) => bars(sheet).series.getItemAt(1).setXAxisValues(sheet.getRange('A1:A2')),
  ],
  [
    'a series that is not there',
    'ItemNotFound',
    (sheet: Excel.Worksheet) => void bars(sheet).series.getItemAt(2),
  ],
  [
    'a name of more than 255 characters for a series',
    'InvalidArgument',
    (sheet: Excel.Worksheet) => void (bars(sheet).series.getItemAt(0).name = 'x'.repeat(256)),
  ],
  [
    'what is no colour',
    'InvalidArgument',
    (sheet: Excel.Worksheet) => void (bars(sheet).series.getItemAt(0).format.line.color = 'inky'),
  ],
])('the stand-in refuses %s', async (_, refused, work) => {
  const { on } = await desk()
  expect(await code(on(work))).toBe(refused)
})

test('a protected sheet takes no chart and keeps those it has', async () => {
  const { on, office, kept } = await desk()
  await on(bars)
  office.protect('Sheet1', true)
  expect(await code(on((sheet) => void sheet.charts.add('Line', sheet.getRange('B1:B3'))))).toBe(
    'AccessDenied',
  )
  expect(await code(on((sheet) => sheet.charts.getItemAt(0).delete()))).toBe('AccessDenied')
  expect(kept()).toEqual([drawnBars])
})

test('fills and lines make a series solid, hollow or unseen, and a line whole or broken', async () => {
  const { on, kept } = await desk()
  await on((sheet) => {
    const columns = sheet.charts.add('ColumnStacked', sheet.getRange('A1:C3'), 'Columns')
    columns.series.getItemAt(0).format.fill.clear()
    columns.series.getItemAt(0).format.line.clear()
    columns.series.getItemAt(1).format.fill.clear()
    columns.series.getItemAt(1).format.line.lineStyle = 'Continuous'
    columns.series.getItemAt(2).format.fill.setSolidColor('#404040')
    const lines = sheet.charts.add('LineMarkers', sheet.getRange('A1:B3'), 'Columns')
    lines.series.getItemAt(1).format.line.lineStyle = 'Dash'
  })
  expect(kept().map(({ kind, series }) => [kind, series.map(({ look }) => look)])).toEqual([
    ['stacked columns', ['unseen', 'outline', 'solid']],
    ['line', ['solid', 'outline']],
  ])
})

test('a chart moves and stretches with its cells, and what it draws is followed, from other sheets too', async () => {
  const { Excel, on, kept, user } = await desk()
  await on(bars)
  await Excel.run(async (context) => {
    const there = context.workbook.worksheets.add('Report')
    there.charts.add('Line', context.workbook.worksheets.getItem('Sheet1').getRange('B1:B3'), 'Columns')
    await context.sync()
  })
  user.insertRows('Sheet1', 1, 2)
  user.insertRows('Sheet1', 6, 1)
  user.insertColumns('Sheet1', 1, 1)
  user.renameSheet('Sheet1', "The book's own")
  expect(kept("The book's own")).toEqual([
    {
      ...drawnBars,
      from: { row: 3, column: 5 },
      to: { row: 13, column: 9 },
      categories: "'The book''s own'!$B$3:$B$5",
      series: [
        { ...drawnBars.series[0], values: "'The book''s own'!$C$3:$C$5" },
        { ...drawnBars.series[1], values: "'The book''s own'!$D$3:$D$5" },
      ],
    },
  ])
  expect(kept('Report')[0]?.series[0]?.values).toBe("'The book''s own'!$C$3:$C$5")
  user.deleteRows("The book's own", 3, 3)
  expect(kept('Report')[0]?.series[0]?.values).toBe('#REF!')
})

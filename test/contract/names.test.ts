/** Names in the desk's workbook are what they are in the host's: formulas follow them. Numbers are typed for the test, compared exactly. */
import { openWorkbook, saveWorkbook } from '../../src/desk/files'
import { headlessGrid } from '../../src/desk/grid'
import { createOffice, userOf } from '../../src/desk/office'

test('a formula typed before its name exists follows it when it comes, changes and goes, and in the file opened again', async () => {
  const grid = headlessGrid()
  const settings = new Map<string, unknown>()
  const { Excel, settled, reset } = createOffice(grid, { settings })
  const user = userOf(grid)
  const value = () =>
    Excel.run(async (context) => {
      const range = context.workbook.worksheets.getItem('Sheet1').getRange('B2').load('values')
      await context.sync()
      return (range.values as unknown[][])[0]?.[0]
    })
  const name = (formula: string | null) =>
    Excel.run(async (context) => {
      if (formula === null) context.workbook.names.getItem('Half').delete()
      else context.workbook.names.add('Half', formula)
      await context.sync()
    }).then(settled)
  user.type('Sheet1', 'A2', [[1], [2]])
  user.type('Sheet1', 'B2', '=SUM(A2:A3)*half')
  await settled()
  expect(await value()).toBe('#NAME?')
  await name('=0.5')
  expect(await value()).toBe(1.5)
  await name(null)
  expect(await value()).toBe('#NAME?')
  await name('=0.25')
  expect(await value()).toBe(0.75)
  const { notCalculated } = await openWorkbook(grid, await saveWorkbook(grid, settings), settings)
  reset()
  expect(notCalculated).toEqual([])
  expect(await value()).toBe(0.75)
  user.type('Sheet1', 'A2', 4)
  await settled()
  expect(await value()).toBe(1.5)
  await settled()
  grid.dispose()
})

/**
 * The stand-in keeps the host's documented behaviours, one test each. Where the host's documentation says it, its page is named:
 *
 * - "Excel JavaScript object model", "Core concepts", "Error handling", "Events", "Ranges: unbounded", "Performance optimization",
 *   "Resource limits" and the reference of each member, at learn.microsoft.com/office/dev/add-ins (read).
 *
 * Numbers here are entered by the tests themselves; nothing is rounded, so they are compared exactly.
 */
import { createOffice, userOf, type OfficeOptions } from '../../src/desk/office'
import { headlessGrid } from '../../src/desk/grid'

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

afterAll(() => opened.forEach((grid) => grid.dispose()))

/** The code of the error a promise is rejected with. */
const code = (promise: Promise<unknown>) =>
  promise.then(
    () => 'fulfilled',
    (error: unknown) => (error as { code?: string }).code ?? String(error),
  )

describe('Requests', () => {
  test('operations wait for sync and then happen in order', async () => {
    const { Excel, read } = desk()
    await Excel.run(async (context) => {
      const cell = context.workbook.worksheets.getItem('Sheet1').getRange('A1')
      cell.values = [[1]]
      cell.load('values')
      cell.values = [[2]]
      const early = await read('A1')
      expect(early['values']).toEqual([['']])
      await context.sync()
      expect(cell.values).toEqual([[1]])
    })
    expect((await read('A1'))['values']).toEqual([[2]])
  })
})

import type { Browser, FrameLocator, Page } from 'playwright-core'
import { join } from 'node:path'
import { serve } from '../../src/build/server.cjs'
import type { Workspace } from '../../src/desk/page/workspace'

const dist = join(__dirname, '../../dist')

/** The desk in a browser window, and a user in front of it. */
export interface DeskPage {
  readonly page: Page
  readonly pane: FrameLocator
  /** what went wrong in the page, and what its content security policy refused */
  readonly complaints: string[]
  /** Goes to a range of the sheet in view by the name box, as a user who knows the address does. */
  goTo(address: string): Promise<void>
  /** Types into the selected cell and presses Enter. */
  type(text: string): Promise<void>
  /** Shows a sheet by its tab. */
  sheet(name: string): Promise<void>
  /** What a cell holds. */
  cell(sheet: string, address: string): Promise<unknown>
  cells(sheet: string, address: string): Promise<unknown[][]>
  close(): Promise<void>
}

/** Waits for something to come true, as long as a user would. */
export async function until<T>(
  look: () => Promise<T>,
  isDone: (seen: T) => boolean,
  what: string,
): Promise<T> {
  const end = Date.now() + 60_000
  for (;;) {
    const seen = await look()
    if (isDone(seen)) return seen
    if (Date.now() > end) throw new Error(`waited in vain for ${what}; last seen: ${JSON.stringify(seen)}`)
    await new Promise((resolve) => setTimeout(resolve, 100))
  }
}

export async function openDeskPage(browser: Browser): Promise<DeskPage> {
  const server = await serve(dist, { home: 'desk.html' })
  const page = await browser.newPage({ viewport: { width: 1400, height: 900 }, acceptDownloads: true })
  page.setDefaultTimeout(60_000)
  const complaints: string[] = []
  page.on('pageerror', (error) => complaints.push(String(error)))
  page.on('console', (message) => {
    if (message.type() === 'error') complaints.push(message.text())
  })
  await page.goto(server.url)
  const pane = page.frameLocator('#pane')
  await pane.getByRole('heading', { name: 'Holdings' }).waitFor()
  const cells = (sheet: string, address: string): Promise<unknown[][]> =>
    page.evaluate(
      async ([name, where]) => {
        const { workspace } = globalThis as unknown as { workspace: Workspace }
        return workspace.office.Excel.run(async (context) => {
          const range = context.workbook.worksheets.getItem(name).getRange(where).load('values')
          await context.sync()
          return range.values as unknown[][]
        })
      },
      [sheet, address] as const,
    )
  return {
    page,
    pane,
    complaints,
    cells,
    cell: async (sheet, address) => (await cells(sheet, address))[0]?.[0],
    async goTo(address) {
      const box = page.locator('[data-u-comp="defined-name"] input')
      await box.click()
      await box.fill(address)
      await box.press('Enter')
    },
    async type(text) {
      // the first key opens the cell; the rest comes at once, as by paste: the grid takes its time over each key of a formula
      await page.keyboard.type(text.slice(0, 1))
      await page.keyboard.insertText(text.slice(1))
      await page.keyboard.press('Enter')
    },
    async sheet(name) {
      await page.locator('[data-u-comp="slide-tab-item"]', { hasText: new RegExp(`^${name}$`) }).click()
    },
    async close() {
      await page.close({ runBeforeUnload: false })
      await server.close()
    },
  }
}

/** The desk with the demo's holdings and returns taken and computed, by mouse. */
export async function openComputedDemo(browser: Browser): Promise<DeskPage> {
  const desk = await openDeskPage(browser)
  const { pane } = desk
  await desk.sheet('Book')
  await desk.goTo('A4:G21')
  await pane.getByRole('button', { name: 'Use selection' }).first().click()
  await pane.getByText(/16 holdings, net/).waitFor()
  await desk.sheet('Returns')
  await desk.goTo('A1:Q261')
  await pane.getByRole('button', { name: 'Use selection' }).nth(1).click()
  await pane.getByText(/260 weekly returns/).waitFor()
  await pane.getByRole('button', { name: 'Compute' }).click()
  await pane.getByText('Up to date', { exact: true }).waitFor()
  return desk
}

/** The pane for people who use no mouse, and for those who need its colours and names right. */
import { readFileSync } from 'node:fs'
import type { AxeResults } from 'axe-core'
import type { Browser } from 'playwright-core'
import { launchChromium } from './chromium'
import { openDeskPage, type DeskPage } from './desk'

jest.setTimeout(240_000)

const axe = readFileSync(require.resolve('axe-core/axe.min.js'), 'utf8')

let browser: Browser
let desk: DeskPage
beforeAll(async () => {
  browser = await launchChromium()
  desk = await openDeskPage(browser)
})
afterAll(async () => {
  await desk.close()
  await browser.close()
})

/** Presses Tab in the pane until the focus is on something of that name; fails after a whole round. */
async function tabTo(name: RegExp): Promise<void> {
  for (let k = 0; k < 80; k++) {
    await desk.page.keyboard.press('Tab')
    const focused = await desk.page.evaluate(() => {
      const frame = document.activeElement as HTMLIFrameElement | null
      const element = frame?.contentDocument?.activeElement
      return element ? (element.getAttribute('aria-label') ?? element.textContent ?? '') : ''
    })
    if (name.test(focused)) return
  }
  throw new Error(`Tab never reached ${String(name)}`)
}

test('the whole main job goes by keyboard: take both blocks, compute, look, write', async () => {
  const { page, pane } = desk
  await desk.sheet('Book')
  await desk.goTo('A4:G21')
  await pane.getByRole('tab', { name: 'Data' }).focus()
  await tabTo(/^Use selection/)
  await page.keyboard.press('Enter')
  await pane.getByText(/16 holdings, net/).waitFor()
  await desk.sheet('Returns')
  await desk.goTo('A1:Q261')
  await pane.getByRole('button', { name: 'Use selection' }).nth(1).focus()
  await page.keyboard.press('Enter')
  await pane.getByText(/260 weekly returns/).waitFor()
  await page.keyboard.press('Control+Enter')
  await pane.getByText('Up to date', { exact: true }).waitFor()
  // computing from Data shows the figures
  await pane.getByRole('tab', { name: 'Risk', selected: true }).focus()
  await page.keyboard.press('End')
  await pane.getByRole('tab', { name: 'Report', selected: true }).waitFor()
  await pane.getByRole('button', { name: 'Write table' }).waitFor()
  await tabTo(/^Write table/)
  await page.keyboard.press('Enter')
  await pane.getByText(/^Table written to/).waitFor()
  expect(await desk.cell('Risk', 'A6')).toBe('Holding')
})

test('the sections behind the figures open by keyboard, and both studies run', async () => {
  const { page, pane } = desk
  await pane.getByRole('tab', { name: 'Report' }).focus()
  await page.keyboard.press('ArrowLeft')
  await pane.getByRole('tab', { name: 'Trades', selected: true }).waitFor()
  await page.keyboard.press('ArrowLeft')
  await pane.getByRole('tab', { name: 'Risk', selected: true }).waitFor()
  const open = async (section: string): Promise<void> => {
    await tabTo(new RegExp(`^${section}`))
    await page.keyboard.press('Enter')
    await pane.getByRole('button', { name: new RegExp(`^${section}`), expanded: true }).waitFor()
  }
  /** Runs a study of the section that was opened last; what is inside comes a moment after its heading. */
  const run = async (name: string): Promise<void> => {
    await pane.getByRole('button', { name }).waitFor()
    await tabTo(new RegExp(`^${name}`))
    await page.keyboard.press('Enter')
  }
  for (const section of ['Groups', 'Large losses', 'Against the benchmark', 'Normality']) await open(section)
  await open('How sure')
  await run('Run the bootstrap')
  await pane.getByText(/in closed form \(ratio/).waitFor()
  await open('Back-test')
  await run('Run the back-test')
  await pane.getByRole('img', { name: /against the value at risk/ }).waitFor()
})

describe.each(['Light', 'Dark', 'High contrast'])('In the %s theme', (theme) => {
  test.each(['Data', 'Risk', 'Trades', 'Report'])(
    'axe finds nothing to object to in the view %s',
    async (view) => {
      const { page, pane } = desk
      await page.getByRole('combobox').first().selectOption({ label: theme })
      await pane.getByRole('tab', { name: view }).click()
      for (const line of await pane.getByText('What it does, what can be done').all()) await line.click()
      await page.waitForTimeout(500)
      const frame = await (await page.locator('#pane').elementHandle())?.contentFrame()
      if (!frame) throw new Error('the pane has no frame')
      // the page's policy forbids a script tag; evaluating is the debugger's and passes it by
      await frame.evaluate(axe)
      const { violations, passes } = await frame.evaluate(async () => {
        const { axe: run } = globalThis as unknown as { axe: { run(): Promise<AxeResults> } }
        return run.run()
      })
      expect(violations.map(({ id, nodes }) => `${id}: ${nodes.map(({ html }) => html).join(' ')}`)).toEqual(
        [],
      )
      expect(passes.length).toBeGreaterThan(10)
    },
  )
})

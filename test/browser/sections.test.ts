/** What stands behind the figures, in the desk, in a browser: data checks, estimators, groups, large losses, benchmark, studies. */
import type { Browser } from 'playwright-core'
import type { Workspace } from '../../src/desk/page/workspace'
import { launchChromium } from './chromium'
import { openComputedDemo, until, type DeskPage } from './desk'

jest.setTimeout(240_000)

let browser: Browser
let desk: DeskPage
beforeAll(async () => {
  browser = await launchChromium()
  desk = await openComputedDemo(browser)
})
afterAll(async () => {
  await desk.close()
  await browser.close()
})

const show = async (view: 'Data' | 'Risk'): Promise<void> => {
  await desk.pane.getByRole('tab', { name: view }).click()
  await desk.pane.getByRole('tab', { name: view, selected: true }).waitFor()
}
const volatilityShown = async (): Promise<string> =>
  (await desk.pane
    .getByText(/^\d+\.\d\d%$/)
    .first()
    .textContent()) ?? ''
/** Opens a folded section unless it is open, and gives its heading's button. */
async function unfold(title: string) {
  const button = desk.pane.getByRole('button', { name: new RegExp(`^${title}`) })
  if ((await button.getAttribute('aria-expanded')) === 'false') await button.click()
  return button
}
const headline = async (title: string): Promise<string> =>
  (await desk.pane.getByRole('button', { name: new RegExp(`^${title}`) }).textContent()) ?? ''

test('the volatility that a data check promises is the one that its correction gives, and it can be taken back', async () => {
  const { pane } = desk
  await show('Risk')
  const before = await volatilityShown()
  await show('Data')
  const check = pane.getByRole('listitem').filter({ hasText: /Tidal power projects.*starts on/ })
  await check.getByText('What it does, what can be done').click()
  const promise = /Volatility (\S+) → (\d+\.\d\d%)/.exec((await check.textContent()) ?? '')
  expect(promise?.[1]).toBe(before)
  await check.getByRole('button', { name: /^Apply: With each pair/ }).click()
  await pane.getByText('Up to date', { exact: true }).waitFor()
  // the button is gone with what it offered: the focus stays with the line
  const focused = await check
    .locator('summary')
    .evaluate((summary) => summary === summary.ownerDocument.activeElement)
  expect(focused).toBe(true)
  await show('Risk')
  expect(await until(volatilityShown, (shown) => shown !== before, 'another volatility')).toBe(promise?.[2])
  await show('Data')
  await pane.getByRole('combobox', { name: 'Where a return is missing' }).selectOption('common dates')
  await show('Risk')
  await until(volatilityShown, (shown) => shown === before, 'the volatility as it was')
})

test('a half-life that is typed sets the decay factor', async () => {
  const { pane } = desk
  await show('Data')
  await pane.getByRole('combobox', { name: 'Estimator' }).selectOption('exponential')
  const halfLife = pane.getByRole('textbox', { name: 'Half-life, dates' })
  await halfLife.fill('26')
  await halfLife.press('Enter')
  // 0.5 to the power of 1/26, computed with Python 3
  await until(
    () => pane.getByRole('textbox', { name: 'Decay factor' }).inputValue(),
    (shown) => shown === '0.973693',
    'the decay factor of that half-life',
  )
  await pane.getByRole('combobox', { name: 'Estimator' }).selectOption('sample')
  await pane.getByText('Up to date', { exact: true }).waitFor()
})

test('groups within groups open and close by the arrow keys', async () => {
  const { page, pane } = desk
  await show('Risk')
  await unfold('Groups')
  const columns = pane.getByRole('group', { name: 'Columns, outermost first' })
  await columns.getByRole('button', { name: /Asset class/ }).click()
  await columns.getByRole('button', { name: '1. Asset class' }).waitFor()
  await columns.getByRole('button', { name: /Region/ }).click()
  const tree = pane.getByRole('table', { name: 'By Asset class, then Region' })
  const outer = tree.getByRole('button', { name: 'Equities' })
  await outer.focus()
  await page.keyboard.press('ArrowRight')
  await tree.getByRole('button', { name: 'North', expanded: false }).waitFor()
  await page.keyboard.press('ArrowDown')
  await page.keyboard.press('ArrowRight')
  await tree.getByRole('rowheader', { name: 'Northern coast equities' }).waitFor()
  await page.keyboard.press('ArrowLeft')
  await page.keyboard.press('ArrowLeft')
  await page.keyboard.press('ArrowLeft')
  await until(
    () => tree.getByRole('button', { name: 'North' }).count(),
    (count) => count === 0,
    'the outer group closed again',
  )
})

test('sections stay open when another view was looked at', async () => {
  await show('Data')
  await show('Risk')
  expect(await (await unfold('Groups')).getAttribute('aria-expanded')).toBe('true')
})

test('another confidence level moves the figures of large losses and their headline', async () => {
  const { pane } = desk
  await show('Risk')
  expect(await headline('Large losses')).toMatch(/Expected shortfall \d\.\d\d%, 95% confidence, 1 week/)
  await unfold('Large losses')
  const confidence = pane.getByRole('textbox', { name: 'Confidence level, %' }).first()
  await confidence.fill('90')
  await confidence.press('Enter')
  await until(
    () => headline('Large losses'),
    (text) => text.includes('90% confidence'),
    'the new confidence level',
  )
  await pane.getByRole('table', { name: 'Shares of large losses' }).waitFor()
})

test('the bootstrap shows errors beside those in closed form, and can be cancelled', async () => {
  const { pane } = desk
  await unfold('How sure')
  const replications = pane.getByRole('textbox', { name: 'Replications' })
  await replications.fill('100000')
  await replications.press('Enter')
  await pane.getByRole('button', { name: 'Run the bootstrap' }).click()
  await pane.getByRole('button', { name: 'Cancel' }).click()
  await pane.getByText(/^Cancelled/).waitFor()
  await pane.getByText('Up to date', { exact: true }).waitFor()
  expect(await pane.getByText(/in closed form \(ratio/).count()).toBe(0)
  await replications.fill('200')
  await replications.press('Enter')
  await pane.getByRole('button', { name: 'Run the bootstrap' }).click()
  await pane.getByText(/in closed form \(ratio/).waitFor()
  await pane.getByText(/200 replications of 130 dates/).waitFor()
})

test('the back-test draws its forecasts and says what each test means', async () => {
  const { pane } = desk
  await unfold('Back-test')
  const window = pane.getByRole('textbox', { name: 'Window, dates' })
  await window.fill('52')
  await window.press('Enter')
  await pane.getByRole('button', { name: 'Run the back-test' }).click()
  // 130 dates common to all, less the window
  await pane.getByRole('img', { name: /^Returns of 78 dates against the value at risk/ }).waitFor()
  await pane.getByText('Unconditional coverage (Kupiec)').waitFor()
  expect(await headline('Back-test')).toMatch(/\d+ exceptions?, 3\.9 expected at 95% confidence/)
  await window.fill('500')
  await window.press('Enter')
  await pane.getByRole('button', { name: 'Run the back-test' }).click()
  await pane.getByText(/found 130 dates for a window of 500/i).waitFor()
})

test('a chart is drawn over the cells of its sheet, and follows them', async () => {
  const { page } = desk
  await page.evaluate(() => {
    const { workspace } = globalThis as unknown as { workspace: Workspace }
    return workspace.office.Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.add('Drawn')
      sheet.getRange('A1:A3').values = [['North'], ['South'], ['East']]
      sheet.getRange('B1:B3').values = [[0.4], [0.1], [-0.2]]
      const chart = sheet.charts.add('BarClustered', sheet.getRange('B1:B3'), 'Columns')
      chart.series.getItemAt(0).setXAxisValues(sheet.getRange('A1:A3'))
      chart.name = 'Weights of three holdings'
      chart.legend.visible = false
      chart.setPosition('D2', 'J14')
      sheet.activate()
      await context.sync()
    })
  })
  const picture = page.getByRole('img', { name: 'Weights of three holdings' })
  const bars = picture.locator('rect.desk-chart-solid')
  const widths = () => bars.evaluateAll((all) => all.map((bar) => Number(bar.getAttribute('width'))))
  await until(widths, ({ length }) => length === 3, 'three bars')
  const [north = 0, south = 0, east = 0] = await widths()
  // bars are as long as their figures: 0.4, 0.1 and 0.2 without its sign
  expect([north / south, east / south].map((ratio) => ratio.toFixed(6))).toEqual(['4.000000', '2.000000'])
  await page.evaluate(() => {
    const { workspace } = globalThis as unknown as { workspace: Workspace }
    return workspace.office.Excel.run(async (context) => {
      context.workbook.worksheets.getItem('Drawn').getRange('B2').values = [[0.4]]
      await context.sync()
    })
  })
  await until(widths, ([first, second]) => first === second, 'a bar that follows its cell')
  await desk.sheet('Book')
  await picture.waitFor({ state: 'detached' })
})

test('no script failed, and the content security policy had nothing to refuse', () => {
  expect(desk.complaints).toEqual([])
})

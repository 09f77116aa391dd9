/**
 * The main job in the desk, in a browser, as a user does it, one step a test, in order. Figures are checked against the definition
 * and published examples elsewhere; here it counts that pane, table and functions show the same ones and follow the weights.
 */
import type { Browser } from 'playwright-core'
import { launchChromium } from './chromium'
import { openDeskPage, until, type DeskPage } from './desk'

jest.setTimeout(240_000)

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

const upToDate = (): Promise<void> => desk.pane.getByText('Up to date', { exact: true }).waitFor()
/** The volatility as the pane shows it. */
const volatilityShown = async (): Promise<string> =>
  (await desk.pane
    .getByText(/^\d+\.\d\d%$/)
    .first()
    .textContent()) ?? ''

test('the demo opens with the pane beside it', async () => {
  expect(await desk.cell('Book', 'A4')).toBe('Holding')
  expect(desk.complaints).toEqual([])
})

test('holdings and returns are taken from the selection, and Compute shows the risk', async () => {
  const { pane } = desk
  await desk.sheet('Book')
  await desk.goTo('A4:G21')
  await pane.getByRole('button', { name: 'Use selection' }).first().click()
  await pane.getByText('16 holdings, net 100.0%, gross 116.0%; 1 total row left out').waitFor()
  await desk.sheet('Returns')
  await desk.goTo('A1:Q261')
  await pane.getByRole('button', { name: 'Use selection' }).nth(1).click()
  await pane.getByText('260 weekly returns of 16 series, 10 Dec 2021 to 27 Nov 2026').waitFor()
  await pane.getByRole('button', { name: 'Compute' }).click()
  await upToDate()
  await pane.getByRole('tab', { name: 'Risk' }).click()
  await pane.getByText('Volatility a year').waitFor()
  await pane.getByRole('heading', { name: 'Weight and share of risk' }).waitFor()
})

test('Write table puts the labelled table on a sheet of its own', async () => {
  const { pane } = desk
  await pane.getByRole('tab', { name: 'Report' }).click()
  await pane.getByRole('button', { name: 'Write table' }).click()
  await pane.getByText(/^Table written to/).waitFor()
  expect(await desk.cells('Risk', 'A6:A7')).toEqual([['Holding'], ['Northern coast equities']])
})

test('a weight typed in the grid moves pane and table by itself', async () => {
  const { pane } = desk
  await pane.getByRole('tab', { name: 'Risk' }).click()
  const before = await volatilityShown()
  const [contribution] = (await desk.cells('Risk', 'G7'))[0] ?? []
  await desk.sheet('Book')
  await desk.goTo('D5')
  await desk.type('24%')
  await until(volatilityShown, (shown) => shown !== before, 'another volatility in the pane')
  await upToDate()
  await until(
    () => desk.cell('Risk', 'D7'),
    (weight) => weight === 0.24,
    'the new weight in the table',
  )
  expect(await desk.cell('Risk', 'G7')).toBeGreaterThan(Number(contribution))
})

test('a weight that is no number fails with its cell, and the figures are marked as earlier ones', async () => {
  const { pane } = desk
  const weight = await desk.cell('Book', 'D6')
  await desk.sheet('Book')
  await desk.goTo('D6')
  await desk.type('lots')
  await pane.getByText('found “lots”; a weight is needed.').first().waitFor()
  await pane.getByText('Figures as last computed, before the failure told above.').waitFor()
  await desk.goTo('D6')
  await desk.type(String(weight))
  await upToDate()
})

test('two undos take back a typed weight and the table that followed it', async () => {
  const { page } = desk
  await desk.goTo('D5')
  await desk.type('25%')
  const inTable = (): Promise<unknown> => desk.cell('Risk', 'D7')
  await until(inTable, (weight) => weight === 0.25, 'the new weight in the table')
  await upToDate()
  await page.keyboard.press('Control+z')
  await until(inTable, (weight) => weight === 0.24, 'the table as it was')
  await page.keyboard.press('Control+z')
  await until(
    () => desk.cell('Book', 'D5'),
    (weight) => weight === 0.24,
    'the weight as it was',
  )
  await upToDate()
  expect(await inTable()).toBe(0.24)
})

test('a function typed into a cell spills beside the table it agrees with, and recalculates', async () => {
  await desk.sheet('Book')
  await desk.goTo('I5')
  await desk.type('=POISE.CONTRIBUTION(D5:D17,Returns!B132:N261,52)')
  const spilled = (): Promise<unknown[][]> => desk.cells('Book', 'I5:I17')
  const first = await until(
    spilled,
    (cells) => cells.every(([v]) => typeof v === 'number'),
    'thirteen contributions',
  )
  await desk.goTo('D5')
  await desk.type('14%')
  await until(spilled, (cells) => Number(cells[0]?.[0]) < Number(first[0]?.[0]), 'a smaller contribution')
  await upToDate()
})

test('saved and opened again, the book is still linked and the function still there', async () => {
  const { page, pane } = desk
  const download = page.waitForEvent('download')
  await page.getByRole('button', { name: 'Save' }).click()
  const path = await (await download).path()
  const chooser = page.waitForEvent('filechooser')
  await page.getByRole('button', { name: 'Open' }).click()
  await (
    await chooser
  ).setFiles({
    name: 'again.xlsx',
    mimeType: 'application/vnd.openxmlformats-officedocument.spreadsheetml.sheet',
    buffer: (await import('node:fs')).readFileSync(path),
  })
  await page.getByText('again.xlsx').first().waitFor()
  await upToDate()
  await pane.getByRole('tab', { name: 'Risk' }).click()
  const before = await volatilityShown()
  await desk.sheet('Book')
  await desk.goTo('D5')
  await desk.type('30%')
  await until(volatilityShown, (shown) => shown !== before, 'another volatility in the pane')
  await until(
    () => desk.cell('Risk', 'D7'),
    (weight) => weight === 0.3,
    'the new weight in the table',
  )
  expect(await desk.cell('Book', 'I5')).toEqual(expect.any(Number))
})

test('no script failed, and the content security policy had nothing to refuse', () => {
  expect(desk.complaints).toEqual([])
})

/**
 * What leaves the pane, in the desk, in a browser, one step a test, in order: the proof follows the cells, results are kept and compared, a page
 * is written for a committee. Figures are held against published and computed ones elsewhere; here it counts that pane and sheets show the same.
 */
import { readFileSync } from 'node:fs'
import type { AxeResults } from 'axe-core'
import type { Browser } from 'playwright-core'
import { launchChromium } from './chromium'
import { openComputedDemo, until, type DeskPage } from './desk'

jest.setTimeout(240_000)

const axe = readFileSync(require.resolve('axe-core/axe.min.js'), 'utf8')

let browser: Browser
let desk: DeskPage
beforeAll(async () => {
  browser = await launchChromium()
  desk = await openComputedDemo(browser)
  await desk.pane.getByRole('tab', { name: 'Report' }).click()
})
afterAll(async () => {
  await desk.close()
  await browser.close()
})

const section = (title: string) => desk.pane.getByRole('button', { name: new RegExp(`^${title}(?!!)`) })
const headline = async (title: string): Promise<string> => (await section(title).textContent()) ?? ''
/** Opens a folded section unless it is open. */
async function unfold(title: string): Promise<void> {
  const button = section(title)
  if ((await button.getAttribute('aria-expanded')) === 'false') await button.click()
}
const press = (name: string): Promise<void> =>
  desk.pane.getByRole('button', { name, exact: true }).first().click()
const upToDate = (): Promise<void> => desk.pane.getByText('Up to date', { exact: true }).waitFor()

/** The first row of a sheet that begins with a label. */
async function row(sheet: string, label: string, from = 0): Promise<readonly unknown[]> {
  const rows = await desk.cells(sheet, 'A1:N120')
  const found = rows.slice(from).find(([first]) => first === label)
  if (!found) throw new Error(`the sheet "${sheet}" has no row "${label}"`)
  return found
}

const COUNTS = { verdict: 'A3', agree: 'D3', differ: 'F3' } as const
const proof = async () => {
  const [verdict, agree, differ] = await Promise.all(
    Object.values(COUNTS).map((address) => desk.cell('Proof', address)),
  )
  return { verdict: String(verdict), agree: Number(agree), differ: Number(differ) }
}
const ALL_AGREE = 'All lines agree within the tolerance'

test('Write proof: every line of formulas agrees with our figures', async () => {
  await unfold('Proof')
  await press('Write proof')
  await desk.pane.getByText(/^Proof written to/).waitFor()
  const { agree } = await until(proof, ({ verdict }) => verdict === ALL_AGREE, 'a proof that agrees')
  expect(agree).toBeGreaterThan(16)
  expect(await headline('Proof')).toContain('Our figures in it are those that stand now')
})

test('a return that is edited moves the proof, which marks our figures until it is written again', async () => {
  const before = await row('Proof', 'Volatility a year')
  await desk.sheet('Returns')
  await desk.goTo('D200')
  await desk.type('9%')
  const moved = await until(proof, ({ differ }) => differ > 0, 'lines that differ')
  expect(moved.verdict).toBe('Some lines differ by more than the tolerance')
  const [, , , recomputed, ours, , result] = await row('Proof', 'Volatility a year')
  expect([ours, result]).toEqual([before[4], '≠ differs'])
  expect(recomputed).not.toBe(before[3])
  await until(
    () => headline('Proof'),
    (text) => text.includes('Our figures in it are older than those that stand now'),
    'a proof that is told to be older',
  )
  await press('Refresh proof')
  const again = await until(proof, ({ verdict }) => verdict === ALL_AGREE, 'a proof that agrees again')
  expect(again.differ).toBe(0)
  // the formulas found before what the pane computes now
  const [, , , , now] = await row('Proof', 'Volatility a year')
  expect(Math.abs(Number(now) - Number(recomputed))).toBeLessThan(1e-12)
})

test('a result is kept, weights and the last week of returns are replaced, another one is kept', async () => {
  const { pane } = desk
  await unfold('Kept results')
  await pane.getByRole('textbox', { name: /^Note/ }).fill('Before the week')
  await press('Keep this result')
  const kept = pane.getByRole('list', { name: /^Kept results/ }).getByRole('listitem')
  await kept.first().waitFor()
  await desk.sheet('Book')
  for (const [address, weight] of [
    ['D5', '11%'],
    ['D12', '17%'],
  ] as const) {
    await desk.goTo(address)
    await desk.type(weight)
  }
  await desk.sheet('Returns')
  for (const [address, text] of [
    ['A261', '2026-12-04'],
    ['B261', '-6%'],
    ['F261', '-8%'],
  ] as const) {
    await desk.goTo(address)
    await desk.type(text)
  }
  await pane.getByText('Returns to 4 Dec 2026').waitFor()
  await upToDate()
  await press('Keep this result')
  await until(
    () => kept.count(),
    (count) => count === 2,
    'two kept results',
  )
  expect(await kept.allTextContents()).toEqual([
    expect.stringContaining('Data to 4 Dec 2026'),
    expect.stringMatching(/Data to 27 Nov 2026.*Before the week/),
  ])
})

test('What changed: the parts add up to the change, in the pane as in the sheet', async () => {
  const { pane } = desk
  await unfold('What changed')
  await pane.getByRole('combobox', { name: 'From', exact: true }).selectOption('1')
  await pane.getByRole('combobox', { name: 'To', exact: true }).selectOption('2')
  await press('Compare')
  const picture = pane.getByRole('figure', { name: /^\d+\.\d\d% → \d+\.\d\d%/ })
  const told = (await picture.getByRole('listitem').allTextContents()).map((text) => {
    const [, label = '', number = ''] = /^(.*?)([+−]?\d+\.\d+)(?:%| points)$/.exec(text) ?? []
    return [label, Number(number.replace('−', '-'))] as const
  })
  // the week that ended on the first date is gone, so that nothing tells drift from trades
  expect(told.map(([label]) => label)).toEqual(['From', 'Positions', 'Volatilities', 'Correlations', 'To'])
  await pane.getByText(/^Positions are not parted into drift and trades\. 27 Nov 2026 is not among/).waitFor()
  await press('Write comparison')
  await pane.getByText(/^Comparison written to/).waitFor()
  const first = (await desk.cells('What changed', 'A1:A40')).findIndex(([label]) => label === 'Step') + 1
  const steps = await desk.cells('What changed', `A${first + 1}:C${first + 5}`)
  // the picture's figures are those of the sheet, each in percent to the digits it is shown with
  const shown = steps.map(([label, by, level]) => [label, 100 * Number(by === '' ? level : by)] as const)
  expect(shown.map(([label]) => label)).toEqual(told.map(([label]) => label))
  shown.forEach(([, value], k) => expect(Math.abs(value - told[k]![1])).toBeLessThanOrEqual(0.005 + 1e-9))
  const parts = steps.slice(1, 4).reduce((sum, [, by]) => sum + Number(by), 0)
  const change = Number(steps[4]?.[2]) - Number(steps[0]?.[2])
  expect(Math.abs(parts - change)).toBeLessThan(1e-12)
  expect(Math.abs(Number((await row('What changed', 'Sum of parts'))[1]) - parts)).toBeLessThan(1e-12)
  expect(Math.abs(Number((await row('What changed', 'Change of volatility'))[1]) - change)).toBeLessThan(
    1e-12,
  )
  // holdings add up to the same parts
  const [, , , , , before, after, changed] = await row('What changed', 'Total')
  expect(Math.abs(Number(after) - Number(before) - change)).toBeLessThan(1e-12)
  expect(Math.abs(Number(changed) - change)).toBeLessThan(1e-12)
})

test('functions that are live in cells give the figures of the pane', async () => {
  const { pane } = desk
  await pane.getByRole('radio', { name: 'POISE functions, live in cells' }).check()
  await press('Write table')
  await pane.getByText(/^Functions written to/).waitFor()
  await press('Refresh proof')
  await until(proof, ({ verdict }) => verdict === ALL_AGREE, 'a proof that agrees')
  const ours = Number((await row('Proof', 'Volatility a year'))[4])
  // the grid works functions out a moment after they are written
  await until(
    async () => Number((await row('Risk, live', 'Volatility'))[1]),
    (live) => Math.abs(live - ours) < 1e-12,
    'the volatility by live functions',
  )
  const total = await row('Risk, live', 'Total')
  expect(Math.abs(Number(total[4]) - ours)).toBeLessThan(1e-12)
})

test('the committee page is written with pictures that say what they show', async () => {
  const { page, pane } = desk
  await unfold('Committee page')
  await pane.getByRole('textbox', { name: 'Prepared by' }).fill('R. Alder')
  await press('Write page')
  await pane.getByText(/^Committee page written to/).waitFor()
  await desk.sheet('Committee page')
  await page.getByRole('img', { name: /^Bars of weight and share of risk, side by side/ }).waitFor()
  const [title, data] = (await desk.cells('Committee page', 'A1:A2')).flat()
  expect(title).toBe('Risk report: Book')
  expect(data).toMatch(/^Data to 4 Dec 2026, .* Prepared by: R\. Alder\./)
  // it says the volatility that the pane says
  const [, , , figure] = await row('Committee page', 'Volatility a year')
  await pane.getByText(`Now, ${(100 * Number(figure)).toFixed(2)}%`).waitFor({ state: 'attached' })
})

test.each(['Light', 'Dark', 'High contrast'])(
  'axe finds nothing to object to in the view Report with everything open in the %s theme',
  async (theme) => {
    const { page, pane } = desk
    await page.getByRole('combobox').first().selectOption({ label: theme })
    for (const title of ['Copy and export', 'Trades, before and after', 'List of data checks'])
      await unfold(title)
    await page.waitForTimeout(500)
    await pane.getByRole('button', { name: 'Copy table' }).waitFor()
    const frame = await (await page.locator('#pane').elementHandle())?.contentFrame()
    if (!frame) throw new Error('the pane has no frame')
    // the page's policy forbids a script tag; evaluating is the debugger's and passes it by
    await frame.evaluate(axe)
    const { violations, passes } = await frame.evaluate(async () => {
      const { axe: run } = globalThis as unknown as { axe: { run(): Promise<AxeResults> } }
      return run.run()
    })
    expect(violations.map(({ id, nodes }) => `${id}: ${nodes.map(({ html }) => html).join(' ')}`)).toEqual([])
    expect(passes.length).toBeGreaterThan(10)
  },
)

test('no script failed, and the content security policy had nothing to refuse', () => {
  expect(desk.complaints).toEqual([])
})

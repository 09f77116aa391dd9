/** Acting on the figures in the desk, in a browser, by keyboard alone: trades typed, looked at on both sides, written and taken back. */
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
})
afterAll(async () => {
  await desk.close()
  await browser.close()
})

const weights = async (): Promise<unknown[]> => (await desk.cells('Book', 'D5:D20')).flat()
/** The volatility on both sides, as the line that stays in sight says it. */
const outcome = async (): Promise<string> =>
  (await desk.pane
    .getByText(/^\d+\.\d\d%( → \d+\.\d\d%)?/)
    .first()
    .textContent()) ?? ''
const focused = (): Promise<string> =>
  desk.page.evaluate(() => {
    const frame = document.activeElement as HTMLIFrameElement | null
    const element = frame?.contentDocument?.activeElement as HTMLInputElement | null | undefined
    const label = element?.labels?.[0]?.textContent
    return element ? (element.getAttribute('aria-label') ?? label ?? element.textContent ?? '') : ''
  })

/** Presses Tab in the pane until the focus is on something of that name; fails after a whole round. */
async function tabTo(name: RegExp): Promise<void> {
  for (let k = 0; k < 80; k++) {
    await desk.page.keyboard.press('Tab')
    if (name.test(await focused())) return
  }
  throw new Error(`Tab never reached ${String(name)}`)
}

let before: unknown[]

test('the arrow keys lead to the view, and Tab to the first line of its list', async () => {
  const { page, pane } = desk
  before = await weights()
  await pane.getByRole('tab', { name: 'Risk' }).focus()
  await page.keyboard.press('ArrowRight')
  await pane.getByRole('tab', { name: 'Trades', selected: true }).waitFor()
  await pane.getByRole('table', { name: 'Trades' }).waitFor()
  await tabTo(/^New weight: Northern coast equities$/)
  expect(await outcome()).toMatch(/^\d+\.\d\d%$/)
})

test('a weight typed there shows the volatility on both sides and what it changes by', async () => {
  const { page, pane } = desk
  await page.keyboard.type('10%')
  await until(outcome, (shown) => shown.includes('→'), 'both sides')
  expect(await outcome()).toMatch(/^(\d+\.\d\d)% → (?!\1)\d+\.\d\d%.[\u2212+]?\d+\.\d\d points$/)
  await pane.getByText(/^Sensitivities foretell a volatility of/).waitFor()
  // the weight in the demo is 14%
  expect(
    await pane
      .getByRole('textbox', { name: 'Change of weight: Northern coast equities' })
      .getAttribute('placeholder'),
  ).toBe('\u22124.00%')
})

test('the down key goes to the next line; an expression that breaks off says where, and Escape takes it back', async () => {
  const { page, pane } = desk
  await page.keyboard.press('ArrowDown')
  expect(await focused()).toBe('New weight: Southern plains equities')
  await page.keyboard.type('weight * (0.9')
  const line = pane.getByRole('table', { name: 'Trades' })
  await line.getByText(/is needed/).waitFor()
  expect(await line.locator('pre').textContent()).toBe('weight * (0.9\n         ^')
  await page.keyboard.type(')')
  await until(
    () => line.getByText(/is needed/).count(),
    (count) => count === 0,
    'the fault to go',
  )
  await page.keyboard.press('Escape')
  await until(
    () => pane.getByRole('textbox', { name: 'New weight: Southern plains equities' }).inputValue(),
    (text) => text === '',
    'the line as it was',
  )
})

test('a rule for all shows its effect line by line before anything is written, and the payer takes the difference', async () => {
  const { page, pane } = desk
  await pane.getByRole('tab', { name: 'Trades' }).focus()
  await tabTo(/^Rule for all holdings$/)
  await page.keyboard.type('weight > 8% ? 8% : weight')
  const line = (name: string) => pane.getByRole('textbox', { name: `New weight: ${name}` })
  await until(
    () => line('Harbour bonds 7-10y').getAttribute('placeholder'),
    (shown) => shown === '8.00%',
    'the weight by the rule',
  )
  expect(await line('Tidal power projects').getAttribute('placeholder')).toBe('4.00%')
  // what is typed for a holding goes before the rule
  expect(await line('Northern coast equities').inputValue()).toBe('10%')
  const payer = pane.getByRole('combobox', { name: 'What pays for the trades' })
  await payer.focus()
  await page.keyboard.type('Cash')
  await payer.selectOption({ label: 'Cash' })
  await until(
    () => pane.getByText(/^pays for the trades$/).count(),
    (count) => count === 1,
    'the payer marked in its line',
  )
  expect(await weights()).toEqual(before)
})

test('Apply writes the weights, figures follow, and Undo puts back exactly what stood there', async () => {
  const { page, pane } = desk
  const shown = await pane.getByRole('textbox', { name: 'New weight: Cash' }).getAttribute('placeholder')
  const promised = /→ (\S+%)/.exec(await outcome())?.[1]
  await pane.getByText(/cells would change$/).focus()
  await page.keyboard.press('Enter')
  await pane.getByRole('table', { name: 'Cells that would change' }).waitFor()
  await tabTo(/^Apply$/)
  await page.keyboard.press('Enter')
  const written = await until(weights, (now) => now[0] === 0.1, 'the weights in the sheet')
  expect(written[7]).toBe(0.08)
  expect(`${((written[15] as number) * 100).toFixed(2)}%`).toBe(shown)
  await pane.getByText('Up to date', { exact: true }).waitFor()
  await pane.getByText('Nothing to write: the sheet holds these weights.').waitFor()
  // the book as written has the volatility that was foretold for it, against the same start
  expect(/→ (\S+%)/.exec(await outcome())?.[1]).toBe(promised)
  await tabTo(/^Undo$/)
  await page.keyboard.press('Enter')
  await until(weights, (now) => now[0] === before[0], 'the weights as they were')
  expect(await weights()).toEqual(before)
})

test('Discard leaves no trace of what was typed', async () => {
  const { page, pane } = desk
  await pane.getByText('Up to date', { exact: true }).waitFor()
  const line = pane.getByRole('textbox', { name: 'New weight: Inland dividend equities' })
  await line.focus()
  await page.keyboard.type('1%')
  await pane.getByText(/2 cells would change/).waitFor()
  await tabTo(/^Discard$/)
  await page.keyboard.press('Enter')
  await pane.getByText('No weight differs from those compared from.').waitFor()
  // the list is drawn first, its fields follow
  await until(
    () => line.inputValue(),
    (shown) => shown === '',
    'the field to be empty',
  )
  expect(await focused()).toBe('Discard')
  expect(await weights()).toEqual(before)
})

test('an edit of a weight in the sheet is the same thing seen from the other side', async () => {
  const { pane } = desk
  await desk.sheet('Book')
  await desk.goTo('D5')
  await desk.type('12%')
  await pane.getByText(/^edited in the sheet: 12\.00%$/).waitFor()
  expect(await outcome()).toContain('→')
  await pane.getByRole('button', { name: 'Compare from here' }).click()
  await pane.getByText('No weight differs from those compared from.').waitFor()
})

describe.each(['Light', 'Dark', 'High contrast'])('In the %s theme', (theme) => {
  test('axe finds nothing to object to, with trades, a fault and all parts open', async () => {
    const { page, pane } = desk
    await page.getByRole('combobox').first().selectOption({ label: theme })
    await pane.getByRole('textbox', { name: 'New weight: Harbour small companies' }).fill('1%')
    for (const name of [/^Groups before and after/, /^Holdings before and after/]) {
      const section = pane.getByRole('button', { name })
      if ((await section.getAttribute('aria-expanded')) === 'false') await section.click()
    }
    const look = async (): Promise<void> => {
      await page.waitForTimeout(700)
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
    }
    await look()
    await pane.getByRole('textbox', { name: 'New weight: Harbour small companies' }).fill('wieght')
    await pane.getByText(/is no name in a rule/).waitFor()
    await look()
  })
})

test('no script failed, and the content security policy had nothing to refuse', () => {
  expect(desk.complaints).toEqual([])
})

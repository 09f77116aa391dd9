/** The help page as a reader meets it: from a narrow window to a wide one, light and dark, by keyboard, on paper. */
import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import type { AxeResults } from 'axe-core'
import type { Browser } from 'playwright-core'
import { serve } from '../../src/build/server.cjs'
import { launchChromium } from './chromium'

jest.setTimeout(120_000)

const axe = readFileSync(require.resolve('axe-core/axe.min.js'), 'utf8')

let browser: Browser
let server: Awaited<ReturnType<typeof serve>>
beforeAll(async () => {
  browser = await launchChromium()
  server = await serve(join(__dirname, '../../dist'), { home: 'help.html' })
})
afterAll(async () => {
  await server.close()
  await browser.close()
})

test.each([
  ['light', 350],
  ['dark', 1000],
] as const)('The page in %s colours gives axe nothing to object to', async (colorScheme, width) => {
  const page = await browser.newPage({ viewport: { width, height: 800 }, colorScheme })
  const complaints: string[] = []
  page.on('console', (message) => complaints.push(message.text()))
  await page.goto(`${server.url}help.html`)
  // the page's policy forbids scripts; evaluating is the debugger's and passes it by
  await page.evaluate(axe)
  const { violations, passes } = await page.evaluate(async () => {
    const { axe: run } = globalThis as unknown as { axe: { run(): Promise<AxeResults> } }
    return run.run()
  })
  expect(violations.map(({ id, nodes }) => `${id}: ${nodes.map(({ html }) => html).join(' ')}`)).toEqual([])
  expect(passes.length).toBeGreaterThan(10)
  expect(complaints).toEqual([])
  await page.close()
})

test('Nothing sticks out of a window of any width', async () => {
  const page = await browser.newPage()
  await page.goto(`${server.url}help.html`)
  for (const width of [320, 350, 480, 768, 1000, 1300]) {
    await page.setViewportSize({ width, height: 800 })
    const excess = await page.evaluate(() => document.documentElement.scrollWidth - innerWidth)
    expect({ width, excess }).toEqual({ width, excess: 0 })
  }
  await page.close()
})

test('The keyboard goes past the contents to the functions, and a help address shows its function', async () => {
  const page = await browser.newPage({ viewport: { width: 350, height: 800 } })
  await page.goto(`${server.url}help.html`)
  await page.keyboard.press('Tab')
  await page.keyboard.press('Enter')
  const top = (id: string) =>
    page.evaluate((name) => Math.round(document.getElementById(name)?.getBoundingClientRect().top ?? NaN), id)
  expect(await top('functions')).toBeLessThan(60)
  await page.goto(`${server.url}help.html#riskshare`)
  expect(await top('riskshare')).toBeLessThan(60)
  expect(await top('riskshare')).toBeGreaterThanOrEqual(0)
  await page.close()
})

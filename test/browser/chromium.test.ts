import type { Browser } from 'playwright-core'
import { launchChromium } from './chromium'

let browser: Browser
beforeAll(async () => {
  browser = await launchChromium()
}, 60_000)
afterAll(() => browser.close())

it('keeps two contexts apart and alive, each with a page that computes', async () => {
  const contexts = await Promise.all([browser.newContext(), browser.newContext()])
  const pages = await Promise.all(contexts.map((context) => context.newPage()))
  const answers = await Promise.all(pages.map((page, i) => page.evaluate((n) => n + 1, i)))
  expect(answers).toEqual([1, 2])
  await Promise.all(contexts.map((context) => context.close()))
})

it('draws text: letters have different widths', async () => {
  const page = await browser.newPage()
  await page.setContent('<span id="thin">iiii</span><br><span id="wide">WWWW</span>')
  const width = async (id: string) => (await page.locator(id).boundingBox())?.width ?? 0
  const [thin, wide] = [await width('#thin'), await width('#wide')]
  expect(thin).toBeGreaterThan(0)
  expect(wide).toBeGreaterThan(thin)
})

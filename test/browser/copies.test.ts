/** What leaves the pane for other programs: the table on the clipboard, pictures as files; and the question before a kept result is replaced. */
import { readFileSync } from 'node:fs'
import type { Browser, Frame } from 'playwright-core'
import { launchChromium } from './chromium'
import { openComputedDemo, until, type DeskPage } from './desk'

jest.setTimeout(240_000)

let browser: Browser
let desk: DeskPage
beforeAll(async () => {
  browser = await launchChromium()
  desk = await openComputedDemo(browser)
  await desk.page.context().grantPermissions(['clipboard-read', 'clipboard-write'])
  await desk.pane.getByRole('tab', { name: 'Report' }).click()
})
afterAll(async () => {
  await desk.close()
  await browser.close()
})

async function frameOfPane(): Promise<Frame> {
  const frame = await (await desk.page.locator('#pane').elementHandle())?.contentFrame()
  if (!frame) throw new Error('the pane has no frame')
  return frame
}

/** Opens a section by keyboard. */
async function open(section: string): Promise<void> {
  await desk.pane.getByRole('button', { name: new RegExp(`^${section}`) }).focus()
  await desk.page.keyboard.press('Enter')
  await desk.pane.getByRole('button', { name: new RegExp(`^${section}`), expanded: true }).waitFor()
}

/** What a press on a button hands over as a file. */
async function saved(group: string, button: string): Promise<{ name: string; bytes: Buffer }> {
  const [download] = await Promise.all([
    desk.page.waitForEvent('download'),
    desk.pane.getByRole('group', { name: group }).getByRole('button', { name: button }).click(),
  ])
  return { name: download.suggestedFilename(), bytes: readFileSync(await download.path()) }
}

test('the table goes to the clipboard as text with every digit and as HTML', async () => {
  await open('Copy and export')
  await desk.pane.getByRole('button', { name: 'Copy table' }).click()
  await desk.pane.getByText(/^Copied/).waitFor()
  const frame = await frameOfPane()
  const copied = await frame.evaluate(async () => {
    const [item] = await navigator.clipboard.read()
    const of = async (type: string): Promise<string> => (await item!.getType(type)).text()
    return { text: await of('text/plain'), html: await of('text/html') }
  })
  const total = copied.text.split(/\r?\n/).find((line) => line.startsWith('Total\t'))
  expect(total).toMatch(/\t0\.\d{10,}/)
  expect(copied.html).toContain('</table>')
})

test('where the clipboard is refused, text and picture stand there to be copied by hand', async () => {
  const { pane } = desk
  const frame = await frameOfPane()
  await frame.evaluate(() => {
    Object.defineProperty(navigator.clipboard, 'write', {
      configurable: true,
      value: () => Promise.reject(new DOMException('refused', 'NotAllowedError')),
    })
  })
  await pane.getByRole('button', { name: 'Copy table' }).click()
  const area = pane.getByLabel('Text of the table')
  await area.waitFor()
  const selected = await area.evaluate((of: HTMLTextAreaElement) => of.selectionEnd - of.selectionStart)
  expect(selected).toBe((await area.inputValue()).length)
  const picture = pane.getByRole('group', { name: 'Picture of weight and share of risk' })
  await picture.getByRole('button', { name: 'Copy picture' }).click()
  const image = pane.getByRole('img', { name: /^Weight and share of risk of 16 positions/ })
  await image.waitFor()
  // a document of SVG that does not parse has no width
  expect(
    await image.evaluate((shown: HTMLImageElement) => shown.decode().then(() => shown.naturalWidth)),
  ).toBe(760)
  await frame.evaluate(() => Reflect.deleteProperty(navigator.clipboard, 'write'))
})

test('a result is kept and compared by keyboard', async () => {
  const { page, pane } = desk
  await open('Kept results')
  await pane.getByLabel('Note (may be left out)').focus()
  await page.keyboard.type('before')
  await page.keyboard.press('Tab')
  await page.keyboard.press('Enter')
  await pane.getByText(/^Result kept in/).waitFor()
  await desk.sheet('Book')
  await desk.goTo('D6')
  await desk.type('0.15')
  await open('What changed')
  await until(
    () => pane.getByLabel('To', { exact: true }).locator('option').first().textContent(),
    (now) => now !== null && !now.includes('8.34%'),
    'the figures to follow the weight',
  )
  await pane.getByRole('button', { name: 'Compare', exact: true }).focus()
  await page.keyboard.press('Enter')
  await pane.getByText(/difference 0\.0000 points/).waitFor()
})

test.each(['Picture of weight and share of risk', 'Picture of what changed'])(
  '%s is saved as SVG that parses and as PNG twice its size',
  async (group) => {
    const svg = await saved(group, 'Save as SVG')
    expect(svg.name).toMatch(/2026-11-27\.svg$/)
    const [errors, width, height] = await desk.page.evaluate((text) => {
      const parsed = new DOMParser().parseFromString(text, 'image/svg+xml')
      const { documentElement: root } = parsed
      const size = (name: string): number => Number(root.getAttribute(name))
      return [parsed.querySelectorAll('parsererror').length, size('width'), size('height')] as const
    }, svg.bytes.toString('utf8'))
    expect(errors).toBe(0)
    const png = await saved(group, 'Save as PNG')
    // width and height stand in the first chunk (W3C, Portable Network Graphics, section on IHDR; from memory)
    expect([png.bytes.readUInt32BE(16), png.bytes.readUInt32BE(20)]).toEqual([2 * width, 2 * height])
  },
)

test('a second result of one data date is asked about before it replaces the first', async () => {
  const { pane } = desk
  await pane.getByRole('button', { name: 'Keep this result' }).click()
  await pane.getByRole('button', { name: 'Replace it' }).click()
  await until(
    () => pane.getByRole('button', { name: /^Kept results/ }).textContent(),
    (said) => said !== null && said.includes('1 result') && !said.includes('8.34%'),
    'the result to be replaced',
  )
})

test('the help page of the functions opens beside the workbook', async () => {
  const [help] = await Promise.all([
    desk.page.context().waitForEvent('page'),
    desk.pane.getByRole('link', { name: 'Help', exact: true }).click(),
  ])
  await help.waitForLoadState()
  expect(await help.textContent('body')).toContain('POISE.RISKSHARE')
  await help.close()
})

test('nothing went wrong on the way', () => {
  expect(desk.complaints).toEqual([])
})

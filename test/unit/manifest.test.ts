import { spawnSync } from 'node:child_process'
import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { DOMParser, type Document, type Element } from '@xmldom/xmldom'
import { deployed, development } from '../../src/build/manifest.cjs'
import packageJson from '../../package.json'

// The rules below are those of Microsoft's documentation of the add-in-only manifest (learn.microsoft.com,
// "Office Add-ins manifest" and the reference of its elements), as read in 2026.

const root = join(__dirname, '../..')
const file = join(root, 'manifest.xml')
const schema = join(__dirname, 'manifest-schema/OfficeAppManifestV1_1.xsd')
const text = readFileSync(file, 'utf8')

const parse = (xml: string): Document => new DOMParser().parseFromString(xml, 'text/xml')
const all = (document: Document, name: string): Element[] =>
  Array.from(document.getElementsByTagNameNS('*', name))
const only = (document: Document, name: string): Element => {
  const found = all(document, name)
  expect(found).toHaveLength(1)
  return found[0]!
}
const value = (element: Element) => element.getAttribute('DefaultValue') ?? ''

const kinds = ['Images', 'Urls', 'ShortStrings', 'LongStrings']

/** What the schema lets through and the host or the store refuses: one sentence for each. */
function objections(xml: string): string[] {
  const document = parse(xml)
  const found: string[] = []
  for (const name of ['HighResolutionIconUrl', 'SupportUrl', 'IconUrl', 'Runtimes']) {
    if (all(document, name).length === 0) found.push(`${name} is absent`)
  }
  const resources = kinds.flatMap((kind) =>
    all(document, kind).flatMap((list) => Array.from(list.childNodes).filter((node) => node.nodeType === 1)),
  ) as Element[]
  const ids = resources.map((resource) => resource.getAttribute('id') ?? '')
  ids.filter((id, i) => ids.indexOf(id) < i).forEach((id) => found.push(`resource ${id} is there twice`))
  const used = Array.from(document.getElementsByTagName('*'))
    .map((element) => element.getAttribute('resid'))
    .filter((id) => id !== null)
  used.filter((id) => !ids.includes(id)).forEach((id) => found.push(`no resource is called ${id}`))
  ids.filter((id) => !used.includes(id)).forEach((id) => found.push(`resource ${id} is used nowhere`))
  for (const element of Array.from(document.getElementsByTagName('*'))) {
    const url = element.getAttribute('DefaultValue')
    if (url?.includes('://') && !url.startsWith('https://')) found.push(`${url} is not https`)
  }
  for (const icon of all(document, 'Icon')) {
    const sizes = Array.from(icon.childNodes).flatMap((node) =>
      node.nodeType === 1 ? [(node as Element).getAttribute('size')] : [],
    )
    for (const size of ['16', '32', '80']) if (!sizes.includes(size)) found.push(`an icon lacks size ${size}`)
  }
  for (const set of all(document, 'Set')) {
    const name = set.getAttribute('Name') ?? ''
    if (!['SharedRuntime', 'CustomFunctionsRuntime', 'ExcelApi'].includes(name))
      found.push(`set ${name} is unknown`)
  }
  for (const host of all(document, 'Host')) {
    const name = host.getAttribute('Name') ?? host.getAttribute('xsi:type')
    if (name !== 'Workbook') found.push(`host ${name} is unknown`)
  }
  for (const [kind, most] of [
    ['ShortStrings', 125],
    ['LongStrings', 250],
  ] as const) {
    for (const list of all(document, kind)) {
      for (const string of Array.from(list.getElementsByTagNameNS('*', 'String'))) {
        if (value(string).length > most) found.push(`${string.getAttribute('id')} is longer than ${most}`)
      }
    }
  }
  const residOf = (element: Element | undefined) => element?.getAttribute('resid') ?? '(none)'
  const spaces = all(document, 'Namespace').map((element) =>
    resources.find((r) => r.getAttribute('id') === residOf(element)),
  )
  for (const space of spaces) {
    if (!space || !/^[A-Za-z][A-Za-z0-9._]*$/.test(value(space))) found.push('the namespace is no name')
  }
  return found
}

describe('manifest.xml', () => {
  const xmllint = spawnSync('xmllint', ['--version']).status === 0
  // Where xmllint is not installed the other tests still run; the project's own automatic runs must have it.
  const withXmllint = xmllint || process.env.CI ? it : it.skip
  withXmllint('follows the published schemas (needs xmllint from libxml2)', () => {
    const { status, stderr } = spawnSync('xmllint', ['--noout', '--nonet', '--schema', schema, file], {
      encoding: 'utf8',
    })
    expect({ status, stderr }).toEqual({ status: 0, stderr: expect.stringContaining('validates') as string })
  })

  it('keeps the rules that the schemas do not know', () => {
    expect(objections(text)).toEqual([])
  })

  it.each([
    ['HighResolutionIconUrl is absent', /<HighResolutionIconUrl[^>]*>/, ''],
    ['SupportUrl is absent', /<SupportUrl[^>]*>/, ''],
    ['Runtimes is absent', /<Runtimes>[^]*<\/Runtimes>/, ''],
    ['no resource is called Pane.Uri', 'resid="Pane.Url"', 'resid="Pane.Uri"'],
    ['resource Icon.16 is there twice', '<bt:Image id="Icon.32"', '<bt:Image id="Icon.16"'],
    ['an icon lacks size 80', 'size="80"', 'size="64"'],
    [
      'http://localhost:3000/help.html is not https',
      'https://localhost:3000/help.html',
      'http://localhost:3000/help.html',
    ],
    ['the namespace is no name', '"POISE"', '"2 POISE"'],
    ['set ExcelApis is unknown', 'Name="ExcelApi"', 'Name="ExcelApis"'],
    ['host Workbooks is unknown', 'Name="Workbook"', 'Name="Workbooks"'],
  ])('would be caught: %s', (sentence, right, wrong) => {
    expect(objections(text.replace(right, wrong))).toContain(sentence)
  })

  it('runs pane, functions and commands in one page that lives on', () => {
    const document = parse(text)
    const runtime = only(document, 'Runtime')
    expect(runtime.getAttribute('lifetime')).toBe('long')
    const page = runtime.getAttribute('resid')
    const inside = (name: string) =>
      only(document, name).getElementsByTagNameNS('*', 'SourceLocation')[0]?.getAttribute('resid')
    expect(inside('Page')).toBe(page)
    expect(inside('Action')).toBe(page)
    expect(only(document, 'FunctionFile').getAttribute('resid')).toBe(page)
    expect(all(document, 'TaskpaneId')).toEqual([])
  })

  it('asks for the requirement sets the code is written for, in both places', () => {
    const sets = all(parse(text), 'Set').map((set) => [
      set.getAttribute('Name'),
      set.getAttribute('MinVersion'),
    ])
    const floor = [
      ['SharedRuntime', '1.1'],
      ['CustomFunctionsRuntime', '1.2'],
      ['ExcelApi', '1.12'],
    ]
    expect(sets).toEqual([...floor, ...floor])
  })

  it('carries the version of package.json, so that the host drops what it kept of an older one', () => {
    expect(only(parse(text), 'Version').textContent).toBe(`${packageJson.version}.0`)
  })

  it('names only files that the build or the assets hold', () => {
    const built = ['taskpane.html', 'functions.js', 'functions.json', 'help.html']
    const drawn = [16, 32, 64, 80].map((size) => `assets/icon-${size}.png`)
    const named = [...text.matchAll(/"https:\/\/localhost:3000\/([^"]*)"/g)].map(([, path]) => path)
    expect([...new Set(named)].sort()).toEqual([...built, ...drawn].sort())
  })

  it.each([16, 32, 64, 80, 128])('has an icon of %i pixels a side', (size) => {
    const png = readFileSync(join(root, `assets/icon-${size}.png`))
    // Portable Network Graphics (W3C), 11.2.2: width and height are the first two fields of IHDR, at bytes 16 and 20.
    expect([png.readUInt32BE(16), png.readUInt32BE(20)]).toEqual([size, size])
  })
})

describe('the manifest of a deployment', () => {
  it('replaces the development host everywhere and stays valid', () => {
    const moved = deployed(text, 'https://addins.example.org/poise/')
    expect(moved).not.toContain(development)
    expect(moved).toContain('"https://addins.example.org/poise/taskpane.html"')
    expect(objections(moved)).toEqual([])
  })

  it('stays as it is when no folder is given', () => {
    expect(deployed(text, undefined)).toBe(text)
  })

  it('refuses a folder the host would not load from', () => {
    expect(() => deployed(text, 'http://example.org/')).toThrow('over https only')
    expect(() => deployed(text, 'https://example.org/?a=1')).toThrow('no query')
  })
})

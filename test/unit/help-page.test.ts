import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { describeFunctions } from '../../src/build/functions-metadata.cjs'
import { helpPage } from '../../src/build/help-page.cjs'
import { Fault, type FaultCode } from '../../src/core'
import { associateFunctions } from '../../src/excel'
import { worksheetFunctions } from '../../src/sheet/functions'

interface Described {
  readonly id: string
  readonly helpUrl: string
  readonly parameters: readonly { readonly name: string }[]
}

const file = join(__dirname, '../../src/sheet/functions.ts')
const made = async (source: string) => {
  const { functions } = JSON.parse(await describeFunctions(source)) as { functions: Described[] }
  return { functions, page: helpPage(functions, { file: source, namespace: 'POISE', version: '1.2.3' }) }
}

let functions: readonly Described[]
let page: string
/** the part of the page that a function's help address leads to */
const sectionOf = ({ helpUrl }: Described) =>
  new RegExp(`<section id="${new URL(helpUrl).hash.slice(1)}"[^]*?</section>`).exec(page)?.[0] ?? ''
const under = (section: string, heading: string) =>
  new RegExp(`<h4>${heading}</h4>([^]*?)(?=<h4>|</section>)`).exec(section)?.[1]?.trim() ?? ''

beforeAll(async () => ({ functions, page } = await made(file)))

describe('the help page', () => {
  it('has a section for every worksheet function, where its help address leads', () => {
    expect(functions.map(({ id }) => id)).toEqual(Object.keys(worksheetFunctions))
    for (const one of functions) expect(sectionOf(one)).toContain(`>POISE.${one.id}</a>`)
  })

  it.each(['Arguments', 'Result', 'Formula', 'Example', 'What it refuses', 'Source'])(
    'tells of each function under the heading %s',
    (heading) => {
      for (const one of functions)
        expect([one.id, under(sectionOf(one), heading)]).toEqual([one.id, expect.stringMatching(/\w/)])
    },
  )

  it('names every argument in its section', () => {
    for (const one of functions)
      for (const { name } of one.parameters)
        expect(under(sectionOf(one), 'Arguments')).toContain(`<code>${name}</code>`)
  })

  it('has no anchor that leads nowhere, and none twice', () => {
    const places = [...page.matchAll(/ id="([^"]+)"/g)].map(([, id]) => id)
    const leads = [...page.matchAll(/href="([^"]+)"/g)].map(([, href]) => href!)
    expect(new Set(places).size).toBe(places.length)
    expect(leads.length).toBeGreaterThan(functions.length)
    expect(leads.filter((href) => !href.startsWith('#') || !places.includes(href.slice(1)))).toEqual([])
  })

  it('lists every function in its table of contents', () => {
    const contents = /<nav[^]*<\/nav>/.exec(page)?.[0]
    for (const { id, helpUrl } of functions)
      expect(contents).toContain(`<a href="${new URL(helpUrl).hash}">${id}</a>`)
  })

  it('needs nothing but itself: no script, no picture, no address outside', () => {
    expect(page).not.toMatch(/<script|<img|<link|https?:|url\(/)
    expect(page).toContain(`content="default-src 'none'; style-src 'unsafe-inline'"`)
  })

  it('shows examples as they are typed, with the cells they give', () => {
    const volatility = functions.find(({ id }) => id === 'VOLATILITY')!
    expect(under(sectionOf(volatility), 'Example')).toContain(
      '<code>=POISE.VOLATILITY({0.5;0.5}, {0.04,0;0,0.01})</code><table aria-label="Result"><tr><td>0.1118</td></tr></table>',
    )
    const breakdown = functions.find(({ id }) => id === 'BREAKDOWN')!
    expect(under(sectionOf(breakdown), 'Example')).toContain(
      '<code>=INDEX(POISE.BREAKDOWN({&quot;A&quot;;&quot;B&quot;}, {0.5;0.5}, {0.04,0;0,0.01}), 2, 0)</code>',
    )
    const shares = functions.find(({ id }) => id === 'RISKSHARE')!
    expect(under(sectionOf(shares), 'Example')).toContain('<tr><td>0.8</td><td>0.2</td></tr>')
  })

  it('sets formulas with low and high signs, roots and slanted letters', () => {
    const contribution = functions.find(({ id }) => id === 'CONTRIBUTION')!
    expect(under(sectionOf(contribution), 'Formula')).toBe(
      '<p class="formula"><i>c</i><sub><i>i</i></sub> = <i>w</i><sub><i>i</i></sub> (<i>C</i> <i>w</i>)<sub><i>i</i></sub> / <i>s</i></p>',
    )
    const volatility = functions.find(({ id }) => id === 'VOLATILITY')!
    expect(under(sectionOf(volatility), 'Formula')).toContain(
      '√<span class="root"><i>w</i>′ <i>C</i> <i>w</i></span>',
    )
  })

  it('says of each kind of fault the error that the cell shows', () => {
    const told = [...page.matchAll(/<dt id="fault-([a-z-]+)">.*?<small>(.*?)<\/small>/g)]
    expect(told.length).toBeGreaterThan(10)
    class CellError {
      constructor(readonly code: string) {}
    }
    for (const [, code, error] of told) {
      let body: () => unknown = () => null
      Object.assign(globalThis, {
        CustomFunctions: {
          associate: (_: string, given: () => unknown) => (body = given),
          Error: CellError,
          ErrorCode: { invalidValue: '#VALUE!', notAvailable: '#N/A' },
        },
      })
      associateFunctions({
        ANY: () => {
          throw new Fault(code as FaultCode, 'found', 'needed')
        },
      })
      expect(body).toThrow(expect.objectContaining({ code: error }) as Error)
    }
    Reflect.deleteProperty(globalThis, 'CustomFunctions')
  })
})

describe('a comment the page cannot be made from', () => {
  const comment = {
    customfunction: 'SPREAD',
    helpurl: 'https://example.org/help.html#spread',
    'param a': 'The first',
    returns: 'One number',
    formula: 'a',
    throws: 'Fault "blank"',
    source: 'common practice, no source',
    example: 'worksheetFunctions.SPREAD(1) // 1',
  }
  const pageOf = async (change: Record<string, string | null>) => {
    const folder = mkdtempSync(join(tmpdir(), 'help-'))
    const source = join(folder, 'functions.ts')
    const tags = Object.entries({ ...comment, ...change }).flatMap(([tag, text]) =>
      text === null ? [] : [` * @${tag} ${text}`],
    )
    writeFileSync(
      source,
      `/**\n * Difference.\n${tags.join('\n')}\n */\nexport function spread(a: unknown): number { return Number(a) }\n`,
    )
    try {
      return (await made(source)).page
    } finally {
      rmSync(folder, { recursive: true })
    }
  }

  it('is told from one that is in order', async () => {
    await expect(pageOf({})).resolves.toContain('<code>=POISE.SPREAD(1)</code>')
  })

  it.each(['returns', 'formula', 'throws', 'source', 'example'])('is one without @%s', async (tag) => {
    await expect(pageOf({ [tag]: null })).rejects.toThrow(`SPREAD: @${tag} is missing`)
  })

  it.each([
    ['names a fault that is not known', { throws: 'Fault "blanc"' }, 'SPREAD: @throws "blanc" is not known'],
    ['refers to a function that is not there', { throws: 'Fault as SPREED' }, 'SPREED: @throws'],
    ['leaves a bracket of the formula open', { formula: 'sqrt(a' }, 'a bracket stays open'],
    ['closes a bracket of the formula too many', { formula: 'a)' }, 'cannot set the formula a)'],
    [
      'has an example no cell can hold',
      { example: 'worksheetFunctions.SPREAD(other) // 1' },
      'an example holds other',
    ],
  ])('%s', async (_, change, sentence) => {
    await expect(pageOf(change)).rejects.toThrow(sentence)
  })

  it('does not let an escape slip', async () => {
    await expect(pageOf({ returns: 'a < b & c' })).resolves.toContain('<p>a &lt; b &amp; c</p>')
  })
})

import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { gzipSync } from 'node:zlib'
import { root } from '../../src/build/bundles.cjs'

const dist = join(root, 'dist')
const page = (name: string) => readFileSync(join(dist, name), 'utf8')
const scripts = (html: string) =>
  [...html.matchAll(/<script[^>]*\ssrc="?([^"\s>]+)/g)].map(([, source]) => source!.split('?')[0]!)
const policy = (html: string) => /content="?(default-src[^">]*)/.exec(html)?.[1] ?? ''

describe('taskpane.html', () => {
  const own = scripts(page('taskpane.html')).filter((source) => !source.includes('://'))

  it("loads the host's script first, then only its own", () => {
    const [first, ...rest] = scripts(page('taskpane.html'))
    expect(first).toBe('https://appsforoffice.microsoft.com/lib/1/hosted/office.js')
    expect(rest).toEqual(own)
    expect(own).toContain('functions.js')
  })

  it('needs at most 250 kB of its own script, compressed, before it shows anything', () => {
    // The limit is the project's own; gzip level 9 of each file as served.
    const bytes = own.map((source) => gzipSync(readFileSync(join(dist, source)), { level: 9 }).length)
    expect(bytes.reduce((total, size) => total + size, 0)).toBeLessThan(250_000)
  })

  it('holds neither the grid of the desk nor the algebra library', () => {
    for (const source of own) {
      expect(readFileSync(join(dist, source), 'utf8')).not.toMatch(/univer|mathjs/i)
    }
  })
})

describe('the content security policy', () => {
  it.each([
    ['taskpane.html', "script-src 'self' 'wasm-unsafe-eval' https://appsforoffice.microsoft.com;"],
    ['desk.html', "script-src 'self' 'wasm-unsafe-eval';"],
  ])(
    'of %s lets scripts come from the add-in and its host alone, and lets nothing be sent elsewhere',
    (name, line) => {
      expect(policy(page(name))).toContain(line)
      expect(policy(page(name))).toContain("default-src 'none';")
      expect(policy(page(name))).toContain("connect-src 'self';")
    },
  )
})

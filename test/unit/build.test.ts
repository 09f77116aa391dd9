import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { request } from 'node:http'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { serve } from '../../src/build/server.cjs'

describe('the server of the desk', () => {
  const folder = mkdtempSync(join(tmpdir(), 'serve-'))
  mkdirSync(join(folder, 'dist/desk'), { recursive: true })
  writeFileSync(join(folder, 'secret.txt'), 'outside')
  writeFileSync(join(folder, 'dist/.stamp'), 'hidden')
  writeFileSync(join(folder, 'dist/desk.html'), '<p>home')
  writeFileSync(join(folder, 'dist/desk/a b.js'), '1')
  let server: Awaited<ReturnType<typeof serve>>
  beforeAll(async () => {
    server = await serve(join(folder, 'dist'), { home: 'desk.html' })
  })
  afterAll(async () => {
    await server.close()
    rmSync(folder, { recursive: true })
  })

  /** Asks for a path as it is written: fetch would tidy it first. */
  const ask = (path: string, method = 'GET') =>
    new Promise<{ status: number | undefined; type: string | undefined; body: string }>((resolve, reject) => {
      const { port } = new URL(server.url)
      request({ host: '127.0.0.1', port, path, method }, (response) => {
        let body = ''
        response.on('data', (part: Buffer) => (body += part.toString()))
        response.on('end', () =>
          resolve({ status: response.statusCode, type: response.headers['content-type'], body }),
        )
      })
        .on('error', reject)
        .end()
    })

  it('answers "/" with the home page and a file with its type', async () => {
    expect(await ask('/')).toEqual({ status: 200, type: 'text/html; charset=utf-8', body: '<p>home' })
    expect(await ask('/desk/a%20b.js?x=1')).toEqual({
      status: 200,
      type: 'text/javascript; charset=utf-8',
      body: '1',
    })
  })

  it.each([
    '/../secret.txt',
    '/..%2fsecret.txt',
    '/%2e%2e/secret.txt',
    '/.stamp',
    '/desk',
    '/none',
    '/%',
    '/%00',
  ])('has nothing to say to %s', async (path) => {
    expect((await ask(path)).status).toBe(404)
  })

  it('only gives', async () => {
    expect((await ask('/', 'POST')).status).toBe(404)
    expect(await ask('/', 'HEAD')).toMatchObject({ status: 200, body: '' })
  })

  it('says so when a port is taken', async () => {
    const port = Number(new URL(server.url).port)
    await expect(serve(folder, { home: 'x', port })).rejects.toMatchObject({ code: 'EADDRINUSE' })
  })
})

const fs = require('node:fs')
const http = require('node:http')
const https = require('node:https')
const path = require('node:path')

const types = {
  '.css': 'text/css; charset=utf-8',
  '.html': 'text/html; charset=utf-8',
  '.js': 'text/javascript; charset=utf-8',
  '.json': 'application/json; charset=utf-8',
  '.map': 'application/json; charset=utf-8',
  '.png': 'image/png',
  '.svg': 'image/svg+xml',
  '.ttf': 'font/ttf',
  '.woff2': 'font/woff2',
  '.xlsx': 'application/vnd.openxmlformats-officedocument.spreadsheetml.sheet',
  '.xml': 'text/xml; charset=utf-8',
}

/** The file of `folder` that a request asks for, or null: nothing above the folder, nothing hidden. */
function wanted(folder, url, home) {
  let name
  try {
    name = decodeURIComponent(new URL(url, 'http://localhost').pathname)
  } catch {
    return null
  }
  if (name.includes('\0') || name.split(/[/\\]/).some((part) => part.startsWith('.'))) return null
  const file = path.join(folder, name === '/' ? home : name)
  return fs.statSync(file, { throwIfNoEntry: false })?.isFile() ? file : null
}

/**
 * Serves the files of a folder to this machine only.
 *
 * @param {string} folder
 * @param {{ home: string, port?: number, certificate?: import('node:https').ServerOptions }} options
 *   home: what "/" is; port: the one to try, 0 for any free one; certificate: serves over https
 * @returns the address, and close()
 * @throws Error  EADDRINUSE when the port is taken
 */
function serve(folder, { home, port = 0, certificate }) {
  const answer = (request, response) => {
    const file = ['GET', 'HEAD'].includes(request.method) ? wanted(folder, request.url, home) : null
    if (!file) {
      response.writeHead(404, { 'Content-Type': 'text/plain' }).end('Not found')
      return
    }
    response.writeHead(200, {
      'Content-Type': types[path.extname(file)] ?? 'application/octet-stream',
      'Cache-Control': 'no-cache',
      'X-Content-Type-Options': 'nosniff',
      // Excel on the web reads functions.json and functions.js from a page of its own.
      ...(certificate ? { 'Access-Control-Allow-Origin': '*' } : {}),
    })
    if (request.method === 'HEAD') response.end()
    else fs.createReadStream(file).pipe(response)
  }
  const server = certificate ? https.createServer(certificate, answer) : http.createServer(answer)
  return new Promise((resolve, reject) => {
    server.once('error', reject)
    server.listen(port, '127.0.0.1', () => {
      const url = `${certificate ? 'https' : 'http'}://localhost:${server.address().port}/`
      const close = () =>
        new Promise((done) => {
          server.close(done)
          server.closeAllConnections()
        })
      resolve({ url, close })
    })
  })
}

module.exports = { serve }

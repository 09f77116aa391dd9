// npm run desk: builds what is stale and serves the desk. With --excel: the add-in for Excel, over https, rebuilt as sources change.
import { join } from 'node:path'
import bundles from './bundles.cjs'
import server from './server.cjs'

const dist = join(bundles.root, 'dist')

async function serveExcel() {
  // Asked for here only: it may put a certificate authority of its own into the user's store, and asks first.
  const { getHttpsServerOptions } = await import('office-addin-dev-certs')
  const certificate = await getHttpsServerOptions()
  await bundles.follow(['addin', 'functions'], (said) => console.log(said))
  // The manifest names this port, so there is no other to fall back to.
  const { url } = await server.serve(dist, { home: 'taskpane.html', port: 3000, certificate })
  console.log(`The add-in is served at ${url}`)
}

async function serveDesk() {
  const began = performance.now()
  const made = await bundles.refresh(['addin', 'functions', 'desk'])
  const seconds = ((performance.now() - began) / 1000).toFixed(1)
  if (made.length > 0) console.log(`Built ${made.join(', ')} in ${seconds} s.`)
  const options = { home: 'desk.html' }
  const { url } = await server.serve(dist, { ...options, port: 3100 }).catch((error) => {
    if (error.code !== 'EADDRINUSE') throw error
    return server.serve(dist, options)
  })
  console.log(`The desk is open at ${url} (stop with Ctrl+C)`)
}

await (process.argv.includes('--excel') ? serveExcel() : serveDesk())

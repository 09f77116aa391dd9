// Compiles an AssemblyScript source to the bytes of a WebAssembly module, synchronously, because webpack's
// loaders and Jest's transforms may ask in the middle of a synchronous require. Results are kept under
// node_modules/.cache, keyed by source, compiler and flags; several processes may compile at once.
const { execFileSync } = require('node:child_process')
const { createHash } = require('node:crypto')
const fs = require('node:fs')
const path = require('node:path')

const flags = [
  '-O3',
  '--noAssert',
  '--runtime',
  'stub',
  '--enable',
  'simd',
  '--importMemory',
  '--noExportMemory',
]
const compiler = path.join(path.dirname(require.resolve('assemblyscript/package.json')), 'bin', 'asc.js')
const { version } = require('assemblyscript/package.json')
const cache = path.resolve(__dirname, '../../node_modules/.cache/kernel')

/** @param {string} file path of an .as source @returns {Buffer} the module */
function compileKernel(file) {
  const source = fs.readFileSync(file, 'utf8')
  const key = createHash('sha256')
    .update([version, ...flags, source].join('\0'))
    .digest('hex')
    .slice(0, 24)
  const kept = path.join(cache, `${key}.wasm`)
  if (fs.existsSync(kept)) return fs.readFileSync(kept)

  // The compiler insists on the extension .ts, and a rename is the one way to publish a whole file at once.
  fs.mkdirSync(cache, { recursive: true })
  const work = fs.mkdtempSync(path.join(cache, 'work-'))
  try {
    fs.writeFileSync(path.join(work, 'kernel.ts'), source)
    execFileSync(process.execPath, [compiler, 'kernel.ts', '-o', 'kernel.wasm', ...flags], {
      cwd: work,
      stdio: ['ignore', 'ignore', 'pipe'],
    })
    fs.renameSync(path.join(work, 'kernel.wasm'), kept)
  } catch (error) {
    throw new Error(`${path.basename(file)} does not compile:\n${error.stderr ?? error.message}`, {
      cause: error,
    })
  } finally {
    fs.rmSync(work, { recursive: true, force: true })
  }
  return fs.readFileSync(kept)
}

/** The module's bytes as a JavaScript literal: needs no decoder in whatever host loads it. */
const literal = (/** @type {Buffer} */ bytes) => `new Uint8Array([${Array.from(bytes).join(',')}])`

module.exports = { compileKernel, literal }

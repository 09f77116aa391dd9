// Jest transform: the same as the webpack loader, in the module form Jest runs.
const { createHash } = require('node:crypto')
const fs = require('node:fs')
const path = require('node:path')
const { compileKernel, literal } = require('./kernel.cjs')

const self = [__filename, path.join(__dirname, 'kernel.cjs')]
  .map((file) => fs.readFileSync(file, 'utf8'))
  .join('')

module.exports = {
  process: (_source, file) => ({
    code: `Object.defineProperty(exports, '__esModule', { value: true })\nexports.default = ${literal(compileKernel(file))}`,
  }),
  getCacheKey: (source) => createHash('sha256').update(self).update(source).digest('hex'),
}

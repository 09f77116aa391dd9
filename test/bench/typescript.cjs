// Lets plain node require the project's TypeScript, and its kernel sources, for the benchmarks.
const fs = require('node:fs')
const { transformSync } = require('@swc/core')
const { compileKernel, literal } = require('../../src/build/kernel.cjs')

require.extensions['.ts'] = (module, file) => {
  const { code } = transformSync(fs.readFileSync(file, 'utf8'), {
    filename: file,
    jsc: { target: 'es2022', parser: { syntax: 'typescript' } },
    module: { type: 'commonjs' },
    sourceMaps: 'inline',
  })
  module._compile(code, file)
}
require.extensions['.as'] = (module, file) => {
  module._compile(`exports.__esModule = true; exports.default = ${literal(compileKernel(file))}`, file)
}

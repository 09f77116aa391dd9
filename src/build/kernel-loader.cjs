// webpack loader: an .as source becomes a module whose default export is the compiled kernel's bytes.
const { compileKernel, literal } = require('./kernel.cjs')

module.exports = function kernelLoader() {
  return `export default ${literal(compileKernel(this.resourcePath))}`
}

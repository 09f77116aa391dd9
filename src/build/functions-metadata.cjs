const fs = require('node:fs')
const { generateCustomFunctionsMetadata } = require('custom-functions-metadata')
const { Compilation, sources, WebpackError } = require('webpack')

/** Names that a cell would read as a reference: A1 to XFD1048576, and the R1C1 forms. */
const reference = /^([A-Z]{1,3}[0-9]+|R[0-9]*(C[0-9]*)?|C[0-9]*)$/

/** What the generator lets through and the host or the store does not; one sentence for each. */
function objections({ id, name, description, helpUrl, parameters, result }) {
  const found = []
  if (id !== name) found.push(`id and name differ ("${name}")`)
  if (!/^[A-Z][A-Z0-9._]{2,}$/.test(id)) found.push('an id has 3 or more capitals, digits, "_" or "."')
  if (reference.test(id)) found.push('a cell would read the id as a reference')
  if (!description) found.push('the description is missing')
  if (!helpUrl || !URL.canParse(helpUrl) || new URL(helpUrl).protocol !== 'https:') {
    found.push(`@helpurl is "${helpUrl ?? ''}"; an https address is needed`)
  }
  if (!result.type) found.push('the type of the result is unknown')
  for (const parameter of parameters) {
    if (!parameter.type) found.push(`the type of ${parameter.name} is unknown`)
    if (parameter.repeating) found.push(`${parameter.name} repeats; write unknown[][] for a block of cells`)
    if (!parameter.description) found.push(`@param ${parameter.name} is missing`)
  }
  return found.map((sentence) => `${id}: ${sentence}`)
}

/**
 * Describes the worksheet functions for the host, from the JSDoc and the signatures in one source file.
 * Error cells among the arguments stay the host's business: it returns the error and does not call the function.
 *
 * @returns the text of functions.json
 * @throws Error  with one line for each thing that is wrong
 */
async function describeFunctions(file) {
  const { metadataJson, errors } = await generateCustomFunctionsMetadata(file)
  if (errors.length > 0) throw new Error(errors.join('\n'))
  if (!metadataJson) throw new Error(`${file} declares no worksheet function`)
  const wrong = JSON.parse(metadataJson).functions.flatMap(objections)
  if (wrong.length > 0) throw new Error(wrong.join('\n'))
  return `${metadataJson}\n`
}

/** Emits the description beside the bundle. */
class FunctionsMetadata {
  constructor({ source, filename }) {
    this.source = source
    this.filename = filename
  }

  apply(compiler) {
    compiler.hooks.thisCompilation.tap('FunctionsMetadata', (compilation) => {
      const stage = Compilation.PROCESS_ASSETS_STAGE_ADDITIONAL
      compilation.hooks.processAssets.tapPromise({ name: 'FunctionsMetadata', stage }, async () => {
        compilation.fileDependencies.add(this.source)
        if (!fs.existsSync(this.source)) {
          compilation.warnings.push(
            new WebpackError(`${this.source} does not exist yet; no ${this.filename}`),
          )
          return
        }
        try {
          compilation.emitAsset(this.filename, new sources.RawSource(await describeFunctions(this.source)))
        } catch (error) {
          compilation.errors.push(new WebpackError(error.message))
        }
      })
    })
  }
}

module.exports = { FunctionsMetadata, describeFunctions }

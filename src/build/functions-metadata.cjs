const { generateCustomFunctionsMetadata } = require('custom-functions-metadata')
const { Compilation, sources, WebpackError } = require('webpack')
const { version } = require('../../package.json')
const { helpPage } = require('./help-page.cjs')

/** Names that a cell would read as a reference: A1 to XFD1048576, and the R1C1 forms. */
const reference = /^([A-Z]{1,3}[0-9]+|R[0-9]*(C[0-9]*)?|C[0-9]*)$/

/** What the generator lets through and the host or the store does not; one sentence for each. */
function objections({ id, name, description, helpUrl, parameters }) {
  const found = []
  if (id !== name) found.push(`id and name differ ("${name}")`)
  if (!/^[A-Z][A-Z0-9._]{2,}$/.test(id)) found.push('an id has 3 or more capitals, digits, "_" or "."')
  if (reference.test(id)) found.push('a cell would read the id as a reference')
  if (!description) found.push('the description is missing')
  if (!helpUrl || !URL.canParse(helpUrl) || new URL(helpUrl).protocol !== 'https:') {
    found.push(`@helpurl is "${helpUrl ?? ''}"; an https address is needed`)
  }
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
  const { functions } = JSON.parse(metadataJson)
  const wrong = functions.flatMap(objections)
  if (wrong.length > 0) throw new Error(wrong.join('\n'))
  // Cells reach the functions as plain numbers, texts and booleans, richer data types as their plain value.
  return `${JSON.stringify({ functions }, null, 2)}\n`
}

/**
 * Emits functions.json, which describes the functions of `source`, and help.html beside the bundle; `moved` turns the
 * addresses in it from the development host to where the add-in is deployed.
 */
class FunctionsMetadata {
  constructor({ source, namespace, moved }) {
    this.source = source
    this.namespace = namespace
    this.moved = moved
  }

  apply(compiler) {
    compiler.hooks.thisCompilation.tap('FunctionsMetadata', (compilation) => {
      const stage = Compilation.PROCESS_ASSETS_STAGE_ADDITIONAL
      compilation.hooks.processAssets.tapPromise({ name: 'FunctionsMetadata', stage }, async () => {
        compilation.fileDependencies.add(this.source)
        try {
          const description = this.moved(await describeFunctions(this.source))
          compilation.emitAsset('functions.json', new sources.RawSource(description))
          const page = helpPage(JSON.parse(description).functions, {
            file: this.source,
            namespace: this.namespace,
            version,
          })
          compilation.emitAsset('help.html', new sources.RawSource(page))
        } catch (error) {
          compilation.errors.push(new WebpackError(error.message))
        }
      })
    })
  }
}

module.exports = { FunctionsMetadata, describeFunctions, objections }

/**
 * The wall between the folders of src. One table says who may import whom; the rule below resolves every relative
 * import, re-export, dynamic import, type import and `new URL(…, import.meta.url)` and reports
 *   - a crossing the table does not list,
 *   - a crossing that enters another folder elsewhere than by its index.ts,
 *   - an import from src of something outside src.
 * A key is a folder, or a single file of it that has its own line; `types` lists what may be imported as types only.
 */
const path = require('node:path')

const table = {
  core: { values: [] },
  sheet: { values: ['core'] },
  excel: { values: ['sheet', 'core'] },
  pane: { values: ['sheet', 'core'] },
  entry: { values: ['core', 'sheet', 'excel', 'pane'] },
  'entry/desk': { values: ['desk'] },
  desk: { values: [], types: ['core', 'sheet', 'excel', 'pane'] },
  build: { values: [] },
}

const source = path.resolve(__dirname, '../../src')

/** Splits an absolute path into its folder of src and the rest without its extension; null when it lies outside src. */
function place(file) {
  const inside = path.relative(source, file)
  if (inside === '' || inside.startsWith('..') || path.isAbsolute(inside)) return null
  const [folder, ...rest] = inside.split(path.sep)
  return { folder, rest: rest.join('/').replace(/\.(d\.)?[cm]?[jt]sx?$/, '') }
}

/** The sentence to report for an import, or null when the wall lets it through. */
function judge(importer, specifier, typesOnly) {
  const from = place(importer)
  if (!from || !specifier.startsWith('.')) return null
  const to = place(path.resolve(path.dirname(importer), specifier))
  if (!to) return `src/${from.folder} imports "${specifier}", which lies outside src`
  if (to.folder === from.folder) return null
  const line = table[`${from.folder}/${from.rest}`] ?? table[from.folder]
  if (!line) return `src/${from.folder} has no line in the table of the wall`
  if (!line.values.includes(to.folder)) {
    if (!line.types?.includes(to.folder)) return `src/${from.folder} may not import src/${to.folder}`
    if (!typesOnly) return `src/${from.folder} may import only types from src/${to.folder} ("import type")`
  }
  if (to.rest !== '' && to.rest !== 'index') {
    return `src/${to.folder} is entered through its index.ts, not through "${to.rest}"`
  }
  return null
}

const text = (node) => (node?.type === 'Literal' && typeof node.value === 'string' ? node.value : null)
const isImportMetaUrl = (node) =>
  node?.type === 'MemberExpression' && node.object.type === 'MetaProperty' && node.property.name === 'url'

const wall = {
  meta: {
    type: 'problem',
    schema: [],
    docs: { description: 'imports between the folders of src go one way' },
  },
  create(context) {
    const check = (node, sourceNode, typesOnly) => {
      const specifier = text(sourceNode)
      const message = specifier === null ? null : judge(context.filename, specifier, typesOnly)
      if (message) context.report({ node, message })
    }
    return {
      ImportDeclaration: (node) => check(node, node.source, node.importKind === 'type'),
      ExportNamedDeclaration: (node) => check(node, node.source, node.exportKind === 'type'),
      ExportAllDeclaration: (node) => check(node, node.source, node.exportKind === 'type'),
      ImportExpression: (node) => check(node, node.source, false),
      TSImportType: (node) => check(node, node.source ?? node.argument?.literal, true),
      TSExternalModuleReference: (node) => check(node, node.expression, false),
      NewExpression(node) {
        if (node.callee.name === 'URL' && isImportMetaUrl(node.arguments[1]))
          check(node, node.arguments[0], false)
      },
      CallExpression(node) {
        if (node.callee.name === 'require') check(node, node.arguments[0], false)
      },
    }
  },
}

module.exports = { table, judge, plugin: { rules: { wall } } }

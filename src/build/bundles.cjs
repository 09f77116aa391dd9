// Which bundles in dist are older than what they are made of, and how to make those anew.
const { createHash } = require('node:crypto')
const fs = require('node:fs')
const path = require('node:path')

const root = path.resolve(__dirname, '../..')
const stamp = (name) => path.join(root, 'dist', `.${name}.stamp`)

/** What every bundle is made with, and what each is made of. */
const shared = ['package.json', 'package-lock.json', 'webpack.config.js', '.swcrc', 'src/build']
const made = {
  addin: ['src/core', 'src/sheet', 'src/excel', 'src/pane', 'src/entry', 'assets', 'manifest.xml'],
  functions: ['src/core', 'src/sheet', 'src/excel', 'src/entry'],
  desk: ['src/desk', 'src/entry', 'assets'],
}

function* files(entry) {
  if (!fs.existsSync(entry)) return
  if (!fs.statSync(entry).isDirectory()) return yield entry
  for (const name of fs.readdirSync(entry).sort()) yield* files(path.join(entry, name))
}

/** One number for everything a bundle depends on: its sources, its tools, the mode and the folder it is deployed to. */
function fingerprint(name, mode) {
  const hash = createHash('sha256').update(`${mode} ${process.env.ADDIN_URL ?? ''}`)
  for (const entry of [...shared, ...made[name]]) {
    for (const file of files(path.join(root, entry))) {
      hash.update(path.relative(root, file)).update(fs.readFileSync(file))
    }
  }
  return hash.digest('hex')
}

const isFresh = (name, mode) =>
  fs.existsSync(stamp(name)) && fs.readFileSync(stamp(name), 'utf8') === fingerprint(name, mode)

/** A webpack plugin: leaves word in dist of what a bundle was made of, taken before it is made. */
class Stamp {
  constructor(name, mode) {
    this.name = name
    this.mode = mode
  }

  apply(compiler) {
    let before
    const take = () => {
      before = fingerprint(this.name, this.mode)
      fs.rmSync(stamp(this.name), { force: true })
    }
    compiler.hooks.run.tap('Stamp', take)
    compiler.hooks.watchRun.tap('Stamp', take)
    compiler.hooks.done.tap('Stamp', (stats) => {
      if (!stats.hasErrors()) fs.writeFileSync(stamp(this.name), before)
    })
  }
}

const configurations = (names, mode) => {
  const every = require('../../webpack.config.js').map((make) => make({}, { mode }))
  return every.filter(({ name }) => names.includes(name))
}

/**
 * Makes those of the named bundles that are older than their sources.
 *
 * @returns the names of those made
 * @throws Error  what webpack reports, when a bundle cannot be made
 */
async function refresh(names, mode = 'production') {
  const stale = names.filter((name) => !isFresh(name, mode))
  if (stale.length === 0) return stale
  const webpack = require('webpack')
  const compiler = webpack(configurations(stale, mode))
  const stats = await new Promise((resolve, reject) =>
    compiler.run((error, result) => (error ? reject(error) : resolve(result))),
  )
  // Closing writes the cache: the next start is the fast one.
  await new Promise((resolve, reject) => compiler.close((error) => (error ? reject(error) : resolve())))
  if (stats.hasErrors()) throw new Error(stats.toString('errors-only'))
  return stale
}

/**
 * Makes the named bundles and keeps making them as their sources change; `report` hears what webpack has to say.
 *
 * @returns once the first time is over
 */
function follow(names, report) {
  const webpack = require('webpack')
  return new Promise((resolve) => {
    webpack(configurations(names, 'development')).watch({}, (error, stats) => {
      report(error ? error.message : stats.toString('errors-warnings') || 'Built.')
      resolve()
    })
  })
}

module.exports = { Stamp, follow, refresh, root }

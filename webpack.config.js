const path = require('node:path')
const { DefinePlugin } = require('webpack')
const CopyPlugin = require('copy-webpack-plugin')
const CssPlugin = require('mini-css-extract-plugin')
const HtmlPlugin = require('html-webpack-plugin')
const MinimizerPlugin = require('minimizer-webpack-plugin')
const { Stamp } = require('./src/build/bundles.cjs')
const { FunctionsMetadata } = require('./src/build/functions-metadata.cjs')
const { deployed } = require('./src/build/manifest.cjs')
const { contentSecurityPolicy, officeHost } = require('./src/build/policy.cjs')
const { version } = require('./package.json')

/** ADDIN_URL: the https folder a release is served from; without it everything points at the development host. */
const toDeployment = (text) => deployed(text, process.env.ADDIN_URL)
const at = (...parts) => path.resolve(__dirname, ...parts)

/** What the bundles have in common. Types are checked by tsc, not here; how sources are compiled stands in .swcrc. */
const base = (name, mode, { plugins, ...rest }) => ({
  name,
  mode,
  context: __dirname,
  devtool: mode === 'development' ? 'source-map' : false,
  resolve: { extensions: ['.tsx', '.ts', '.mjs', '.js'] },
  module: {
    rules: [
      { test: /\.tsx?$/, exclude: /node_modules/, loader: 'swc-loader' },
      // AssemblyScript: the module's value is the bytes it compiles to.
      { test: /\.as$/, loader: at('src/build/kernel-loader.cjs') },
      { test: /\.css$/, use: [CssPlugin.loader, 'css-loader'] },
    ],
  },
  cache: {
    type: 'filesystem',
    cacheDirectory: at('node_modules/.cache/webpack'),
    buildDependencies: { config: [__filename, at('package-lock.json'), at('.swcrc')] },
  },
  // The compiler's own minifier takes 8 s for the pane where webpack's default takes 21, for the same 189 kB gzip.
  // It has threads of its own and needs no further processes.
  optimization: { minimizer: [new MinimizerPlugin({ minify: MinimizerPlugin.swcMinify, parallel: false })] },
  performance: { hints: false },
  stats: 'errors-warnings',
  plugins: [new Stamp(name, mode), ...plugins],
  ...rest,
})

/** One page: its html, and its hashed chunks in a folder of its own, which find each other relative to themselves. */
const page = (name, entry, { version }) => ({
  entry: { [name]: entry },
  output: {
    path: at('dist'),
    filename: `${name}/[name].[contenthash:8].js`,
    chunkFilename: `${name}/[name].[contenthash:8].js`,
    assetModuleFilename: `${name}/[name].[contenthash:8][ext]`,
    publicPath: 'auto',
    clean: { keep: (file) => !file.startsWith(`${name}/`) },
    // The pane's chunks and the desk's are loaded into one document.
    uniqueName: `counterpoise-${name}`,
  },
  plugins: [
    new DefinePlugin({ COUNTERPOISE_VERSION: JSON.stringify(version) }),
    new CssPlugin({
      filename: `${name}/[name].[contenthash:8].css`,
      chunkFilename: `${name}/[name].[contenthash:8].css`,
    }),
    new HtmlPlugin({
      filename: `${name}.html`,
      template: `src/entry/${name}.html`,
      templateParameters: { policy: contentSecurityPolicy(name), officeHost, version },
      minify: false,
    }),
  ],
})

/** The task pane, the same in Excel and in the desk, with the manifest and the icons beside it. */
function addin(_env, { mode = 'production' }) {
  const config = base('addin', mode, page('taskpane', './src/entry/taskpane.tsx', { version }))
  config.plugins.push(
    new CopyPlugin({
      patterns: [
        { from: 'assets/icon-*.png', to: 'assets/[name][ext]' },
        { from: 'manifest.xml', transform: (xml) => toDeployment(xml.toString()) },
      ],
    }),
  )
  return config
}

/** The worksheet functions: one plain script that registers them wherever CustomFunctions is, and what describes them. */
function functions(_env, { mode = 'production' }) {
  return base('functions', mode, {
    entry: { functions: './src/entry/functions.ts' },
    output: { path: at('dist'), filename: '[name].js', globalObject: 'globalThis', publicPath: '' },
    plugins: [
      new FunctionsMetadata({
        source: at('src/sheet/functions.ts'),
        namespace: 'POISE',
        moved: toDeployment,
      }),
    ],
  })
}

/** The local workbook: big, slow to build, never part of the add-in. */
function desk(_env, { mode = 'production' }) {
  const config = base('desk', mode, page('desk', './src/entry/desk.ts', { version }))
  config.plugins.push(
    new CopyPlugin({ patterns: [{ from: 'assets/demo.xlsx', to: 'assets/', noErrorOnMissing: true }] }),
  )
  // Served from this machine only: a minute of minifying would buy nothing.
  config.optimization = { minimize: false }
  return config
}

module.exports = [addin, functions, desk]

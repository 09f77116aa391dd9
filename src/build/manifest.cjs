const development = 'https://localhost:3000'

/**
 * The manifest for a deployment: the development host gives way to the folder the add-in is served from.
 * Without a folder the manifest stays as it is.
 */
function deployed(manifest, folder) {
  if (!folder) return manifest
  const url = new URL(folder)
  if (url.protocol !== 'https:')
    throw new Error(`ADDIN_URL is ${folder}; the host loads add-ins over https only`)
  if (url.search || url.hash) throw new Error(`ADDIN_URL is ${folder}; a folder has no query and no fragment`)
  return manifest.replaceAll(development, url.href.replace(/\/+$/, ''))
}

module.exports = { deployed, development }

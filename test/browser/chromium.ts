import { execFileSync } from 'node:child_process'
import { existsSync, mkdirSync, mkdtempSync, readFileSync, renameSync, rmSync, writeFileSync } from 'node:fs'
import { dirname, join, resolve } from 'node:path'
import { brotliDecompressSync } from 'node:zlib'
import packed from '@sparticuz/chromium'
import { chromium, type Browser } from 'playwright-core'

/** Where the npm package's browser lies once unpacked; a new version of the package gets a folder of its own. */
const manifest = join(dirname(require.resolve('@sparticuz/chromium')), '../../package.json')
const { version } = JSON.parse(readFileSync(manifest, 'utf8')) as { version: string }
const folder = resolve(__dirname, '../../node_modules/.cache', `chromium-${version}`)
const executable = join(folder, 'chromium')
const libraries = join(folder, 'lib')
const fontList = join(folder, 'fonts.conf')

const fromPackage = process.platform === 'linux' && process.arch === 'x64'

/** Flags made for one page in one process; with them a second browser context dies, and the page's own policy is not enforced. */
const unwanted = new Set([
  '--single-process',
  '--no-zygote',
  '--in-process-gpu',
  '--disable-web-security',
  '--disable-site-isolation-trials',
  '--allow-running-insecure-content',
])

/**
 * Unpacks the browser, once; two workers that both did it could meet a half-written file. Whoever comes second loses the
 * rename and uses what is there. Where no system library libnss3 (or another) is installed, the package brings its own.
 */
export async function unpackChromium(): Promise<void> {
  if (!fromPackage || existsSync(executable)) return
  mkdirSync(dirname(folder), { recursive: true })
  const fresh = mkdtempSync(`${folder}-`)
  const before = process.env.TMPDIR
  process.env.TMPDIR = fresh // the package unpacks into the temporary folder
  try {
    await packed.executablePath()
  } finally {
    if (before === undefined) delete process.env.TMPDIR
    else process.env.TMPDIR = before
  }
  if (execFileSync('ldd', [join(fresh, 'chromium')], { encoding: 'utf8' }).includes('not found')) {
    const archive = brotliDecompressSync(readFileSync(join(dirname(manifest), 'bin/al2023.tar.br')))
    execFileSync('tar', ['-x', '-C', fresh], { input: archive })
  }
  // The package's own list of fonts names folders of the service it was made for; with it no text is drawn at all.
  writeFileSync(
    join(fresh, 'fonts.conf'),
    `<?xml version="1.0"?>
<!DOCTYPE fontconfig SYSTEM "fonts.dtd">
<fontconfig>
  <include ignore_missing="yes">/etc/fonts/fonts.conf</include>
  <dir>${join(folder, 'fonts')}</dir>
  <cachedir>${join(folder, 'fonts-cache')}</cachedir>
</fontconfig>
`,
  )
  try {
    renameSync(fresh, folder)
  } catch (error) {
    if (!existsSync(executable)) throw error
    rmSync(fresh, { recursive: true })
  }
}

/** A running browser: the npm package's on Linux x64, the user's own Chrome or Edge elsewhere. */
export async function launchChromium(): Promise<Browser> {
  if (!fromPackage) {
    return chromium.launch({ channel: process.platform === 'win32' ? 'msedge' : 'chrome' })
  }
  await unpackChromium()
  return chromium.launch({
    executablePath: executable,
    args: packed.args.filter((flag) => !unwanted.has(flag)),
    env: {
      ...process.env,
      FONTCONFIG_FILE: fontList,
      ...(existsSync(libraries) ? { LD_LIBRARY_PATH: libraries } : {}),
    },
  })
}

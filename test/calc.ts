/**
 * LibreOffice Calc as an engine and a pair of eyes that are not ours.
 *
 * Where it is missing, what needs it is a named skip; on the build machine (CI set) it fails instead: the test would otherwise pass by
 * not looking.
 */
import { execFile, spawnSync } from 'node:child_process'
import { mkdirSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { promisify } from 'node:util'
import { Workbook, type CellValue } from '@cj-tech-master/excelts/browser'
import { pack, textOf, unpack, type Parts } from '../src/desk/files/archive'

const office = ['soffice', 'libreoffice'].find((name) => spawnSync('which', [name]).status === 0)
const isLooking = Boolean(office ?? process.env['CI'])

/** `it` for a test that needs LibreOffice; four minutes at most unless told otherwise. */
export function itInCalc(name: string, test: () => Promise<void>, milliseconds = 240_000): void {
  if (isLooking) it(name, test, milliseconds)
  else it.skip(`${name} (skipped: LibreOffice is not installed)`, test)
}

/**
 * Formulas are calculated when a file is loaded, whatever results it holds: by itself the program trusts those of some writers.
 * Source: the schema of its configuration, org.openoffice.Office.Calc, Formula/Load (0 always, 1 never, 2 ask).
 */
const ALWAYS_CALCULATE =
  '<?xml version="1.0" encoding="UTF-8"?>\n' +
  '<oor:items xmlns:oor="http://openoffice.org/2001/registry">' +
  '<item oor:path="/org.openoffice.Office.Calc/Formula/Load"><prop oor:name="OOXMLRecalcMode" oor:op="fuse">' +
  '<value>0</value></prop></item></oor:items>'

/** What the program makes of a file: `to` is the ending and, after a colon, the filter. */
async function converted(xlsx: Uint8Array, to: string): Promise<Uint8Array> {
  if (!office) throw new Error('LibreOffice is not installed on the build machine')
  const folder = mkdtempSync(join(tmpdir(), 'calc-'))
  try {
    // a profile of its own, so that several may run at once and nobody's settings matter
    mkdirSync(join(folder, 'profile/user'), { recursive: true })
    writeFileSync(join(folder, 'profile/user/registrymodifications.xcu'), ALWAYS_CALCULATE)
    writeFileSync(join(folder, 'book.xlsx'), xlsx)
    const profile = `-env:UserInstallation=file://${folder}/profile`
    const made = join(folder, 'made')
    await promisify(execFile)(
      office,
      [profile, '--headless', '--convert-to', to, '--outdir', made, join(folder, 'book.xlsx')],
      { timeout: 600_000 },
    )
    return readFileSync(join(made, `book.${to.split(':')[0]}`))
  } finally {
    rmSync(folder, { recursive: true, force: true })
  }
}

/** A cell as the program left it: a number (dates as serial numbers), a text, a truth value, `{ error }`, or null where it is blank. */
export type Found = number | string | boolean | { readonly error: string } | null

export interface Recalculated {
  readonly sheets: readonly string[]
  /** The program writes 15 significant digits: a number is right within 5e-15 of itself. */
  value(sheet: string, address: string): Found
  /** of a cell, without the equals sign and in the notation of the file; undefined where there is none */
  formula(sheet: string, address: string): string | undefined
  /** the file it wrote, part by part */
  readonly parts: Parts
}

/** Every formula of a workbook file, calculated anew by LibreOffice Calc. Takes about five seconds and more with the file. */
export async function recalculated(xlsx: Uint8Array): Promise<Recalculated> {
  const parts = await unpack(await converted(xlsx, 'xlsx:Calc MS Excel 2007 XML'))
  const workbook = new Workbook()
  await workbook.xlsx.loadFromFiles(parts)
  const cellOf = (sheet: string, address: string) => {
    const found = workbook.getWorksheet(sheet)
    if (!found) throw new Error(`LibreOffice's file has no sheet "${sheet}"`)
    return found.getCell(address)
  }
  return {
    sheets: workbook.worksheets.map(({ name }) => name),
    value: (sheet, address) => {
      const cell = cellOf(sheet, address)
      return plain(cell.formula ? cell.result : cell.value)
    },
    formula: (sheet, address) => cellOf(sheet, address).formula ?? undefined,
    parts,
  }
}

const DAY = 86_400_000
/** Serial number of 1 January 1970. */
const EPOCH = 25_569

function plain(value: CellValue | undefined): Found {
  if (value === null || value === undefined) return null
  if (typeof value === 'number' || typeof value === 'string' || typeof value === 'boolean') return value
  if (value instanceof Date) return value.getTime() / DAY + EPOCH
  if ('error' in value) return { error: value.error }
  if ('richText' in value) return value.richText.map(({ text }) => text).join('')
  throw new Error(`a cell of a kind that is not foreseen: ${JSON.stringify(value)}`)
}

/**
 * The pages that LibreOffice prints of one sheet, or of all that are shown.
 *
 * @param keep  name under which the PDF is kept in the system's folder for temporary files, to be looked at
 */
export async function pagesOf(
  xlsx: Uint8Array,
  { sheet, keep }: { readonly sheet?: string; readonly keep?: string } = {},
): Promise<{ readonly count: number; readonly pdf: Uint8Array }> {
  const pdf = await converted(sheet === undefined ? xlsx : await showing(xlsx, sheet), 'pdf')
  if (keep !== undefined) writeFileSync(join(tmpdir(), `${keep}.pdf`), pdf)
  // ISO 32000-1, 7.7.3.3: every page is a dictionary of this type; the program leaves them outside of compressed streams
  const count =
    Buffer.from(pdf)
      .toString('latin1')
      .match(/\/Type\s*\/Page\b(?!s)/g)?.length ?? 0
  return { count, pdf }
}

/** The same file with one sheet shown. */
async function showing(xlsx: Uint8Array, sheet: string): Promise<Uint8Array> {
  const parts = await unpack(xlsx)
  const path = 'xl/workbook.xml'
  let at = -1
  let chosen = -1
  const xml = textOf(parts, path)
    .replace(/<sheet\b[^>]*>/g, (entry) => {
      at += 1
      const [, name = ''] = /\sname="([^"]*)"/.exec(entry) ?? []
      const bare = entry.replace(/\sstate="\w+"/, '')
      if (name === sheet.replaceAll('&', '&amp;').replaceAll("'", '&apos;') || name === sheet) {
        chosen = at
        return bare
      }
      return bare.replace('<sheet', '<sheet state="hidden"')
    })
    .replace(/\sactiveTab="\d+"/, ` activeTab="${chosen}"`)
  if (chosen < 0) throw new Error(`the workbook has no sheet "${sheet}"`)
  parts[path] = new TextEncoder().encode(xml)
  return new Uint8Array(await pack(parts))
}

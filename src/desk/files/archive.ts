/**
 * What the file library leaves out, read from and written into the parts of the .xlsx package itself: defined names that are constants
 * or formulas, their comments and visibility, links behind cells, and the mark that tells a spilling formula from an old array formula.
 *
 * Source, from memory: ECMA-376 part 1, 18.2.5 (definedName), 18.3.1.4 (c, attribute cm), 18.3.1.47 (hyperlink), 18.3.1.99 (worksheet, the
 * order of its parts), 18.9 (metadata); [MS-XLSX] 2.6.160 (dynamic array properties).
 */
import { unzip, zip } from '@cj-tech-master/excelts/browser'

export type Parts = Record<string, Uint8Array>

export interface StoredName {
  readonly name: string
  /** A reference or formula, without the equals sign. */
  readonly formula: string
  readonly comment?: string
  readonly hidden?: boolean
  /** Position of the sheet the name is limited to. */
  readonly sheet?: number
}

/** A link behind the cells of `ref`. */
export interface StoredLink {
  readonly ref: string
  readonly address?: string
  readonly documentReference?: string
  readonly screenTip?: string
}

const WORKBOOK = 'xl/workbook.xml'
const RELATIONS = 'xl/_rels/workbook.xml.rels'
const CONTENT_TYPES = '[Content_Types].xml'
const METADATA = 'xl/metadata.xml'
/** What every part begins with. */
export const XML = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
const SPILLING =
  XML +
  '<metadata xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main" ' +
  'xmlns:xda="http://schemas.microsoft.com/office/spreadsheetml/2017/dynamicarray">' +
  '<metadataTypes count="1"><metadataType name="XLDAPR" minSupportedVersion="120000" copy="1" pasteAll="1" pasteValues="1" merge="1" ' +
  'splitFirst="1" rowColShift="1" clearFormats="1" clearComments="1" assign="1" coerce="1" cellMeta="1"/></metadataTypes>' +
  '<futureMetadata name="XLDAPR" count="1"><bk><extLst><ext uri="{bdbb8cdc-fa1e-496e-a857-3c3f30c029c3}">' +
  '<xda:dynamicArrayProperties fDynamic="1" fCollapsed="0"/></ext></extLst></bk></futureMetadata>' +
  '<cellMetadata count="1"><bk><rc t="1" v="0"/></bk></cellMetadata></metadata>'

export async function unpack(bytes: ArrayBuffer | Uint8Array): Promise<Parts> {
  const parts: Parts = {}
  for await (const entry of unzip(new Uint8Array(bytes)).entries()) {
    if (!entry.isDirectory) parts[entry.path] = await entry.bytes()
  }
  return parts
}

/** With every entry's time fixed: the same workbook gives the same bytes. */
export async function pack(parts: Parts): Promise<ArrayBuffer> {
  const archive = zip({ reproducible: true })
  for (const [path, bytes] of Object.entries(parts)) archive.add(path, bytes)
  const bytes = await archive.bytes()
  return bytes.buffer.slice(bytes.byteOffset, bytes.byteOffset + bytes.byteLength) as ArrayBuffer
}

export const textOf = (parts: Parts, path: string): string =>
  parts[path] ? new TextDecoder().decode(parts[path]) : ''

export function namesIn(parts: Parts): StoredName[] {
  const entries = textOf(parts, WORKBOOK).matchAll(/<definedName\b([^>]*)>([^<]*)<\/definedName>/g)
  return [...entries].map(([, attributes = '', formula = '']) => {
    const attribute = attributesIn(attributes)
    const sheet = attribute('localSheetId')
    const comment = attribute('comment')
    return {
      name: attribute('name') ?? '',
      formula: plain(formula),
      ...(comment === undefined ? {} : { comment }),
      ...(attribute('hidden') === '1' ? { hidden: true } : {}),
      ...(sheet === undefined ? {} : { sheet: Number(sheet) }),
    }
  })
}

/** The value of an attribute by its name, among the attributes of an element. */
export function attributesIn(xml: string): (name: string) => string | undefined {
  return (name) => {
    const found = new RegExp(`(?:^|\\s)${name}="([^"]*)"`).exec(xml)?.[1]
    return found === undefined ? undefined : plain(found)
  }
}

/** The part of each sheet, by its name. */
export function sheetPaths(parts: Parts): Map<string, string> {
  const targets = relationsIn(textOf(parts, RELATIONS))
  const sheets = textOf(parts, WORKBOOK).matchAll(/<sheet\b([^>]*)>/g)
  return new Map(
    [...sheets].map(([, attributes = '']) => {
      const target = targets.get(relationId(attributes) ?? '') ?? ''
      return [
        attributesIn(attributes)('name') ?? '',
        target.startsWith('/') ? target.slice(1) : `xl/${target}`,
      ]
    }),
  )
}

/** Targets by id. */
const relationsIn = (xml: string): Map<string, string> =>
  new Map(
    [...xml.matchAll(/<Relationship\b([^>]*)>/g)].map(([, attributes = '']) => {
      const attribute = attributesIn(attributes)
      return [attribute('Id') ?? '', attribute('Target') ?? '']
    }),
  )

/** The parts that a part refers to, by id. */
export function partsBehind(parts: Parts, path: string): Map<string, string> {
  const targets = relationsIn(textOf(parts, relationsOf(path)))
  return new Map(
    [...targets].map(([id, target]) => [id, new URL(target, `file:///${path}`).pathname.slice(1)]),
  )
}

/** The id of a relationship, whatever prefix its namespace has. */
const relationId = (attributes: string): string | undefined => /\s\w+:id="([^"]*)"/.exec(attributes)?.[1]

const relationsOf = (path: string): string => path.replace(/([^/]+)$/, '_rels/$1.rels')

/** Takes the links out of the sheets, by name: the file library loses those within the workbook, and formulas with a link behind them. */
export function takeLinks(parts: Parts): Map<string, StoredLink[]> {
  const links = new Map<string, StoredLink[]>()
  for (const [name, path] of sheetPaths(parts)) {
    const xml = textOf(parts, path)
    const [block] = /<hyperlinks\b[^>]*>.*?<\/hyperlinks>/s.exec(xml) ?? []
    if (block === undefined) continue
    const targets = relationsIn(textOf(parts, relationsOf(path)))
    links.set(
      name,
      [...block.matchAll(/<hyperlink\b([^>]*)>/g)].map(([, attributes = '']) => {
        const attribute = attributesIn(attributes)
        const [outside, location] = [targets.get(relationId(attributes) ?? ''), attribute('location')]
        const screenTip = attribute('tooltip')
        return {
          ref: attribute('ref') ?? '',
          // a place in a document elsewhere is a part of its address
          ...(outside ? { address: location ? `${outside}#${location}` : outside } : {}),
          ...(!outside && location ? { documentReference: location } : {}),
          ...(screenTip ? { screenTip } : {}),
        }
      }),
    )
    parts[path] = new TextEncoder().encode(xml.replace(block, ''))
  }
  return links
}

/** What comes after cells in a sheet, from links on; 18.3.1.99. */
const ORDER =
  'hyperlinks printOptions pageMargins pageSetup headerFooter rowBreaks colBreaks customProperties cellWatches ignoredErrors smartTags drawing legacyDrawing legacyDrawingHF drawingHF picture oleObjects controls webPublishItems mc:AlternateContent tableParts extLst'.split(
    ' ',
  )

/** Puts an element into a sheet, where the format wants it. */
export function putIntoSheet(parts: Parts, path: string, name: string, xml: string): void {
  const sheet = textOf(parts, path)
  const behind = ORDER.slice(ORDER.indexOf(name) + 1)
  const end = Math.max(sheet.indexOf('</sheetData>'), sheet.indexOf('<sheetData/>'))
  const next = new RegExp(`<(?:${behind.join('|')})\\b|</worksheet>`).exec(sheet.slice(end))
  const before = end + (next?.index ?? 0)
  parts[path] = new TextEncoder().encode(sheet.slice(0, before) + xml + sheet.slice(before))
}

/** Puts links behind the cells of sheets, by name. */
export function putLinks(parts: Parts, links: ReadonlyMap<string, readonly StoredLink[]>): void {
  const paths = sheetPaths(parts)
  for (const [name, list] of links) {
    const path = paths.get(name)
    if (path === undefined || list.length === 0) continue
    const outside: string[] = []
    const entries = list.map(({ ref, address, documentReference, screenTip }) => {
      if (address) outside.push(address)
      const attributes = [
        `ref="${ref}"`,
        ...(address ? [`r:id="rIdLink${outside.length}"`] : []),
        ...(documentReference ? [`location="${marked(documentReference)}"`] : []),
        ...(screenTip ? [`tooltip="${marked(screenTip)}"`] : []),
      ]
      return `<hyperlink ${attributes.join(' ')}/>`
    })
    putIntoSheet(parts, path, 'hyperlinks', `<hyperlinks>${entries.join('')}</hyperlinks>`)
    relate(
      parts,
      path,
      outside.map((target, k) => ({ id: `rIdLink${k + 1}`, type: 'hyperlink', target, outside: true })),
    )
  }
}

/** What a part refers to: the type by the last word of its name. */
export interface Relation {
  readonly id: string
  readonly type: string
  readonly target: string
  /** out of the package */
  readonly outside?: boolean
}

/** Adds what a part refers to. */
export function relate(parts: Parts, path: string, relations: readonly Relation[]): void {
  if (relations.length === 0) return
  const types = 'http://schemas.openxmlformats.org/officeDocument/2006/relationships'
  const where = relationsOf(path)
  parts[where] ??= new TextEncoder().encode(
    `${XML}<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships"></Relationships>`,
  )
  const entries = relations.map(
    ({ id, type, target, outside }) =>
      `<Relationship Id="${id}" Type="${types}/${type}" Target="${marked(target)}"${outside ? ' TargetMode="External"' : ''}/>`,
  )
  replace(parts, where, '</Relationships>', `${entries.join('')}</Relationships>`)
}

/** Adds a part of the package, with its type. */
export function addPart(parts: Parts, path: string, xml: string, type: string): void {
  parts[path] = new TextEncoder().encode(xml)
  replace(
    parts,
    CONTENT_TYPES,
    '</Types>',
    `<Override PartName="/${path}" ContentType="application/vnd.openxmlformats-officedocument.${type}+xml"/></Types>`,
  )
}

export function putNames(parts: Parts, names: readonly StoredName[]): void {
  if (names.length === 0) return
  const entries = names.map(({ name, formula, comment, hidden, sheet }) => {
    const attributes = [
      `name="${marked(name)}"`,
      ...(comment ? [`comment="${marked(comment)}"`] : []),
      ...(sheet === undefined ? [] : [`localSheetId="${sheet}"`]),
      ...(hidden ? ['hidden="1"'] : []),
    ]
    return `<definedName ${attributes.join(' ')}>${marked(formula)}</definedName>`
  })
  replace(parts, WORKBOOK, '</sheets>', `</sheets><definedNames>${entries.join('')}</definedNames>`)
}

/** Marks every array formula as one that spills. */
export function markSpilling(parts: Parts): void {
  let found = false
  for (const path of Object.keys(parts).filter((name) => /^xl\/worksheets\/[^/]+\.xml$/.test(name))) {
    const before = textOf(parts, path)
    const after = before.replace(/<c (r="[A-Z]+\d+"[^>]*)>(?=<f t="array")/g, '<c $1 cm="1">')
    if (after === before) continue
    found = true
    parts[path] = new TextEncoder().encode(after)
  }
  if (!found) return
  addPart(parts, METADATA, SPILLING, 'spreadsheetml.sheetMetadata')
  relate(parts, WORKBOOK, [{ id: 'rIdSpilling', type: 'sheetMetadata', target: 'metadata.xml' }])
}

function replace(parts: Parts, path: string, from: string, to: string): void {
  const before = textOf(parts, path)
  if (!before.includes(from)) throw new Error(`${path}: found no ${from}, so the workbook cannot be saved`)
  parts[path] = new TextEncoder().encode(before.replace(from, () => to))
}

const ENTITIES = { '&lt;': '<', '&gt;': '>', '&quot;': '"', '&apos;': "'", '&amp;': '&' } as const

/** The text that stands in XML. */
export const plain = (xml: string): string =>
  xml
    .replace(/&#x([\dA-Fa-f]+);|&#(\d+);/g, (_, hex: string | undefined, decimal: string) =>
      String.fromCodePoint(hex ? parseInt(hex, 16) : Number(decimal)),
    )
    .replace(/&(?:lt|gt|quot|apos|amp);/g, (entity) => ENTITIES[entity as keyof typeof ENTITIES])

/** A text as it stands in XML. */
export const marked = (text: string): string =>
  Object.entries(ENTITIES).reduceRight((xml, [entity, char]) => xml.replaceAll(char, entity), text)

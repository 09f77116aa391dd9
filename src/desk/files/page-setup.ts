/**
 * How a sheet is printed, between the file's vocabulary and the host's.
 *
 * Source, from memory: ECMA-376 part 1, 18.3.1.46 (headerFooter), 18.3.1.62 (pageMargins), 18.3.1.63 (pageSetup; its table of paper sizes),
 * 18.3.1.65 (pageSetUpPr), 18.3.1.70 (printOptions), 18.2.5 (the names of print areas and titles).
 */
import type { HeaderFooter, PageSetup } from '@cj-tech-master/excelts/browser'
import type { SheetPage } from '../office'
import { attributesIn, plain, type StoredName } from './archive'

/** Points to an inch: the file counts margins in these, the host in those. */
const POINTS = 72
/** Margins of a sheet that nobody has set up, in inches; the host's and the file's. */
const MARGINS = { left: 0.7, right: 0.7, top: 0.75, bottom: 0.75, header: 0.3, footer: 0.3 } as const

/** The host's names of papers, in the order in which the format numbers them from 1 on. */
const PAPERS =
  'Letter LetterSmall Tabloid Ledger Legal Statement Executive A3 A4 A4Small A5 B4 B5 Folio Quatro Paper10x14 Paper11x17 Note Envelope9 Envelope10 Envelope11 Envelope12 Envelope14 Csheet Dsheet Esheet EnvelopeDL EnvelopeC5 EnvelopeC3 EnvelopeC4 EnvelopeC6 EnvelopeC65 EnvelopeB4 EnvelopeB5 EnvelopeB6 EnvelopeItaly EnvelopeMonarch EnvelopePersonal'.split(
    ' ',
  )
const SECTIONS = { L: 'left', C: 'center', R: 'right' } as const

/** For the file library: how a sheet with this page is printed. */
export function filePage({ paper, orientation, zoom, margins, texts, ...page }: SheetPage): {
  readonly pageSetup: Partial<PageSetup>
  readonly headerFooter: Partial<HeaderFooter>
} {
  const { scale, horizontalFitToPages: wide, verticalFitToPages: tall } = zoom ?? {}
  const fits = typeof wide === 'number' || typeof tall === 'number'
  const inches = Object.entries(MARGINS).map(([side, usual]) => {
    const set = margins?.[side as keyof typeof MARGINS]
    return [side, set === undefined ? usual : set / POINTS]
  })
  const text = (part: 'Header' | 'Footer'): string =>
    Object.entries(SECTIONS)
      .map(([code, place]) => [code, texts?.[`${place}${part}`] ?? ''])
      .map(([code, content]) => (content === '' ? '' : `&${code}${content}`))
      .join('')
  return {
    pageSetup: {
      // a number of the format's table that the library's types do not list is written all the same
      ...(paper === undefined
        ? {}
        : { paperSize: (PAPERS.indexOf(paper) + 1) as NonNullable<PageSetup['paperSize']> }),
      ...(orientation === undefined
        ? {}
        : { orientation: orientation === 'Landscape' ? 'landscape' : 'portrait' }),
      ...(fits ? { fitToPage: true, fitToWidth: wide ?? 0, fitToHeight: tall ?? 0 } : {}),
      ...(typeof scale === 'number' ? { scale } : {}),
      margins: Object.fromEntries(inches) as typeof MARGINS,
      horizontalCentered: page.centerHorizontally ?? false,
      verticalCentered: page.centerVertically ?? false,
      showGridLines: page.printGridlines ?? false,
      showRowColHeaders: page.printHeadings ?? false,
    },
    headerFooter: { oddHeader: text('Header'), oddFooter: text('Footer') },
  }
}

const AREA = '_xlnm.Print_Area'
const TITLES = '_xlnm.Print_Titles'

/** The names that say what of the sheet is printed and what every page repeats. */
export function pageNames(page: SheetPage, name: string, sheet: number): StoredName[] {
  const on = (references: readonly (string | undefined)[]): string =>
    references
      .flatMap((reference) => reference?.split(',') ?? [])
      .map((reference) => `'${name.replaceAll("'", "''")}'!${reference}`)
      .join(',')
  return [
    { name: AREA, formula: on([page.printArea]), sheet },
    { name: TITLES, formula: on([page.titleColumns, page.titleRows]), sheet },
  ].filter(({ formula }) => formula !== '')
}

export interface PageRead {
  readonly page: SheetPage
  /** how many things it has that are not kept */
  readonly left: number
}

/** How a sheet is printed, from its part of the file and the names limited to it. */
export function pageIn(xml: string, names: readonly StoredName[]): PageRead {
  let left = 0
  const before = xml.slice(0, xml.search(/<(?:\w+:)?sheetData\b/))
  const behind = xml.slice(Math.max(xml.lastIndexOf('sheetData>'), xml.lastIndexOf('<sheetData/>')))
  const attributes = (element: string, within: string): ((name: string) => string | undefined) =>
    attributesIn(new RegExp(`<(?:\\w+:)?${element}\\b([^>]*)>`).exec(within)?.[1] ?? '')
  const isOn = (value: string | undefined): boolean => value === '1' || value === 'true'

  const setup = attributes('pageSetup', behind)
  const size = Number(setup('paperSize') ?? 0)
  const paper = PAPERS[size - 1]
  if (size > 0 && paper === undefined) left += 1
  const scale = Number(setup('scale') ?? 100)
  const pages = (attribute: string): number | null => Number(setup(attribute) ?? 1) || null
  const zoom = isOn(attributes('pageSetUpPr', before)('fitToPage'))
    ? { horizontalFitToPages: pages('fitToWidth'), verticalFitToPages: pages('fitToHeight') }
    : scale === 100
      ? undefined
      : { scale }

  const margin = attributes('pageMargins', behind)
  const margins = Object.entries(MARGINS).flatMap(([side, usual]) => {
    const inches = Number(margin(side) ?? usual)
    return inches === usual ? [] : [[side, rounded(inches * POINTS)] as const]
  })
  const option = attributes('printOptions', behind)
  const options = (
    [
      ['centerHorizontally', 'horizontalCentered'],
      ['centerVertically', 'verticalCentered'],
      ['printGridlines', 'gridLines'],
      ['printHeadings', 'headings'],
    ] as const
  ).flatMap(([key, attribute]) => (isOn(option(attribute)) ? [[key, true] as const] : []))

  const header = attributes('headerFooter', behind)
  if (isOn(header('differentFirst')) || isOn(header('differentOddEven'))) left += 1
  if (/<(?:\w+:)?(?:row|col)Breaks\b/.test(behind)) left += 1
  const texts = (['Header', 'Footer'] as const).flatMap((part) => {
    const found = new RegExp(`<(?:\\w+:)?odd${part}\\b[^>]*>([^<]*)<`).exec(behind)?.[1] ?? ''
    return sectionsOf(plain(found)).map(([place, text]) => [`${place}${part}`, text] as const)
  })

  const references: Record<string, string> = {}
  for (const { name, formula } of names) {
    if (name !== AREA && name !== TITLES) continue
    const parts = referencesIn(formula)
    if (!parts) left += 1
    for (const part of parts ?? []) {
      const key = name === AREA ? 'printArea' : /\d/.test(part) ? 'titleRows' : 'titleColumns'
      references[key] = references[key] === undefined ? part : `${references[key]},${part}`
    }
  }
  return {
    page: {
      ...(paper === undefined ? {} : { paper }),
      ...(setup('orientation') === 'landscape' ? { orientation: 'Landscape' as const } : {}),
      ...(zoom ? { zoom } : {}),
      ...(margins.length > 0 ? { margins: Object.fromEntries(margins) } : {}),
      ...(texts.length > 0 ? { texts: Object.fromEntries(texts) } : {}),
      ...Object.fromEntries(options),
      ...references,
    },
    left,
  }
}

/** What stands left, in the middle and right in a header or footer; what names no place stands in the middle. */
function sectionsOf(text: string): [(typeof SECTIONS)[keyof typeof SECTIONS], string][] {
  const found = { left: '', center: '', right: '' }
  let place: keyof typeof found = 'center'
  // two signs are one that is printed; one begins a code
  for (const [piece, code] of text.matchAll(/&([^])|[^&]+/g)) {
    const section = SECTIONS[(code ?? '').toUpperCase() as keyof typeof SECTIONS] as
      keyof typeof found | undefined
    if (section) place = section
    else found[place] += piece
  }
  return (Object.entries(found) as [keyof typeof found, string][]).filter(([, content]) => content !== '')
}

/** Blocks of cells, rows or columns on one sheet, without the sheet's name; null where a name is anything else. */
function referencesIn(formula: string): string[] | null {
  const parts = formula.match(/(?:'(?:[^']|'')+'|[^',!]+)![^,]+/g) ?? []
  if (parts.join(',') !== formula) return null
  const blocks = parts.map((part) => part.slice(part.lastIndexOf('!') + 1))
  return blocks.every((block) => /^\$?[A-Z]*\$?\d*(?::\$?[A-Z]*\$?\d*)?$/.test(block)) ? blocks : null
}

/** Inches are written with more digits than mean anything. */
const rounded = (points: number): number => Math.round(points * 1e6) / 1e6

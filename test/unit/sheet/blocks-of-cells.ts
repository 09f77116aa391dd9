import type { Blocks, Settings } from '../../../src/sheet'
import { modelChoices, modelOf, readHoldings, readReturns, steppingCalculator } from '../../../src/sheet'
import type { Area, Block, CellValue } from '../../../src/sheet'

/** A block of cells lying at A1 of a sheet, rows as typed; short rows are filled with blanks. */
export function blockOf(
  rows: readonly (readonly CellValue[])[],
  sheet = 'Book',
  extra: { hiddenRows?: ReadonlySet<number>; merged?: readonly Area[] } = {},
): Block {
  const columns = rows.reduce((most, row) => Math.max(most, row.length), 0)
  return {
    area: { sheet, row: 0, column: 0, rows: rows.length, columns },
    values: rows.map((row) => [...row, ...Array<CellValue>(columns - row.length).fill('')]),
    ...extra,
  }
}

export const ENGLISH = { decimal: '.', group: ',', dateOrder: 'mdy' } as const
export const GERMAN = { decimal: ',', group: '.', dateOrder: 'dmy' } as const

/** A calculator's caller who never cancels and looks at no progress. */
export const idleWork = () => ({ signal: new AbortController().signal, progress: () => undefined })

/** The model of blocks as a book computes it. */
export const modelFor = (blocks: Omit<Blocks, 'factors'> & Partial<Blocks>, settings: Settings) =>
  modelOf({ factors: null, ...blocks }, modelChoices(settings), steppingCalculator, idleWork())

const found = { content: null, orientation: null, returnKind: 'simple' } as const
export const holdingsOf = (rows: CellValue[][]) =>
  readHoldings(blockOf(rows), { roles: {}, capital: null }, ENGLISH)
export const returnsOf = (rows: CellValue[][]) => readReturns(blockOf(rows, 'Returns'), found, ENGLISH)
/** Holdings of equal weights. */
export const held = (...names: string[]) =>
  holdingsOf([['Holding', 'Weight'], ...names.map((name) => [name, 1 / names.length])])
/** Four dates of returns under these names. */
export const series = (...names: string[]) =>
  returnsOf([names, ...[0.01, -0.02, 0.015, -0.005].map((r, t) => names.map((_, i) => r * (1 + i * t)))])
/** The sentences of one gravity. */
export const told = (
  match: { findings: readonly { sentence: string; weight: string }[] },
  weight: string,
): string[] => match.findings.filter((finding) => finding.weight === weight).map(({ sentence }) => sentence)

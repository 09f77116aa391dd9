/** What a sheet of formulas that recomputes a book says, read back from whatever engine worked it out. */
import type { CellValue } from '../src/sheet/cells'
import type { Table } from '../src/sheet/table'
import type { Shown } from './recalculation'

/** A recomputed figure and ours beside it. */
export interface Pair {
  /** the heading of its column and the label of its row */
  readonly head: string
  readonly label: string
  readonly row: number
  readonly recomputed: CellValue
  readonly ours: CellValue
}

export interface ProofReading {
  /** the words of every result, with the label of its row */
  readonly results: readonly { readonly label: string; readonly said: CellValue }[]
  readonly pairs: readonly Pair[]
  /** the line at the head: its sentence, and how many lines agree and differ */
  readonly headline: { readonly sentence: CellValue; readonly agree: CellValue; readonly differ: CellValue }
  /** every text of the sheet that is no formula */
  readonly texts: readonly string[]
  /** errors among what formulas show, with their places */
  readonly errors: readonly string[]
}

export const AGREES = '✓ agrees'
export const DIFFERS = '≠ differs'
const OURS = 'Counterpoise'

/** Reads a proof by its headings: a figure stands under a heading, ours under the same one with our name, or under our name alone beside it. */
export function readProof({ cells }: Table, shown: Shown): ProofReading {
  const results: { label: string; said: CellValue }[] = []
  const pairs: Pair[] = []
  const errors: string[] = []
  let heads: readonly string[] = []
  let headline: ProofReading['headline'] | null = null
  cells.forEach((row, r) => {
    row.forEach(({ formula }, c) => {
      const value = shown(r, c)
      if (formula !== undefined && (value === '' || (typeof value === 'string' && value.startsWith('#'))))
        errors.push(`row ${r}, column ${c}: ${value === '' ? 'nothing' : value} from ${formula}`)
    })
    if (row.some(({ mark, value }) => mark === 'head' && value !== ''))
      heads = row.map(({ value }) => String(value))
    const counts = row.flatMap(({ formula }, c) => (formula?.startsWith('=COUNTIF(') ? [c] : []))
    if (headline === null && counts.length === 2)
      headline = { sentence: shown(r, 0), agree: shown(r, counts[0]!), differ: shown(r, counts[1]!) }
    const result = row.findIndex(
      ({ formula }) => formula?.includes(`"${DIFFERS}"`) && formula.startsWith('=IF(ISNUMBER('),
    )
    if (result < 0) return
    const label = String(shown(r, 0))
    results.push({ label, said: shown(r, result) })
    heads.forEach((head, c) => {
      const mine =
        head === OURS
          ? c - 1
          : head.endsWith(`, ${OURS}`)
            ? heads.indexOf(head.slice(0, -OURS.length - 2))
            : -1
      const cell = row[c]
      if (mine < 0 || cell === undefined || cell.value === '') return
      pairs.push({ head: heads[mine]!, label, row: r, recomputed: shown(r, mine), ours: cell.value })
    })
  })
  if (headline === null) throw new Error('the proof has no line that counts its results')
  const texts = cells
    .flat()
    .flatMap(({ value, formula }) =>
      formula === undefined && typeof value === 'string' && value !== '' ? [value] : [],
    )
  return { results, pairs, headline, texts, errors }
}

/** A recomputed figure by its label, from the lines of single figures. */
export function figure({ pairs }: ProofReading, label: RegExp): number {
  const found = pairs.filter((pair) => pair.head === 'Recomputed' && label.test(pair.label))
  if (found.length !== 1) throw new Error(`${found.length} figures are called ${String(label)}`)
  return Number(found[0]!.recomputed)
}

/** The recomputed figures of one column, in its order, of the table that has this heading for the nth time. */
export function column({ pairs }: ProofReading, head: string, nth = 0): number[] {
  const blocks: Pair[][] = []
  for (const pair of pairs.filter((one) => one.head === head)) {
    const last = blocks.at(-1)
    if (last && last.at(-1)!.row === pair.row - 1) last.push(pair)
    else blocks.push([pair])
  }
  const found = blocks[nth]
  if (!found) throw new Error(`no column ${head}`)
  return found.map(({ recomputed }) => Number(recomputed))
}

/**
 * The largest difference between what was recomputed and ours, relative to the largest figure of ours in its column of its table. NaN where
 * a figure is no number.
 */
export function largestGap({ pairs }: ProofReading): { gap: number; at: string } {
  const scales = new Map<string, number>()
  // single figures have nothing in common with those above them
  const keyed = pairs.map((pair) => ({
    ...pair,
    key: `${pair.head} ${pair.head === 'Recomputed' ? pair.row : ''}`,
  }))
  for (const { key, ours } of keyed) scales.set(key, Math.max(scales.get(key) ?? 0, Math.abs(Number(ours))))
  let worst = { gap: 0, at: '' }
  for (const { key, head, label, recomputed, ours } of keyed) {
    const isNumber = typeof recomputed === 'number' && typeof ours === 'number'
    const scale = scales.get(key) ?? 0
    const gap = isNumber ? Math.abs(recomputed - ours) / (scale === 0 ? 1 : scale) : NaN
    if (!(gap <= worst.gap))
      worst = { gap, at: `${label}, ${head}: ${String(recomputed)} against ${String(ours)}` }
    if (Number.isNaN(worst.gap)) return worst
  }
  return worst
}

/** Everything in it agrees, by its own word and by ours; the quantile of Student's distribution alone is held to its probability, which engines find to fewer digits. */
export function expectAgreement(proof: ProofReading, tolerance: number): void {
  expect(proof.errors).toEqual([])
  expect(proof.results.filter(({ said }) => said !== AGREES)).toEqual([])
  expect(proof.results.length).toBeGreaterThan(3)
  expect(proof.headline).toEqual({
    sentence: 'All lines agree within the tolerance',
    agree: proof.results.length,
    differ: 0,
  })
  const pairs = proof.pairs.filter(({ label }) => label !== 'Probability beyond the quantile')
  const { gap, at } = largestGap({ ...proof, pairs })
  if (!(gap <= tolerance)) throw new Error(`a difference of ${gap}: ${at}`)
}

import type { Area } from '../cells'
import { referenceOf } from '../cells'
import type { ReturnsReading } from '../returns'

/** Neighbouring cells that one range of a formula can take in. */
interface Stretch {
  /** place of the first, counted from the first place there is */
  readonly from: number
  readonly count: number
  /** how far from each price the earlier one lies */
  readonly shift: number
}

/** A range of numbers written by the proof itself that goes with places: some of its cells as a reference. */
export type Vector = (from: number, count: number) => string

/** More ranges than this in one sum are past reading. */
const MOST_STRETCHES = 24

/**
 * The cells of a block of returns, prices or covariances as formulas see them: by place in the sheet, whatever the order of dates or holdings
 * is. Places run from the first that is used to the last; in between there may be dates that are not used, series that are not held, and
 * cells that hold neither.
 */
export class ReturnCells {
  readonly isAcross: boolean
  /** row of the returns at each place of the sheet; -1: no date there */
  readonly dates: readonly number[]
  /** series at each place; -1: none */
  readonly series: readonly number[]
  readonly #returns: ReturnsReading
  readonly #firstDate: number
  readonly #firstSeries: number
  readonly #byDate = new Map<number, readonly Stretch[]>()
  readonly #bySeries = new Map<number, readonly Stretch[]>()

  /**
   * @param rows   that are used, at least one
   * @param series that are held, at least one
   */
  constructor(returns: ReturnsReading, rows: readonly number[], series: readonly number[]) {
    this.#returns = returns
    this.isAcross = returns.orientation === 'dates across'
    const all = (count: number): readonly number[] => Array.from({ length: count }, (_, k) => k)
    const at = (row: number, of: number): Area => returns.cell(row, of)
    const dateOf = (row: number): number => this.#dateOf(at(row, series[0] ?? 0))
    const seriesOf = (of: number): number => this.#seriesOf(at(rows[0] ?? 0, of))
    const dates = placed(all(returns.rows), rows, dateOf)
    const columns = placed(all(returns.columns), series, seriesOf)
    this.dates = dates.items
    this.series = columns.items
    this.#firstDate = dates.first
    this.#firstSeries = columns.first
  }

  #dateOf({ row, column }: Area): number {
    return this.isAcross ? column : row
  }

  #seriesOf({ row, column }: Area): number {
    return this.isAcross ? row : column
  }

  #area(date: number, dates: number, series: number, count: number): Area {
    const { sheet } = this.#returns.area
    return this.isAcross
      ? { sheet, row: series, column: date, rows: count, columns: dates }
      : { sheet, row: date, column: series, rows: dates, columns: count }
  }

  /** Where the returns of some cells come from, as a formula has it. */
  #returnsIn(area: Area, shift: number): string {
    const { content, returnKind } = this.#returns
    const now = referenceOf(area)
    if (content !== 'prices') return now
    const before = referenceOf(
      this.isAcross ? { ...area, column: area.column + shift } : { ...area, row: area.row + shift },
    )
    return returnKind === 'log' ? `LN(${now}/${before})` : `(${now}/${before}-1)`
  }

  #shift(row: number, series: number): number {
    const before = this.#returns.before(row, series)
    return before ? this.#dateOf(before) - this.#dateOf(this.#returns.cell(row, series)) : 0
  }

  /** The cell of a date; null where the block has no dates. */
  dateCell(row: number): string | null {
    return this.#returns.dates ? referenceOf(this.#returns.cell(row, -1)) : null
  }

  /** Whether any of the returns is typed as text, which formulas do not read. */
  holdsText(rows: readonly number[], series: readonly number[]): boolean {
    const { values, columns, isNumber } = this.#returns
    return rows.some((t) => series.some((i) => !Number.isNaN(values[t * columns + i]) && !isNumber(t, i)))
  }

  /** The cells of one series that hold its returns, each stretch without a gap. */
  stretchesOf(series: number): readonly Stretch[] {
    const known = this.#bySeries.get(series)
    if (known) return known
    const found = stretches(this.dates, (row) =>
      this.#returns.isNumber(row, series) ? this.#shift(row, series) : null,
    )
    this.#bySeries.set(series, found)
    return found
  }

  /** The cells of one date. */
  stretchesAt(row: number): readonly Stretch[] {
    const known = this.#byDate.get(row)
    if (known) return known
    const found = stretches(this.series, (series) =>
      this.#returns.isNumber(row, series) ? this.#shift(row, series) : null,
    )
    this.#byDate.set(row, found)
    return found
  }

  /** Whether a range of one series can be taken as it lies, blanks and all: next to an upright vector, where blanks count as nothing. */
  get takesBlanks(): boolean {
    return !this.isAcross && this.#returns.content !== 'prices'
  }

  get #allDates(): Stretch {
    return { from: 0, count: this.dates.length, shift: 0 }
  }

  /** Returns of one series over a stretch. */
  over(series: number, { from, count, shift }: Stretch = this.#allDates): string {
    return this.#returnsIn(
      this.#area(this.#firstDate + from, count, this.#seriesOf(this.#returns.seriesCell(series)), 1),
      shift,
    )
  }

  /**
   * The sum over dates of a vector times one series' returns, or times what `shape` makes of them; null where it would take too many ranges.
   */
  alongDates(series: number, vector: Vector, shape?: (returns: string) => string): string | null {
    // blanks stop arithmetic and products of matrices
    const found = !shape && this.takesBlanks ? [this.#allDates] : this.stretchesOf(series)
    return this.#sum(this.isAcross, found, vector, (stretch) => {
      const returns = this.over(series, stretch)
      return shape ? shape(returns) : returns
    })
  }

  /** The sum over series of a vector times the returns of one date, or times what `shape` makes of them; null where it would take too many ranges. */
  alongSeries(row: number, vector: Vector, shape?: (returns: string) => string): string | null {
    const date = this.#dateOf(this.#returns.cell(row, this.series[0] ?? 0))
    const found =
      !shape && this.isAcross && this.#returns.content !== 'prices'
        ? [{ from: 0, count: this.series.length, shift: 0 }]
        : this.stretchesAt(row)
    return this.#sum(!this.isAcross, found, vector, ({ from, count, shift }) => {
      const returns = this.#returnsIn(this.#area(date, 1, this.#firstSeries + from, count), shift)
      return shape ? shape(returns) : returns
    })
  }

  /** @param crosswise whether the cells lie across while vectors stand upright */
  #sum(
    crosswise: boolean,
    found: readonly Stretch[],
    vector: Vector,
    expression: (stretch: Stretch) => string,
  ): string | null {
    if (found.length === 0 || found.length > MOST_STRETCHES) return null
    const call = crosswise ? 'MMULT' : 'SUMPRODUCT'
    return found
      .map((stretch) => `${call}(${expression(stretch)},${vector(stretch.from, stretch.count)})`)
      .join('+')
  }

  /** Whether every place is a date that is used, without gaps in what is held, one after the other in order of time. */
  isWhole(rows: readonly number[], series: readonly number[]): boolean {
    const inOrder = this.dates.every((row, k) => k === 0 || Math.abs(row - (this.dates[k - 1] ?? 0)) === 1)
    return (
      this.dates.length === rows.length && inOrder && series.every((i) => this.stretchesOf(i).length === 1)
    )
  }

  /** The numbers in the rectangle of all places, counted by a formula and as they were read; null for prices. */
  count(): { readonly formula: string; readonly found: number } | null {
    if (this.#returns.content === 'prices') return null
    const area = this.#area(this.#firstDate, this.dates.length, this.#firstSeries, this.series.length)
    let found = 0
    for (const row of this.dates)
      for (const series of this.series)
        if (row >= 0 && series >= 0 && this.#returns.isNumber(row, series)) found++
    return { formula: `COUNT(${referenceOf(area)})`, found }
  }
}

/** Items by their place in the sheet, from the first that is wanted to the last. */
function placed(
  items: readonly number[],
  wanted: readonly number[],
  placeOf: (item: number) => number,
): { readonly first: number; readonly items: readonly number[] } {
  const places = wanted.map(placeOf)
  const first = places.reduce((a, b) => Math.min(a, b))
  const last = places.reduce((a, b) => Math.max(a, b))
  const at = new Map(items.map((item) => [placeOf(item), item]))
  return { first, items: Array.from({ length: last - first + 1 }, (_, k) => at.get(first + k) ?? -1) }
}

/** Runs of neighbours with the same shift; null: not one of them. */
function stretches(items: readonly number[], shiftOf: (item: number) => number | null): readonly Stretch[] {
  const found: { from: number; count: number; shift: number }[] = []
  items.forEach((item, k) => {
    const shift = item < 0 ? null : shiftOf(item)
    const last = found.at(-1)
    if (shift === null) return
    if (last && last.from + last.count === k && last.shift === shift) last.count++
    else found.push({ from: k, count: 1, shift })
  })
  return found
}

import { hashOf, inACell } from './history-hash'
import type { CellValue } from './cells'
import { settingsFromJson, settingsToJson } from './settings'
import type { Snapshot, SnapshotHead } from './snapshot'
import { headOf } from './snapshot'
import type { Table, TableCell } from './table'
import { numberCell, textCell as text } from './table'
import type { Json } from './workbook'
import { dateText } from './wording'

/** A cell takes no more than 32,767 characters; longer texts are spread over several. */
const MOST_CHARACTERS = 30_000

/** Rows above the holdings: a title, what the cells are, a row of JSON in parts, the heads. */
const HEAD_ROWS = 4

/** Columns of a holding before its correlations: name, currency, weight, volatility, contribution; and one a group. */
const COLUMNS = 5

/** What a record says outside its columns. */
interface Facts extends SnapshotHead {
  readonly groupHeaders: readonly string[]
  readonly hasCorrelations: boolean
  readonly horizon: Snapshot['horizon']
  readonly dates: Snapshot['dates']
  readonly readTo: number | null
  readonly settings: Json
  readonly settingLines: Snapshot['settingLines']
  readonly returnsHash: string
}

/**
 * A result as it is kept to be read back: its figures as plain numbers, the correlations as the half below the diagonal, the rest as JSON.
 */
export function recordTable(snapshot: Snapshot): Table {
  const { id, title, keptOn } = snapshot
  const { names, groupHeaders, groups, currencies, weights, volatilities, contribution, correlations } =
    snapshot
  const facts: Facts = {
    ...headOf(snapshot),
    groupHeaders,
    hasCorrelations: correlations !== null,
    horizon: snapshot.horizon,
    dates: snapshot.dates,
    readTo: snapshot.readTo ?? null,
    settings: settingsToJson(snapshot.settings),
    settingLines: snapshot.settingLines,
    returnsHash: snapshot.returnsHash,
  }
  const json = JSON.stringify(facts)
  const parts = Array.from({ length: Math.ceil(json.length / MOST_CHARACTERS) }, (_, k) =>
    json.slice(k * MOST_CHARACTERS, (k + 1) * MOST_CHARACTERS),
  )
  const n = names.length
  const width = Math.max(COLUMNS + groupHeaders.length + (correlations ? n : 0), parts.length)
  const number = (value: number | undefined): TableCell => numberCell(inACell(value ?? NaN), 'General')
  const row = (...cells: TableCell[]): TableCell[] => [
    ...cells,
    ...Array.from({ length: width - cells.length }, () => text('')),
  ]
  return {
    cells: [
      row(text(`Kept result ${id} of ${title}, kept on ${dateText(keptOn)}`)),
      row(
        text(
          `This is what the result is read back from. A hash is kept beside it: once a cell of it is changed it is not read any more. Numbers are fractions; volatilities and contributions are ${snapshot.horizon === 'a year' ? 'scaled to a year' : 'per period'}.`,
        ),
      ),
      row(...parts.map((part) => text(part))),
      row(
        ...['Holding', 'Currency', ...groupHeaders, 'Weight', 'Volatility', 'Contribution to risk'].map(
          (head) => text(head),
        ),
        ...(correlations ? names.map((name) => text(`Correlation with ${name}`)) : []),
      ),
      ...names.map((name, i) =>
        row(
          text(name),
          text(currencies?.[i] ?? ''),
          ...groupHeaders.map((_, k) => text(groups[i]?.[k] ?? '')),
          number(weights[i]),
          number(volatilities[i]),
          number(contribution[i]),
          ...(correlations ? Array.from({ length: i }, (_, j) => number(correlations[i * n + j])) : []),
        ),
      ),
    ],
    widths: Array.from({ length: width }, () => 10),
    numeric: Array.from({ length: width }, (_, k) => k > 1 + groupHeaders.length),
  }
}

/**
 * The hash of what stands in the cells of a record: row by row each cell, a text or one number. Numbers count by their first 15 significant digits,
 * which is what some programs save of them: a record that went through one of those is good to 5e-15 of each number, and still itself.
 */
export const recordHash = (values: readonly (readonly CellValue[])[]): Promise<string> =>
  hashOf(
    values
      .flat()
      .map((value) =>
        typeof value === 'number' ? Float64Array.of(Number(value.toPrecision(15))) : String(value),
      ),
  )

/**
 * The result that a record holds, as exact as its cells are.
 *
 * @param values of cells whose hash is the one that was kept with them
 * @returns      null where they are not laid out as a record is
 */
export function snapshotFrom(values: readonly (readonly CellValue[])[]): Snapshot | null {
  let facts: Facts
  try {
    facts = JSON.parse((values[2] ?? []).map(String).join('')) as Facts
  } catch {
    return null
  }
  const { hasCorrelations, groupHeaders, settings, ...head } = facts
  const rows = values.slice(HEAD_ROWS)
  const n = facts.positions
  if (rows.length !== n) return null
  const firstNumber = 2 + groupHeaders.length
  const column = (k: number): Float64Array => Float64Array.from(rows, (row) => Number(row[firstNumber + k]))
  const correlations = hasCorrelations ? new Float64Array(n * n) : null
  if (correlations)
    for (let i = 0; i < n; i++) {
      correlations[i * n + i] = 1
      for (let j = 0; j < i; j++)
        correlations[i * n + j] = correlations[j * n + i] = Number(rows[i]?.[firstNumber + 3 + j])
    }
  const texts = (row: readonly CellValue[], from: number, to: number): string[] =>
    row.slice(from, to).map(String)
  return {
    ...head,
    names: rows.map((row) => String(row[0])),
    currencies: rows.map((row) => String(row[1])),
    groupHeaders,
    groups: rows.map((row) => texts(row, 2, firstNumber)),
    weights: column(0),
    volatilities: column(1),
    contribution: column(2),
    correlations,
    settings: settingsFromJson(settings).settings,
  }
}

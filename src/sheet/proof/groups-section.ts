import { formulaCell, numberCell as number, textCell as text } from '../table'
import type { Key } from './columns'
import { CONTRIBUTION, GAP, PERCENT, PLAIN, SHARE, SHARE_HEAD, STAND_ALONE, WEIGHT } from './columns'
import type { Late } from './draft'
import { laggedVariance } from './moments'
import type { ProofSheet } from './proof-sheet'

/** A table for each heading that holdings are grouped under. */
export function layGroups(sheet: ProofSheet): void {
  const { breakdown } = sheet.input
  const { decomposition: d, sharesWithheld } = breakdown
  breakdown.byGroup.forEach(({ header, labels, parts }, h) => {
    const { groupOf } = sheet.groupsOf(h)
    const labelled = sheet.draft.range({ column: 1 + h, row: sheet.rowOf(0), rows: sheet.size })
    const c = sheet.labels
    const splits = sheet.groupReturns.length > 0
    const shares = sharesWithheld === null && d.share !== null
    const figures = [
      { head: WEIGHT, format: PERCENT, scale: 'ratio' },
      { head: CONTRIBUTION, format: PERCENT, scale: 'risk' },
      ...(shares ? [{ head: SHARE_HEAD, format: SHARE, scale: 'ratio' } as const] : []),
      ...(splits ? [{ head: STAND_ALONE, format: PERCENT, scale: 'risk' } as const] : []),
    ] as const
    const k = figures.length
    sheet.draft.add()
    const heads: { [column: number]: Late } = { 0: text(header, 'head') }
    figures.forEach(({ head }, f) => {
      heads[c + f] = text(head, 'head')
      heads[c + k + f] = text(`${head}, Counterpoise`, 'head')
    })
    heads[c + 2 * k] = text('Difference, risks', 'head')
    heads[c + 2 * k + 1] = text('Difference, ratios', 'head')
    heads[c + 2 * k + 2] = { ...text('Result', 'head'), indent: 1 }
    sheet.draft.add(heads, 'head')
    const first = sheet.draft.next
    labels.forEach((_, g) => {
      const row = sheet.draft.next
      const near = (column: number): string => sheet.draft.cell(row, column)
      const member = groupOf.indexOf(g)
      const sum = (key: Key): string =>
        `SUMPRODUCT((${labelled}=${sheet.draft.cell(row, 0)})*${sheet.all(key)})`
      const formulas = [
        sum('weight'),
        sum('contribution'),
        ...(shares ? [`${near(c + 1)}/${sheet.at('volatility')}`] : []),
      ]
      const ours = [
        parts.weight[g],
        parts.contribution[g],
        ...(shares ? [parts.share?.[g]] : []),
        ...(splits ? [parts.standAlone[g]] : []),
      ]
      const cells: { [column: number]: Late } = {
        0: formulaCell(`=${sheet.draft.cell(sheet.rowOf(member), 1 + h)}`, PLAIN),
      }
      formulas.forEach((formula, f) => (cells[c + f] = formulaCell(`=${formula}`, figures[f]!.format)))
      if (splits)
        cells[c + k - 1] = () =>
          formulaCell(
            `=SQRT(MAX(0,${groupVariance(sheet, h, g, row)}))*SQRT(${sheet.at('periods')})`,
            PERCENT,
          )
      ours.forEach((value, f) => (cells[c + k + f] = number(value, figures[f]!.format)))
      const gap = (scale: 'risk' | 'ratio'): string =>
        `MAX(${figures
          .flatMap((figure, f) => (figure.scale === scale ? [`ABS(${near(c + f)}-${near(c + k + f)})`] : []))
          .join(',')})`
      cells[c + 2 * k] = formulaCell(`=${gap('risk')}`, GAP)
      cells[c + 2 * k + 1] = formulaCell(`=${gap('ratio')}`, GAP)
      cells[c + 2 * k + 2] = () =>
        sheet.mark([
          [near(c + 2 * k), sheet.allowed('risk')],
          [near(c + 2 * k + 1), sheet.allowed('ratio')],
        ])
      sheet.draft.add(cells)
    })
    const total: { [column: number]: Late } = { 0: text('Total', 'total') }
    figures.forEach(({ head, format }, f) => {
      if (head !== STAND_ALONE)
        total[c + f] = formulaCell(
          `=SUM(${sheet.draft.range({ column: c + f, row: first, rows: labels.length })})`,
          format,
          'total',
        )
    })
    sheet.draft.add(total, 'total')
  })
}

/** The variance of a group's positions held alone, per period. */
function groupVariance(sheet: ProofSheet, header: number, group: number, row: number): string {
  const { estimation } = sheet.reach
  const name = `group ${header} ${group}`
  if (estimation.kind !== 'dates') {
    const column = sheet.seriesColumn(name)
    const weights = sheet.draft.range(column)
    return `SUMPRODUCT(${weights},${sheet.draft.range({ ...column, column: sheet.labels + sheet.seriesColumns.length + groupIndex(sheet, header, group) })})`
  }
  const column = sheet.groupColumn(groupIndex(sheet, header, group))
  const returns = sheet.draft.range(column)
  const weights = sheet.allDates('weight')
  const sum = sheet.at('sum of weights')
  const mean = `SUMPRODUCT(${returns},${weights})/${sum}`
  if (estimation.lags > 0)
    return laggedVariance(
      sheet,
      (from, count) => `${sheet.draft.range(column, from, count)}-${mean}`,
      column.rows,
    )
  const plain = `SUMPRODUCT((${returns}-${mean})^2,${weights})/${sheet.at('divisor')}`
  const { shrinkage } = estimation
  if (!shrinkage) return plain
  const d = sheet.at('intensity')
  const labelled = sheet.draft.range({ column: 1 + header, row: sheet.rowOf(0), rows: sheet.size })
  const of = `(${labelled}=${sheet.draft.cell(row, 0)})`
  const [variance, weight] = [sheet.all('variance'), sheet.all('weight')]
  if (shrinkage.target !== 'correlation')
    return `(1-${d})*${plain}+${d}*${sheet.at('mean variance')}*SUMPRODUCT(${of}*(${variance}>0)*${weight}^2)`
  const r = sheet.at('mean correlation')
  return `(1-${d})*${plain}+${d}*(${r}*SUMPRODUCT(${of}*SQRT(${variance})*${weight})^2+(1-${r})*SUMPRODUCT(${of}*${variance}*${weight}^2))`
}

function groupIndex(sheet: ProofSheet, header: number, group: number): number {
  return sheet.groupReturns.findIndex((one) => one.header === header && one.group === group)
}

import { referenceOf } from '../cells'
import type { HoldingCells } from '../holdings'
import { formulaCell, numberCell as number, textCell as text } from '../table'
import type { Key } from './columns'
import { GAP, HEADS, PERCENT, PLAIN, RATIO, SHARE } from './columns'
import type { Late } from './draft'
import { layMoments } from './moments'
import type { ProofSheet } from './proof-sheet'

/** The table of holdings, its total and the sum of its parts. */
export function layHoldings(sheet: ProofSheet): void {
  const { breakdown } = sheet.input
  const { decomposition: d, groupHeaders, sharesWithheld } = breakdown
  sheet.section('Holdings', false)
  sheet.note(
    'Means, variances and covariances are per period. Differences are the largest in a row: of stand-alone risk, marginal contribution and contribution; of weight, share, beta and correlation.',
  )
  if (sharesWithheld !== null) sheet.note(sharesWithheld)
  const heads: { [column: number]: Late } = {}
  ;['Holding', ...groupHeaders].forEach((head, c) => (heads[c] = text(head, 'head')))
  sheet.keys.forEach((key, k) => {
    const head = text(headOf(sheet, key), 'head')
    heads[sheet.labels + k] = key === 'mark' ? { ...head, indent: 1 } : head
  })
  sheet.draft.add(heads, 'head')
  sheet.placeHoldings()
  for (let i = 0; i < sheet.size; i++) layHolding(sheet, i)

  const total = (key: Key, format: string): Late => formulaCell(`=SUM(${sheet.all(key)})`, format, 'total')
  const shares = sharesWithheld === null
  sheet.draft.add(
    {
      0: text('Total', 'total'),
      [sheet.column('weight')]: total('weight', PERCENT),
      [sheet.column('stand-alone')]: total('stand-alone', PERCENT),
      [sheet.column('contribution')]: () => formulaCell(`=${sheet.at('volatility')}`, PERCENT, 'total'),
      ...(shares ? { [sheet.column('share')]: total('share', SHARE) } : {}),
    },
    'total',
  )
  const sum = sheet.draft.add({
    0: text('Sum of parts'),
    [sheet.column('contribution')]: formulaCell(`=SUM(${sheet.all('contribution')})`, PERCENT),
    [sheet.column('our contribution')]: number(d.sumOfContributions, PERCENT),
  })
  const c = sheet.column('contribution')
  sheet.draft.add({
    0: text('Difference'),
    [c]: formulaCell(`=${sheet.draft.cell(sum, c)}-${sheet.draft.cell(sum - 1, c)}`, GAP),
    [sheet.column('risk gap')]: formulaCell(
      `=ABS(${sheet.draft.cell(sum, c)}-${sheet.draft.cell(sum - 1, c)})`,
      GAP,
    ),
    [sheet.column('mark')]: () =>
      sheet.mark([[sheet.draft.cell(sum + 1, sheet.column('risk gap')), sheet.allowed('risk')]]),
    [sheet.column('note')]: text('Contributions add up to the volatility'),
  })
}

function headOf(sheet: ProofSheet, key: Key): string {
  const { holdings } = sheet.input.blocks
  const isExposure = holdings.columns.some(({ role }) => role === 'exposure')
  if (key === 'measure' && isExposure) return 'Exposure'
  return HEADS[key][0]
}

function layHolding(sheet: ProofSheet, i: number): void {
  const { blocks, breakdown } = sheet.input
  const { decomposition: d, sharesWithheld } = breakdown
  const holding = blocks.holdings.holdings[i]!
  const row = sheet.rowOf(i)
  const notes: string[] = []
  const put = (key: Key, cell: Late): void => sheet.draft.put(row, sheet.column(key), cell)
  const at = (key: Key): string => sheet.cell(key, i)
  const formula = (key: Key, format: string, of: () => string): void =>
    put(key, () => formulaCell(`=${of()}`, format))

  const cells: Partial<HoldingCells> = holding.cells ?? {}
  const name = cells.name ?? null
  sheet.draft.put(row, 0, name ? formulaCell(`=${referenceOf(name)}`, PLAIN) : text(holding.name))
  breakdown.groupHeaders.forEach((_, header) => {
    const { groupOf, labels } = sheet.groupsOf(header)
    const label = labels[groupOf[i]!] ?? ''
    const cell = cells.groups?.[header] ?? null
    const isSpeltSo = cell !== null && holding.groups[header]?.toLowerCase() === label.toLowerCase()
    sheet.draft.put(row, 1 + header, isSpeltSo ? formulaCell(`=${referenceOf(cell)}`, PLAIN) : text(label))
  })

  // the weight, from the user's own cell
  const isText = cells.measure === null || cells.measure === undefined
  if (isText) notes.push('typed as text: a constant here')
  const { capital } = blocks.holdings
  if (capital === null)
    put(
      'weight',
      isText ? number(holding.weight, PERCENT) : formulaCell(`=${referenceOf(cells.measure!)}`, PERCENT),
    )
  else {
    put(
      'measure',
      isText
        ? number(holding.weight * capital, '#,##0.00')
        : formulaCell(`=${referenceOf(cells.measure!)}`, '#,##0.00'),
    )
    if (sheet.keys.includes('base'))
      put(
        'base',
        cells.amount
          ? formulaCell(`=${referenceOf(cells.amount)}`, '#,##0.00')
          : number(holding.amount ?? 0, '#,##0.00'),
      )
    formula('weight', PERCENT, () => `${at('measure')}/${sheet.at('capital')}`)
  }
  put('our weight', number(d.weights[i], PERCENT))

  layMoments(sheet, i, put, formula, notes)
  const covariance = at(sheet.shrinkage ? 'shrunk covariance' : 'covariance')
  const variance = at(sheet.shrinkage ? 'shrunk variance' : 'variance')
  const s = (): string => sheet.at('volatility per period')
  const scaled = (): string => `SQRT(${sheet.at('periods')})`
  formula('stand-alone', PERCENT, () => `ABS(${at('weight')})*SQRT(${variance})*${scaled()}`)
  put('our stand-alone', number(d.standAlone[i], PERCENT))
  const risks: Key[] = ['stand-alone', 'contribution']
  const ratios: Key[] = ['weight']
  if (d.marginal === null) {
    formula('contribution', PERCENT, () => `IF(${s()}=0,0,${at('weight')}*${covariance}/${s()}*${scaled()})`)
    for (const key of ['marginal', 'share', 'beta', 'correlation'] as const) put(key, text('not defined'))
  } else {
    formula('marginal', PERCENT, () => `${covariance}/${s()}*${scaled()}`)
    formula('contribution', PERCENT, () => `${at('weight')}*${at('marginal')}`)
    formula('beta', RATIO, () => `${covariance}/${s()}^2`)
    put('our marginal', number(d.marginal[i], PERCENT))
    put('our beta', number(d.beta?.[i], RATIO))
    risks.push('marginal')
    ratios.push('beta')
    if (sharesWithheld === null) {
      formula('share', SHARE, () => `${at('contribution')}/${sheet.at('volatility')}`)
      put('our share', number(d.share?.[i], SHARE))
      ratios.push('share')
    } else put('share', text('withheld'))
    if (sheet.moves(i) && Number.isFinite(d.correlation?.[i])) {
      formula('correlation', RATIO, () => `${covariance}/(SQRT(${variance})*${s()})`)
      put('our correlation', number(d.correlation?.[i], RATIO))
      ratios.push('correlation')
    } else put('correlation', text('not defined'))
  }
  put('our contribution', number(d.contribution[i], PERCENT))
  const gap = (keys: readonly Key[]) => (): string =>
    `MAX(${keys.map((key) => `ABS(${at(key)}-${at(`our ${key}` as Key)})`).join(',')})`
  formula('risk gap', GAP, gap(risks))
  formula('ratio gap', GAP, gap(ratios))
  put('mark', () =>
    sheet.mark([
      [at('risk gap'), sheet.allowed('risk')],
      [at('ratio gap'), sheet.allowed('ratio')],
    ]),
  )
  put('note', text(notes.join('; ')))
}

import { makeStyles, tokens } from '@fluentui/react-components'
import { bandOf, bandText, numberText, percentText, type Breakdown } from '../sheet'
import { bandsOf, digitsFor, sharesOf } from './measure'
import { useKept } from './store'
import { FigureTable, Pairs, TieOut, WIDTHS, type Sorting, type TableColumn } from './table'

const useStyles = makeStyles({
  sentence: { margin: `${tokens.spacingVerticalXS} 0 0` },
  note: {
    margin: 0,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    color: tokens.colorNeutralForeground2,
  },
  tied: { color: tokens.colorNeutralForeground3, fontWeight: tokens.fontWeightSemibold },
  // The words that the sign says to the eye.
  unseen: { position: 'absolute', width: '1px', height: '1px', overflow: 'hidden', clipPath: 'inset(50%)' },
})

/** The columns of every table that splits the volatility. */
export const riskColumns = (first: string): readonly TableColumn[] => [
  { head: first, width: null },
  { head: 'Weight', width: WIDTHS.weight },
  { head: 'Contribution to risk', width: WIDTHS.contribution },
  { head: 'Share of risk', width: WIDTHS.share },
]
const [NAME, WEIGHT] = [0, 1]

/** What stands where a figure is withheld or not defined. */
export const NONE = '–'

/** How the share of risk reads as a sensitivity. */
export function sensitivity(share: number): string {
  return `A 1% larger position (of itself) changes portfolio volatility by ${percentText(share / 100, 2)} (of itself), first order.`
}

const orNone = (value: number | undefined, show: (value: number) => string): string =>
  value === undefined || Number.isNaN(value) ? 'none' : show(value)

function Details({ breakdown, position }: { breakdown: Breakdown; position: number }) {
  const classes = useStyles()
  const { decomposition: d } = breakdown
  const share = sharesOf(breakdown)?.[position]
  const digits = digitsFor(d.weights.length)
  const bands = bandsOf(breakdown)
  const shareError = bands?.share?.[position]
  const isCertain = share === undefined || shareError === undefined || bandOf(share, shareError)[1] < 0
  return (
    <>
      <Pairs
        pairs={[
          ['Stand-alone risk', percentText(d.standAlone[position]!, 2)],
          ['Marginal contribution to risk', orNone(d.marginal?.[position], (value) => percentText(value, 2))],
          ['Beta to portfolio', orNone(d.beta?.[position], (value) => numberText(value, 2))],
          ['Correlation with portfolio', orNone(d.correlation?.[position], (value) => numberText(value, 2))],
          ...(bands
            ? [
                [
                  'Contribution, 95% band',
                  bandText(d.contribution[position]!, bands.contribution[position]!, digits + 1),
                ] as const,
              ]
            : []),
          ...(share !== undefined && shareError !== undefined
            ? [['Share of risk, 95% band', bandText(share, shareError, digits)] as const]
            : []),
          ...breakdown.groupHeaders.map(
            (header, k) => [header, breakdown.groups[position]?.[k] ?? ''] as const,
          ),
        ]}
      />
      {share !== undefined && (
        <p className={classes.sentence}>
          {share < 0 &&
            (isCertain
              ? 'Risk-reducing position. '
              : 'Risk-reducing position, not for certain: its band holds 0. ')}
          {sensitivity(share)}
        </p>
      )}
    </>
  )
}

/** The sign of a position whose rank is not told apart from that of the next smaller one. */
function TiedMark() {
  const classes = useStyles()
  return (
    <>
      <span className={classes.tied} aria-hidden>
        {' ≈'}
      </span>
      <span className={classes.unseen}>, order not told apart from the next smaller one</span>
    </>
  )
}

/** Every position with its figures; a press on its name opens the rest of them. */
export function Positions({ breakdown }: { breakdown: Breakdown }) {
  const classes = useStyles()
  const [sorting, setSorting] = useKept<Sorting>('positions sorted', { column: 2, descending: true })
  const [opened, setOpened] = useKept<ReadonlySet<string>>('positions open', new Set())
  const { decomposition: d, names } = breakdown
  const shares = sharesOf(breakdown)
  const digits = digitsFor(names.length)
  const bands = bandsOf(breakdown)

  const compare = (a: number, b: number): number =>
    sorting.column === NAME
      ? (names[a] ?? '').localeCompare(names[b] ?? '', undefined, { numeric: true })
      : sorting.column === WEIGHT
        ? d.weights[a]! - d.weights[b]!
        : d.contribution[a]! - d.contribution[b]!
  const order = names
    .map((_, i) => i)
    .sort((a, b) => (sorting.descending ? compare(b, a) : compare(a, b)) || a - b)
  const sortBy = (column: number): void =>
    setSorting({
      column,
      descending: sorting.column === column ? !sorting.descending : column !== NAME,
    })
  const toggle = (key: string | number): void => {
    const name = names[Number(key)] ?? ''
    const next = new Set(opened)
    if (!next.delete(name)) next.add(name)
    setOpened(next)
  }
  // the sign speaks of an order, so it shows only where the rows stand in it
  const byRisk = sorting.column > WEIGHT
  const tied = new Set(byRisk && bands && shares ? bands.order.filter((_, k) => bands.tied[k]) : [])
  return (
    <>
      <FigureTable
        label="Positions"
        columns={riskColumns('Position')}
        sorting={sorting}
        sortBy={sortBy}
        toggle={toggle}
        rows={order.map((i) => ({
          key: i,
          name: names[i] ?? '',
          mark: tied.has(i) && <TiedMark />,
          cells: [
            percentText(d.weights[i]!, digits),
            percentText(d.contribution[i]!, digits + 1),
            shares ? percentText(shares[i]!, digits) : NONE,
          ],
          open: opened.has(names[i] ?? ''),
          details: () => <Details breakdown={breakdown} position={i} />,
        }))}
        totals={[
          [
            'Total',
            percentText(breakdown.net, digits),
            percentText(d.volatility, digits + 1),
            shares ? percentText(1, digits) : NONE,
          ],
        ]}
      />
      {tied.size > 0 && (
        <p className={classes.note}>
          ≈ The returns do not tell the order of this position and the one{' '}
          {sorting.descending ? 'below' : 'above'} it apart: the 95% band of the difference of their shares
          holds 0.
        </p>
      )}
      <TieOut parts="Contributions" sum={d.sumOfContributions} total="volatility" whole={d.volatility} />
    </>
  )
}

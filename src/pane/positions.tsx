import { Fragment, useState } from 'react'
import { Button, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import {
  ArrowDown12Regular,
  ArrowUp12Regular,
  ChevronDown12Regular,
  ChevronRight12Regular,
} from '@fluentui/react-icons'
import { numberText, percentText, type Breakdown } from '../sheet'
import { digitsFor, sharesOf } from './measure'

const useStyles = makeStyles({
  table: {
    width: '100%',
    tableLayout: 'fixed',
    borderCollapse: 'separate',
    borderSpacing: 0,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    fontVariantNumeric: 'tabular-nums',
  },
  head: {
    position: 'sticky',
    top: `calc(-1 * ${tokens.spacingVerticalL})`,
    zIndex: 1,
    backgroundColor: tokens.colorNeutralBackground1,
    borderBottom: `1px solid ${tokens.colorNeutralStrokeAccessible}`,
    padding: 0,
    verticalAlign: 'bottom',
    textAlign: 'right',
    fontWeight: tokens.fontWeightRegular,
    color: tokens.colorNeutralForeground2,
  },
  plainHead: { padding: `${tokens.spacingVerticalXS} 0` },
  left: { textAlign: 'left' },
  sort: {
    width: '100%',
    border: 'none',
    background: 'none',
    font: 'inherit',
    color: 'inherit',
    textAlign: 'inherit',
    cursor: 'pointer',
    padding: `${tokens.spacingVerticalXS} 0`,
    ':hover': { color: tokens.colorNeutralForeground1 },
    ':focus-visible': { outline: `2px solid ${tokens.colorStrokeFocus2}`, outlineOffset: '-2px' },
  },
  sorted: { color: tokens.colorNeutralForeground1 },
  arrow: { verticalAlign: '-1px' },
  cell: {
    padding: `${tokens.spacingVerticalXS} 0`,
    borderBottom: `1px solid ${tokens.colorNeutralStroke2}`,
    textAlign: 'right',
    verticalAlign: 'top',
    fontWeight: tokens.fontWeightRegular,
  },
  name: { textAlign: 'left', overflowWrap: 'anywhere', paddingRight: tokens.spacingHorizontalS },
  open: {
    display: 'grid',
    gridTemplateColumns: '14px minmax(0, 1fr)',
    alignItems: 'baseline',
    border: 'none',
    background: 'none',
    padding: 0,
    font: 'inherit',
    color: 'inherit',
    textAlign: 'left',
    cursor: 'pointer',
    overflowWrap: 'anywhere',
    ':focus-visible': { outline: `2px solid ${tokens.colorStrokeFocus2}`, outlineOffset: '1px' },
  },
  total: {
    fontWeight: tokens.fontWeightSemibold,
    borderBottom: 'none',
    borderTop: `1px solid ${tokens.colorNeutralStrokeAccessible}`,
  },
  details: {
    textAlign: 'left',
    backgroundColor: tokens.colorNeutralBackground2,
    padding: `${tokens.spacingVerticalS} ${tokens.spacingHorizontalM}`,
    borderBottom: `1px solid ${tokens.colorNeutralStroke2}`,
  },
  pairs: { margin: 0, display: 'grid', rowGap: tokens.spacingVerticalXXS },
  pair: { display: 'flex', justifyContent: 'space-between', columnGap: tokens.spacingHorizontalM },
  value: { margin: 0 },
  sentence: { margin: `${tokens.spacingVerticalXS} 0 0` },
  tie: {
    margin: 0,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    color: tokens.colorNeutralForeground3,
  },
  weight: { width: '50px' },
  contribution: { width: '78px' },
  share: { width: '62px' },
})

type Key = 'name' | 'weight' | 'contribution' | 'share'

const HEADS: readonly (readonly [Key, string])[] = [
  ['name', 'Position'],
  ['weight', 'Weight'],
  ['contribution', 'Contribution to risk'],
  ['share', 'Share of risk'],
]

const STEP = 100

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
  const rows: readonly (readonly [string, string])[] = [
    ['Stand-alone risk', percentText(d.standAlone[position]!, 2)],
    ['Marginal contribution to risk', orNone(d.marginal?.[position], (value) => percentText(value, 2))],
    ['Beta to portfolio', orNone(d.beta?.[position], (value) => numberText(value, 2))],
    ['Correlation with portfolio', orNone(d.correlation?.[position], (value) => numberText(value, 2))],
    ...breakdown.groupHeaders.map((header, k) => [header, breakdown.groups[position]?.[k] ?? ''] as const),
  ]
  return (
    <>
      <dl className={classes.pairs}>
        {rows.map(([label, value], index) => (
          <div key={index} className={classes.pair}>
            <dt>{label}</dt>
            <dd className={classes.value}>{value}</dd>
          </div>
        ))}
      </dl>
      {share !== undefined && (
        <p className={classes.sentence}>
          {share < 0 && 'Risk-reducing position. '}
          {sensitivity(share)}
        </p>
      )}
    </>
  )
}

function Columns() {
  const classes = useStyles()
  return (
    <colgroup>
      <col />
      <col className={classes.weight} />
      <col className={classes.contribution} />
      <col className={classes.share} />
    </colgroup>
  )
}

/** Every position with its figures; a press on its name opens the rest of them. */
export function Positions({ breakdown }: { breakdown: Breakdown }) {
  const classes = useStyles()
  const [sort, setSort] = useState<{ key: Key; descending: boolean }>({
    key: 'contribution',
    descending: true,
  })
  const [opened, setOpened] = useState<ReadonlySet<string>>(new Set())
  const [limit, setLimit] = useState(STEP)
  const { decomposition: d, names } = breakdown
  const shares = sharesOf(breakdown)
  const digits = digitsFor(names.length)

  const values = { weight: d.weights, contribution: d.contribution, share: d.contribution }
  const compare = (a: number, b: number): number =>
    sort.key === 'name'
      ? (names[a] ?? '').localeCompare(names[b] ?? '', undefined, { numeric: true })
      : values[sort.key][a]! - values[sort.key][b]!
  const order = names
    .map((_, i) => i)
    .sort((a, b) => (sort.descending ? compare(b, a) : compare(a, b)) || a - b)
  const toggle = (name: string): void => {
    const next = new Set(opened)
    if (!next.delete(name)) next.add(name)
    setOpened(next)
  }

  return (
    <>
      <table className={classes.table} aria-label="Positions">
        <Columns />
        <thead>
          <tr>
            {HEADS.map(([key, text]) => {
              const active = sort.key === key
              const Arrow = sort.descending ? ArrowDown12Regular : ArrowUp12Regular
              return (
                <th
                  key={key}
                  scope="col"
                  aria-sort={active ? (sort.descending ? 'descending' : 'ascending') : 'none'}
                  className={mergeClasses(
                    classes.head,
                    key === 'name' && classes.left,
                    active && classes.sorted,
                  )}
                >
                  <button
                    type="button"
                    className={classes.sort}
                    onClick={() => setSort({ key, descending: active ? !sort.descending : key !== 'name' })}
                  >
                    {text}
                    {active && <Arrow className={classes.arrow} aria-hidden />}
                  </button>
                </th>
              )
            })}
          </tr>
        </thead>
        <tbody>
          {order.slice(0, limit).map((i) => {
            const name = names[i] ?? ''
            const open = opened.has(name)
            const Chevron = open ? ChevronDown12Regular : ChevronRight12Regular
            return (
              <Fragment key={i}>
                <tr>
                  <th scope="row" className={mergeClasses(classes.cell, classes.name)}>
                    <button
                      type="button"
                      className={classes.open}
                      aria-expanded={open}
                      onClick={() => toggle(name)}
                    >
                      <Chevron aria-hidden />
                      <span>{name}</span>
                    </button>
                  </th>
                  <td className={classes.cell}>{percentText(d.weights[i]!, digits)}</td>
                  <td className={classes.cell}>{percentText(d.contribution[i]!, digits + 1)}</td>
                  <td className={classes.cell}>{shares ? percentText(shares[i]!, digits) : '–'}</td>
                </tr>
                {open && (
                  <tr>
                    <td colSpan={4} className={classes.details}>
                      <Details breakdown={breakdown} position={i} />
                    </td>
                  </tr>
                )}
              </Fragment>
            )
          })}
        </tbody>
        <tfoot>
          <tr>
            <th scope="row" className={mergeClasses(classes.cell, classes.name, classes.total)}>
              Total
            </th>
            <td className={mergeClasses(classes.cell, classes.total)}>
              {percentText(breakdown.net, digits)}
            </td>
            <td className={mergeClasses(classes.cell, classes.total)}>
              {percentText(d.volatility, digits + 1)}
            </td>
            <td className={mergeClasses(classes.cell, classes.total)}>
              {shares ? percentText(1, digits) : '–'}
            </td>
          </tr>
        </tfoot>
      </table>
      {limit < order.length && (
        <Button size="small" onClick={() => setLimit(limit + STEP)}>
          {`Show ${Math.min(STEP, order.length - limit)} more of ${order.length.toLocaleString('en-US')}`}
        </Button>
      )}
      <p className={classes.tie}>
        Contributions add up to {percentText(d.sumOfContributions, 4)}, volatility{' '}
        {percentText(d.volatility, 4)}, difference {percentText(d.difference, 4)}.
      </p>
    </>
  )
}

/** One table for a group column: contributions and shares of its groups add up to the whole. */
export function Groups({ breakdown, index }: { breakdown: Breakdown; index: number }) {
  const classes = useStyles()
  const group = breakdown.byGroup[index]
  if (!group) return null
  const { labels, parts, header } = group
  const withShares = sharesOf(breakdown) !== null
  const digits = digitsFor(0)
  const order = labels.map((_, i) => i).sort((a, b) => parts.contribution[b]! - parts.contribution[a]!)
  return (
    <table className={classes.table} aria-label={`By ${header}`}>
      <Columns />
      <thead>
        <tr>
          {HEADS.map(([key, text]) => (
            <th
              key={key}
              scope="col"
              className={mergeClasses(classes.head, classes.plainHead, key === 'name' && classes.left)}
            >
              {key === 'name' ? header : text}
            </th>
          ))}
        </tr>
      </thead>
      <tbody>
        {order.map((i) => (
          <tr key={i}>
            <th scope="row" className={mergeClasses(classes.cell, classes.name)}>
              {labels[i]}
            </th>
            <td className={classes.cell}>{percentText(parts.weight[i]!, digits)}</td>
            <td className={classes.cell}>{percentText(parts.contribution[i]!, digits + 1)}</td>
            <td className={classes.cell}>
              {withShares && parts.share ? percentText(parts.share[i]!, digits) : '–'}
            </td>
          </tr>
        ))}
      </tbody>
      <tfoot>
        <tr>
          <th scope="row" className={mergeClasses(classes.cell, classes.name, classes.total)}>
            Total
          </th>
          <td className={mergeClasses(classes.cell, classes.total)}>{percentText(breakdown.net, digits)}</td>
          <td className={mergeClasses(classes.cell, classes.total)}>
            {percentText(breakdown.decomposition.volatility, digits + 1)}
          </td>
          <td className={mergeClasses(classes.cell, classes.total)}>
            {withShares ? percentText(1, digits) : '–'}
          </td>
        </tr>
      </tfoot>
    </table>
  )
}

import { Fragment, useState, type KeyboardEvent, type ReactNode } from 'react'
import { Button, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import {
  ArrowDown12Regular,
  ArrowUp12Regular,
  ChevronDown12Regular,
  ChevronRight12Regular,
} from '@fluentui/react-icons'
import { percentText } from '../sheet'

export const useTableStyles = makeStyles({
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
    // below what a view keeps in sight above it
    top: `calc(var(--kept-in-sight, 0px) - ${tokens.spacingVerticalL})`,
    zIndex: 1,
    backgroundColor: tokens.colorNeutralBackground1,
    borderBottom: `1px solid ${tokens.colorNeutralStrokeAccessible}`,
    padding: 0,
    verticalAlign: 'bottom',
    textAlign: 'right',
    fontWeight: tokens.fontWeightRegular,
    color: tokens.colorNeutralForeground2,
  },
  plainHead: { padding: `${tokens.spacingVerticalXS} 0 ${tokens.spacingVerticalXS} 6px` },
  left: { textAlign: 'left', paddingLeft: 0 },
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
    padding: `${tokens.spacingVerticalXS} 0 ${tokens.spacingVerticalXS} 6px`,
    borderBottom: `1px solid ${tokens.colorNeutralStroke2}`,
    textAlign: 'right',
    verticalAlign: 'top',
    fontWeight: tokens.fontWeightRegular,
  },
  name: { textAlign: 'left', overflowWrap: 'anywhere', paddingLeft: 0 },
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
  closed: { paddingLeft: '14px' },
  strong: { fontWeight: tokens.fontWeightSemibold },
  total: { fontWeight: tokens.fontWeightSemibold, borderBottom: 'none' },
  firstTotal: { borderTop: `1px solid ${tokens.colorNeutralStrokeAccessible}` },
  details: {
    textAlign: 'left',
    backgroundColor: tokens.colorNeutralBackground2,
    padding: `${tokens.spacingVerticalS} ${tokens.spacingHorizontalM}`,
    borderBottom: `1px solid ${tokens.colorNeutralStroke2}`,
  },
  pairs: { margin: 0, display: 'grid', rowGap: tokens.spacingVerticalXXS },
  pair: { display: 'flex', justifyContent: 'space-between', columnGap: tokens.spacingHorizontalM },
  value: { margin: 0, textAlign: 'right' },
  facts: {
    margin: 0,
    display: 'grid',
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    fontVariantNumeric: 'tabular-nums',
    overflowWrap: 'anywhere',
  },
  fact: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) auto',
    columnGap: tokens.spacingHorizontalM,
    padding: `${tokens.spacingVerticalXS} 0`,
    borderTop: `1px solid ${tokens.colorNeutralStroke2}`,
  },
  meaning: { margin: 0, gridColumn: '1 / -1', color: tokens.colorNeutralForeground2 },
  more: { justifySelf: 'start' },
  tie: {
    margin: 0,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    color: tokens.colorNeutralForeground3,
  },
})

/** Rows drawn at first, and at each press for more. */
const STEP = 100

/** Widths in pixels of columns of figures, by what stands in them; the first column takes what is left. */
export const WIDTHS = { weight: 54, contribution: 84, share: 62 } as const

export interface TableColumn {
  readonly head: string
  /** null: the column of names */
  readonly width: number | null
}

export interface TableRow {
  readonly key: string | number
  readonly name: string
  /** a sign after the name, with its words */
  readonly mark?: ReactNode
  readonly cells: readonly string[]
  /** how far in it stands; 0 is outermost */
  readonly depth?: number
  readonly strong?: boolean
  /** whether what it holds is shown; undefined where it holds nothing */
  readonly open?: boolean | undefined
  /** drawn below while open; rows further in are rows of their own */
  readonly details?: () => ReactNode
}

export interface Sorting {
  readonly column: number
  readonly descending: boolean
}

/**
 * A table of figures. Where its rows open, one of them is a stop of the Tab key: up and down move between them, right and left open
 * and close.
 */
export function FigureTable({
  label,
  columns,
  rows,
  totals = [],
  toggle,
  sorting,
  sortBy,
}: {
  label: string
  columns: readonly TableColumn[]
  rows: readonly TableRow[]
  totals?: readonly (readonly string[])[]
  toggle?: (key: TableRow['key']) => void
  sorting?: Sorting
  sortBy?: (column: number) => void
}) {
  const classes = useTableStyles()
  const [limit, setLimit] = useState(STEP)
  const [reached, setReached] = useState<TableRow['key'] | null>(null)
  const shown = rows.slice(0, limit)
  const opening = shown.filter(({ open }) => open !== undefined)
  const stop = opening.some(({ key }) => key === reached) ? reached : opening[0]?.key

  const move = (event: KeyboardEvent<HTMLTableSectionElement>): void => {
    const at = opening.findIndex(({ key }) => key === stop)
    const row = opening[at]
    if (!row || !(event.target instanceof HTMLButtonElement)) return
    const depth = row.depth ?? 0
    const parent = opening.filter((above, k) => k < at && (above.depth ?? 0) < depth).at(-1)
    if ((event.key === 'ArrowRight' && !row.open) || (event.key === 'ArrowLeft' && row.open)) {
      event.preventDefault()
      return toggle?.(row.key)
    }
    const places: { readonly [key: string]: TableRow | undefined } = {
      ArrowDown: opening[at + 1],
      ArrowUp: opening[at - 1],
      Home: opening[0],
      End: opening.at(-1),
      ArrowLeft: parent,
    }
    const next = places[event.key]
    if (!next) return
    event.preventDefault()
    setReached(next.key)
    const buttons = event.currentTarget.querySelectorAll<HTMLButtonElement>('button[aria-expanded]')
    buttons[opening.indexOf(next)]?.focus()
  }

  return (
    <>
      <table className={classes.table} aria-label={label}>
        <colgroup>
          {columns.map(({ width }, k) => (
            <col key={k} style={width === null ? undefined : { width: `${width}px` }} />
          ))}
        </colgroup>
        <thead>
          <tr>
            {columns.map(({ head }, k) => {
              const active = sorting?.column === k
              const Arrow = sorting?.descending ? ArrowDown12Regular : ArrowUp12Regular
              return (
                <th
                  key={k}
                  scope="col"
                  aria-sort={
                    sorting
                      ? active
                        ? sorting.descending
                          ? 'descending'
                          : 'ascending'
                        : 'none'
                      : undefined
                  }
                  className={mergeClasses(
                    classes.head,
                    !sortBy && classes.plainHead,
                    k === 0 && classes.left,
                    active && classes.sorted,
                  )}
                >
                  {sortBy ? (
                    <button type="button" className={classes.sort} onClick={() => sortBy(k)}>
                      {head}
                      {active && <Arrow className={classes.arrow} aria-hidden />}
                    </button>
                  ) : (
                    head
                  )}
                </th>
              )
            })}
          </tr>
        </thead>
        <tbody onKeyDown={move}>
          {shown.map((row) => {
            const Chevron = row.open ? ChevronDown12Regular : ChevronRight12Regular
            const weight = row.strong && classes.strong
            return (
              <Fragment key={row.key}>
                <tr>
                  <th
                    scope="row"
                    className={mergeClasses(classes.cell, classes.name, weight)}
                    style={row.depth ? { paddingLeft: `${row.depth * 12}px` } : undefined}
                  >
                    {row.open === undefined ? (
                      <div className={mergeClasses(opening.length > 0 && classes.closed)}>
                        {row.name}
                        {row.mark}
                      </div>
                    ) : (
                      <button
                        type="button"
                        className={classes.open}
                        aria-expanded={row.open}
                        tabIndex={row.key === stop ? 0 : -1}
                        onFocus={() => setReached(row.key)}
                        onClick={() => toggle?.(row.key)}
                      >
                        <Chevron aria-hidden />
                        <span>
                          {row.name}
                          {row.mark}
                        </span>
                      </button>
                    )}
                  </th>
                  {row.cells.map((cell, k) => (
                    <td key={k} className={mergeClasses(classes.cell, weight)}>
                      {cell}
                    </td>
                  ))}
                </tr>
                {row.open && row.details && (
                  <tr>
                    <td colSpan={columns.length} className={classes.details}>
                      {row.details()}
                    </td>
                  </tr>
                )}
              </Fragment>
            )
          })}
        </tbody>
        {totals.length > 0 && (
          <tfoot>
            {totals.map(([name, ...cells], k) => (
              <tr key={name}>
                <th
                  scope="row"
                  className={mergeClasses(
                    classes.cell,
                    classes.name,
                    classes.total,
                    k === 0 && classes.firstTotal,
                  )}
                >
                  {name}
                </th>
                {cells.map((cell, at) => (
                  <td
                    key={at}
                    className={mergeClasses(classes.cell, classes.total, k === 0 && classes.firstTotal)}
                  >
                    {cell}
                  </td>
                ))}
              </tr>
            ))}
          </tfoot>
        )}
      </table>
      {limit < rows.length && (
        <Button size="small" className={classes.more} onClick={() => setLimit(limit + STEP)}>
          {`Show ${Math.min(STEP, rows.length - limit)} more of ${rows.length.toLocaleString('en-US')}`}
        </Button>
      )}
    </>
  )
}

/** Labels and values, one pair a line. */
export function Pairs({ pairs }: { pairs: readonly (readonly [label: string, value: string])[] }) {
  const classes = useTableStyles()
  return (
    <dl className={classes.pairs}>
      {pairs.map(([label, value], index) => (
        <div key={index} className={classes.pair}>
          <dt>{label}</dt>
          <dd className={classes.value}>{value}</dd>
        </div>
      ))}
    </dl>
  )
}

/** Figures with their labels, each with a sentence below on what it means. */
export function Facts({
  lines,
}: {
  lines: readonly (readonly [label: string, figure: string, meaning: string])[]
}) {
  const classes = useTableStyles()
  return (
    <dl className={classes.facts}>
      {lines.map(([label, figure, meaning]) => (
        <div key={label} className={classes.fact}>
          <dt>{label}</dt>
          <dd className={mergeClasses(classes.value, classes.strong)}>{figure}</dd>
          {meaning !== '' && <dd className={classes.meaning}>{meaning}</dd>}
        </div>
      ))}
    </dl>
  )
}

/** The line below a table that shows its parts adding up to the total. */
export function TieOut({
  parts,
  sum,
  total,
  whole,
}: {
  /** what is added up */
  parts: string
  sum: number
  /** what they add up to, by name */
  total: string
  whole: number
}) {
  const classes = useTableStyles()
  return (
    <p className={classes.tie}>
      {parts} add up to {percentText(sum, 4)}, {total} {percentText(whole, 4)}, difference{' '}
      {percentText(sum - whole, 4)}.
    </p>
  )
}

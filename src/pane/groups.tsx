import { Button, makeStyles, ToggleButton, tokens } from '@fluentui/react-components'
import { percentText, withColumn, type Breakdown, type NestedGroup } from '../sheet'
import { Section } from './controls'
import { digitsFor, sharesOf } from './measure'
import { NONE, riskColumns } from './positions'
import { useBooks, useKept } from './store'
import { FigureTable, TieOut, type TableRow } from './table'

const useStyles = makeStyles({
  text: {
    margin: 0,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    color: tokens.colorNeutralForeground2,
  },
  buttons: { display: 'flex', flexWrap: 'wrap', gap: tokens.spacingHorizontalXS },
  number: { fontVariantNumeric: 'tabular-nums' },
})

const DIGITS = digitsFor(0)

const figures = (weight: number, contribution: number, share: number | null): readonly string[] => [
  percentText(weight, DIGITS),
  percentText(contribution, DIGITS + 1),
  share === null ? NONE : percentText(share, DIGITS),
]

const totalOf = (breakdown: Breakdown): readonly string[] => [
  'Total',
  ...figures(breakdown.net, breakdown.decomposition.volatility, sharesOf(breakdown) && 1),
]

/** The groups of one column. */
function OneColumn({ breakdown, index }: { breakdown: Breakdown; index: number }) {
  const group = breakdown.byGroup[index]
  if (!group) return null
  const { labels, parts, header } = group
  const shares = sharesOf(breakdown) && parts.share
  const order = labels.map((_, g) => g).sort((a, b) => parts.contribution[b]! - parts.contribution[a]!)
  return (
    <Section title={`By ${header}`} level={3}>
      <FigureTable
        label={`By ${header}`}
        columns={riskColumns(header)}
        rows={order.map((g) => ({
          key: g,
          name: labels[g] ?? '',
          cells: figures(parts.weight[g]!, parts.contribution[g]!, shares && shares[g]!),
        }))}
        totals={[totalOf(breakdown)]}
      />
    </Section>
  )
}

const byContribution = (a: { contribution: number }, b: { contribution: number }): number =>
  b.contribution - a.contribution

/** The rows of a tree in the order they are drawn, those within a closed group left out. */
function rowsOf(
  breakdown: Breakdown,
  groups: readonly NestedGroup[],
  isOpen: (path: string) => boolean,
  depth = 0,
  above = '',
): readonly TableRow[] {
  const { decomposition: d, names } = breakdown
  const shares = sharesOf(breakdown)
  return [...groups].sort(byContribution).flatMap((group) => {
    const path = `${above}/${group.label}`
    const open = isOpen(path)
    const row: TableRow = {
      key: path,
      name: group.label,
      cells: figures(group.weight, group.contribution, shares && group.share),
      depth,
      open,
      strong: depth === 0,
    }
    if (!open) return [row]
    const held = group.positions
      .map((i) => ({ i, contribution: d.contribution[i]! }))
      .sort(byContribution)
      .map(({ i, contribution }): TableRow => ({
        key: `${path}/${i}`,
        name: names[i] ?? '',
        cells: figures(d.weights[i]!, contribution, shares && shares[i]!),
        depth: depth + 1,
      }))
    return [row, ...rowsOf(breakdown, group.children, isOpen, depth + 1, path), ...held]
  })
}

const pathsOf = (groups: readonly NestedGroup[], above = ''): readonly string[] =>
  groups.flatMap(({ label, children }) => {
    const path = `${above}/${label}`
    return [path, ...pathsOf(children, path)]
  })

/** Group columns one within the other: which, in which order, and the tree they make. */
function Nested({ breakdown, nesting }: { breakdown: Breakdown; nesting: readonly string[] }) {
  const books = useBooks()
  const classes = useStyles()
  const [opened, setOpened] = useKept<ReadonlySet<string>>('groups open', new Set())
  const { nested, groupHeaders, decomposition } = breakdown
  const toggle = (path: string | number): void => {
    const next = new Set(opened)
    if (!next.delete(String(path))) next.add(String(path))
    setOpened(next)
  }
  const paths = pathsOf(nested)
  const allOpen = paths.every((path) => opened.has(path))
  return (
    <Section
      title="One within the other"
      level={3}
      action={
        nested.length > 0 && (
          <Button size="small" onClick={() => setOpened(new Set(allOpen ? [] : paths))}>
            {allOpen ? 'Close all' : 'Open all'}
          </Button>
        )
      }
    >
      <div role="group" aria-label="Columns, outermost first" className={classes.buttons}>
        {groupHeaders.map((header) => {
          const place = nesting.indexOf(header)
          return (
            <ToggleButton
              key={header}
              size="small"
              checked={place >= 0}
              onClick={() => void books.choose({ nesting: withColumn(nesting, header, place < 0) })}
            >
              {place >= 0 && <span className={classes.number}>{place + 1}.&nbsp;</span>}
              {header}
            </ToggleButton>
          )
        })}
      </div>
      {nested.length === 0 ? (
        <p className={classes.text}>Press two columns or more, the outermost first.</p>
      ) : (
        <>
          <FigureTable
            label={`By ${nesting.join(', then ')}`}
            columns={riskColumns(nesting.join(', '))}
            rows={rowsOf(breakdown, nested, (path) => opened.has(path))}
            totals={[totalOf(breakdown)]}
            toggle={toggle}
          />
          <TieOut
            parts="Outermost groups"
            sum={nested.reduce((sum, { contribution }) => sum + contribution, 0)}
            total="volatility"
            whole={decomposition.volatility}
          />
        </>
      )}
    </Section>
  )
}

/** Where the risk comes from by group: each column by itself, and columns one within the other. */
export default function Groups({ breakdown, nesting }: { breakdown: Breakdown; nesting: readonly string[] }) {
  return (
    <>
      {breakdown.byGroup.map((_, index) => (
        <OneColumn key={index} breakdown={breakdown} index={index} />
      ))}
      {breakdown.groupHeaders.length > 1 && <Nested breakdown={breakdown} nesting={nesting} />}
    </>
  )
}

import { memo, useState } from 'react'
import { makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import { numberText, percentText, type BooksState, type Breakdown, type ImpliedRow } from '../sheet'
import { Choice, Disclosure, Entry, PercentEntry, typedNumber } from './controls'
import { Remark } from './headline'
import { pointsText } from './measure'
import { NONE } from './positions'
import { useStepStyles } from './step'
import { useBooks, useKept } from './store'
import { FigureTable, type Sorting, type TableColumn } from './table'

const useStyles = makeStyles({
  list: {
    margin: 0,
    paddingLeft: tokens.spacingHorizontalL,
    display: 'grid',
    rowGap: tokens.spacingVerticalXS,
  },
})

/** What the returns are scaled by. */
interface Chosen {
  readonly kind: 'risk aversion' | 'total'
  readonly aversion: number
  readonly total: number
  readonly riskless: number
}

/** A risk aversion of 2 to 4 is what textbooks reckon with: common practice, no source. It stands in its field. */
const FIRST: Chosen = { kind: 'risk aversion', aversion: 3, total: 0.04, riskless: 0 }

interface Column extends TableColumn {
  readonly figure: (row: ImpliedRow) => number | null
  readonly shown: (figure: number) => string
}

const inPercent = (figure: number): string => percentText(figure, 2)

const IMPLIED: Column = {
  head: 'Implied return',
  width: 66,
  figure: ({ implied }) => implied,
  shown: inPercent,
}

const EXPECTED: Column = {
  head: 'Expected return',
  width: 66,
  figure: ({ expected }) => expected,
  shown: inPercent,
}

const WITHOUT_EXPECTED: readonly Column[] = [
  { head: 'Weight', width: 62, figure: ({ weight }) => weight, shown: inPercent },
  IMPLIED,
]

const WITH_EXPECTED: readonly Column[] = [
  IMPLIED,
  EXPECTED,
  {
    head: 'Difference, points',
    width: 70,
    figure: ({ difference }) => difference,
    shown: (figure) => pointsText(figure, 2),
  },
]

const PER_UNIT: readonly Column[] = [
  EXPECTED,
  {
    head: 'For each unit of marginal contribution',
    width: 96,
    figure: ({ perUnitOfMarginal }) => perUnitOfMarginal,
    shown: (figure) => numberText(figure, 2),
  },
]

function ImpliedTable({
  label,
  rows,
  total,
  columns,
}: {
  label: string
  rows: readonly ImpliedRow[]
  total: ImpliedRow
  columns: readonly Column[]
}) {
  const [sorting, setSorting] = useState<Sorting | null>(null)
  const cells = (row: ImpliedRow): readonly string[] =>
    columns.map(({ figure, shown }) => {
      const value = figure(row)
      return value === null ? NONE : shown(value)
    })
  const by = sorting && columns[sorting.column - 1]
  const compare = (a: ImpliedRow, b: ImpliedRow): number => {
    if (!by) return sorting ? a.name.localeCompare(b.name, undefined, { numeric: true }) : 0
    const [one, other] = [by.figure(a) ?? -Infinity, by.figure(b) ?? -Infinity]
    return one === other ? 0 : one - other
  }
  const sign = sorting?.descending ? -1 : 1
  // until a heading is pressed, as in the holdings
  const order = [...rows.keys()].sort((a, b) => sign * compare(rows[a]!, rows[b]!) || a - b)
  return (
    <FigureTable
      label={label}
      columns={[{ head: 'Holding', width: null }, ...columns]}
      {...(sorting && { sorting })}
      sortBy={(column) =>
        setSorting({ column, descending: sorting?.column === column ? !sorting.descending : column !== 0 })
      }
      rows={order.map((i) => ({ key: i, name: rows[i]!.name, cells: cells(rows[i]!) }))}
      totals={[['Total', ...cells(total)]]}
    />
  )
}

/** The answer; asked for anew when the figures or what is chosen are others. */
const Answer = memo(function Answer({ chosen }: { chosen: Chosen; breakdown: Breakdown }) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
  const { kind, aversion, total, riskless } = chosen
  const found = books.impliedReturns({ kind, value: kind === 'total' ? total : aversion }, riskless)
  if (typeof found === 'string') return <Remark text={found} />
  const hasExpected = found.rows.some(({ expected }) => expected !== null)
  return (
    <>
      <ImpliedTable
        label="Implied returns"
        rows={found.rows}
        total={found.total}
        columns={hasExpected ? WITH_EXPECTED : WITHOUT_EXPECTED}
      />
      {hasExpected && (
        <Disclosure summary="Expected return for each unit of marginal contribution to risk" open={false}>
          <ImpliedTable
            label="Expected return for each unit of marginal contribution to risk"
            rows={found.rows}
            total={found.total}
            columns={PER_UNIT}
          />
        </Disclosure>
      )}
      {!hasExpected && (
        <p className={mergeClasses(classes.small, classes.quiet)}>
          A column of the holdings headed Expected return would stand beside them.
        </p>
      )}
      <Disclosure summary="How to read these figures" open>
        <ul className={classes.list}>
          {found.conventions.map((sentence) => (
            <li key={sentence}>{sentence}</li>
          ))}
        </ul>
      </Disclosure>
    </>
  )
})

/** The returns at which the weights in the sheet would be the best, beside those the user expects. */
export default function Implied({ state, breakdown }: { state: BooksState; breakdown: Breakdown }) {
  const classes = useStepStyles()
  const [chosen, setChosen] = useKept<Chosen>('implied returns', FIRST)
  const hasExpected = state.holdings?.columns.some(({ role }) => role === 'expected return') ?? false
  const change = (part: Partial<Chosen>): void => setChosen({ ...chosen, ...part })
  return (
    <>
      <p className={classes.small}>
        What each holding would have to earn for the weights in the sheet to be the best ones. It is worked
        out from weights and risk alone: not a forecast, and not advice.
      </p>
      <div className={classes.pairs}>
        <div className={classes.wide}>
          <Choice
            label="Scaled by"
            value={chosen.kind}
            choices={[
              ['risk aversion', 'A risk aversion'],
              ['total', 'A total expected return of the book'],
            ]}
            choose={(kind) => change({ kind })}
          />
        </div>
        {chosen.kind === 'total' ? (
          <PercentEntry
            label={`Total return ${breakdown.horizon}, %`}
            value={chosen.total}
            hint="Beyond the riskless rate"
            commit={(total) => change({ total })}
          />
        ) : (
          <Entry
            label="Risk aversion"
            shown={String(chosen.aversion)}
            hint="Return asked for each unit of variance"
            read={(text) => {
              const value = typedNumber(text)
              return value !== null && value > 0 ? { value } : { needed: 'A number above 0 is needed.' }
            }}
            commit={(aversion) => change({ aversion })}
          />
        )}
        {hasExpected && (
          <PercentEntry
            label={`Riskless rate ${breakdown.horizon}, %`}
            value={chosen.riskless}
            hint="Contained in the expected returns"
            commit={(riskless) => change({ riskless })}
          />
        )}
      </div>
      <Answer chosen={chosen} breakdown={breakdown} />
    </>
  )
}

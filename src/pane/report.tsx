import { useMemo, useState } from 'react'
import { Button, Field, makeStyles, Radio, RadioGroup, tokens } from '@fluentui/react-components'
import { addressOf, breakdownTable, countOf, type BooksState, type Breakdown } from '../sheet'
import { countsOf } from './checks'
import { Section } from './controls'
import { bandsOf } from './measure'
import { PlaceLink, Sentence } from './place'
import { FaultLine } from './step'
import { useBooks, useBooksState } from './store'

const useStyles = makeStyles({
  view: { display: 'grid', rowGap: tokens.spacingVerticalXXL },
  text: { margin: 0, fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
  quiet: { margin: 0, color: tokens.colorNeutralForeground2 },
  list: {
    margin: 0,
    paddingLeft: tokens.spacingHorizontalL,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase300,
  },
  choices: { '& label': { fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 } },
  action: { justifySelf: 'start' },
})

type Place = 'where it was' | 'new sheet' | 'selection'

/** What a table of this breakdown holds, in the order it is written. */
function contents(breakdown: Breakdown, nesting: readonly string[]): readonly string[] {
  const { names, byGroup, nested, limits, sharesWithheld, tails, active, factors, currency } = breakdown
  const figures = [
    'weight',
    'stand-alone risk',
    'marginal contribution to risk',
    'contribution to risk',
    ...(sharesWithheld === null ? ['share of risk'] : []),
    ...(bandsOf(breakdown) ? ['95% bands'] : []),
    'beta and correlation with the portfolio',
  ]
  return [
    `${countOf(names.length, 'position')}: ${figures.join(', ')}`,
    'Total, sum of parts and their difference',
    ...byGroup.map(({ header, labels }) => `By ${header}: ${countOf(labels.length, 'group')}`),
    ...(nested.length > 0 ? [`By ${nesting.join(', then ')}, rows that fold`] : []),
    ...(limits.length > 0 ? [`${countOf(limits.length, 'limit')} with headroom, bars and status`] : []),
    ...(typeof tails === 'string' ? [] : [`Large losses: ${tails.label}`]),
    ...(active ? ['Against the benchmark: parts of the tracking error'] : []),
    ...(currency ? [`Local and currency parts, base currency ${currency.base}`] : []),
    ...(factors ? ['Factors, and what is specific to holdings'] : []),
    'The portfolio’s volatility, expected return and diversification',
    'Settings, warnings and the dates of the data',
  ]
}

/** The list of trades, before and after, on a sheet of its own. */
function TradesTable({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStyles()
  const { trades, faults, working } = state
  // the sentence of a fault stands where it was asked for
  const [asked, setAsked] = useState(false)
  if (!trades) return null
  const { comparison } = trades
  const none = typeof comparison === 'string'
  return (
    <Section title="Trades, before and after">
      <p className={classes.text}>
        {none
          ? comparison
          : 'Weights, volatility, contributions and limits on both sides, written to a sheet of its own.'}
      </p>
      {asked && <FaultLine text={faults.trades} />}
      <Button
        size="small"
        className={classes.action}
        disabledFocusable={none || working !== null}
        onClick={() => {
          setAsked(true)
          void books.writeTrades()
        }}
      >
        Write trades
      </Button>
    </Section>
  )
}

/** The list of what was found about the data, on a sheet of its own. */
function ChecksList({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStyles()
  const { checks, working } = state
  if (!checks) return null
  return (
    <Section title="List of data checks">
      <p className={classes.text}>
        {checks.length > 0 ? countsOf(checks) : 'Nothing found'}; written to a sheet of its own, with links to
        the cells.
      </p>
      <Button
        size="small"
        className={classes.action}
        disabledFocusable={working !== null}
        onClick={() => void books.writeChecks()}
      >
        Write list
      </Button>
    </Section>
  )
}

/** What to write where. */
export default function ReportView() {
  const books = useBooks()
  const classes = useStyles()
  const state = useBooksState()
  const { breakdown, table, faults, working, settings } = state
  const cells = useMemo(() => (breakdown ? breakdownTable('', breakdown).cells : []), [breakdown])
  const [wanted, setWanted] = useState<Place | null>(null)
  if (!breakdown)
    return <p className={classes.quiet}>There is a table to write once the figures are computed.</p>
  const place: Place =
    wanted === null || (wanted === 'where it was' && !table) ? (table ? 'where it was' : 'new sheet') : wanted
  return (
    <div className={classes.view}>
      <Section title="Breakdown table">
        <p className={classes.text}>
          {table ? (
            <>
              Lies at <PlaceLink area={table} /> and follows the weights.
            </>
          ) : (
            'Not written yet. Once written, it follows the weights.'
          )}
        </p>
        <Field
          label="Where"
          size="small"
          validationMessage={faults.table === undefined ? null : <Sentence text={faults.table} />}
        >
          <RadioGroup
            className={classes.choices}
            value={place}
            onChange={(_, { value }) => {
              if (value === 'where it was' || value === 'new sheet' || value === 'selection') setWanted(value)
            }}
          >
            {table && <Radio value="where it was" label={`Where it was (${addressOf(table)})`} />}
            <Radio value="new sheet" label="On a new sheet" />
            <Radio value="selection" label="At the selected cell" />
          </RadioGroup>
        </Field>
        <Button
          appearance="primary"
          size="small"
          className={classes.action}
          disabledFocusable={working !== null}
          onClick={() => void books.writeTable({ kind: place })}
        >
          Write table
        </Button>
      </Section>
      <Section title="What it will hold" level={3}>
        <p className={classes.text}>
          {countOf(cells.length, 'row')} and {countOf(cells[0]?.length ?? 0, 'column')}:
        </p>
        <ul className={classes.list}>
          {contents(breakdown, settings.nesting).map((line) => (
            <li key={line}>{line}</li>
          ))}
        </ul>
      </Section>
      <TradesTable state={state} />
      <ChecksList state={state} />
    </div>
  )
}

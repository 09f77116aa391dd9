import { lazy, useId, useMemo } from 'react'
import {
  Button,
  Field,
  makeStyles,
  mergeClasses,
  Radio,
  RadioGroup,
  tokens,
} from '@fluentui/react-components'
import { addressOf, breakdownTable, countOf, type BooksState, type Breakdown } from '../sheet'
import { changeHeadline } from './change-words'
import { countsOf } from './checks'
import Committee from './committee'
import { Disclosure, Folded, Section } from './controls'
import { HelpLink } from './help-link'
import KeptResults, { keptHeadline } from './kept-results'
import { bandsOf } from './measure'
import { PlaceLink, Sentence } from './place'
import Proof, { ProofButton, proofHeadline, ProofPlace } from './proof'
import { FaultLine, useStepStyles } from './step'
import { useBooks, useBooksState, useKept } from './store'

// What draws, or lays out tables for other programs, is loaded when it is wanted.
const WhatChanged = lazy(() => import('./what-changed'))
const CopyAndExport = lazy(() => import('./copy-export'))

const useStyles = makeStyles({
  view: { display: 'grid', rowGap: tokens.spacingVerticalXXL, minWidth: 0 },
  sections: { minWidth: 0, borderBottom: `1px solid ${tokens.colorNeutralStroke2}` },
  list: {
    margin: 0,
    paddingLeft: tokens.spacingHorizontalL,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase300,
  },
  choices: { '& label': { fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 } },
  // beneath the words of its choice, clear of the circle before them
  meaning: { padding: `0 0 ${tokens.spacingVerticalXS} 36px` },
})

type Place = 'where it was' | 'new sheet' | 'selection'

const WAYS = {
  values: {
    label: 'Values, kept up to date by this pane',
    meaning:
      'Numbers that follow the weights while this pane is open. They read the same without the add-in.',
  },
  functions: {
    label: 'POISE functions, live in cells',
    meaning:
      'The workbook works them out itself at every change. Whoever opens it needs the add-in; bands, limits and studies are not part of it.',
  },
  proof: {
    label: 'Excel formulas only (the proof sheet)',
    meaning: 'Formulas anyone can follow and recalculate without the add-in, beside our figures.',
  },
} as const

type Way = keyof typeof WAYS

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

/** What the table of values will hold. */
function Contents({ breakdown, nesting }: { breakdown: Breakdown; nesting: readonly string[] }) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const cells = useMemo(() => breakdownTable('', breakdown).cells, [breakdown])
  return (
    <>
      <p className={classes.small}>
        {countOf(cells.length, 'row')} and {countOf(cells[0]?.length ?? 0, 'column')}:
      </p>
      <ul className={classes.list}>
        {contents(breakdown, nesting).map((line) => (
          <li key={line}>{line}</li>
        ))}
      </ul>
    </>
  )
}

/** How the table is written, each way with what it means. */
function WayChoice({ way, choose }: { way: Way; choose: (way: Way) => void }) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const id = useId()
  return (
    <Field label="How it is written" size="small">
      <RadioGroup
        className={classes.choices}
        value={way}
        onChange={(_, { value }) => {
          if (value === 'values' || value === 'functions' || value === 'proof') choose(value)
        }}
      >
        {Object.entries(WAYS).map(([key, { label, meaning }]) => (
          <div key={key}>
            <Radio value={key} label={label} aria-describedby={`${id}${key}`} />
            <p id={`${id}${key}`} className={mergeClasses(classes.small, classes.quiet, classes.meaning)}>
              {meaning}
            </p>
          </div>
        ))}
      </RadioGroup>
    </Field>
  )
}

/** Where the table lies, or that it has not been written. */
function TablePlace({
  way,
  state: { table, reporting },
}: {
  way: 'values' | 'functions'
  state: BooksState
}) {
  const classes = useStepStyles()
  const area = way === 'values' ? table : reporting.live
  const follows = way === 'values' ? 'follows the weights' : 'is kept up to date by the workbook'
  return (
    <p className={classes.small}>
      {area ? (
        <>
          Lies at <PlaceLink area={area} /> and {follows}.
        </>
      ) : (
        `Not written yet. Once written, it ${follows}.`
      )}
    </p>
  )
}

/** The breakdown in cells: how, where, and the button. */
function BreakdownTable({ state, breakdown }: { state: BooksState; breakdown: Breakdown }) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
  const { table, reporting, faults, working, settings } = state
  const [way, setWay] = useKept<Way>('way of writing', 'values')
  const [wanted, setWanted] = useKept<Place | null>('place of writing', null)
  const earlier = way === 'values' ? table : reporting.live
  const place: Place =
    wanted === null || (wanted === 'where it was' && !earlier)
      ? earlier
        ? 'where it was'
        : 'new sheet'
      : wanted
  return (
    <Section title="Breakdown table">
      {way === 'proof' ? <ProofPlace proof={reporting.proof} /> : <TablePlace way={way} state={state} />}
      <WayChoice way={way} choose={setWay} />
      {way !== 'values' && (
        <p className={classes.small}>
          <HelpLink>Help on the POISE functions</HelpLink>
        </p>
      )}
      {way === 'proof' ? (
        <>
          <FaultLine text={faults.proof} />
          <ProofButton state={state} leading />
        </>
      ) : (
        <>
          <Field
            label="Where"
            size="small"
            validationMessage={faults.table === undefined ? null : <Sentence text={faults.table} />}
          >
            <RadioGroup
              className={classes.choices}
              value={place}
              onChange={(_, { value }) => {
                if (value === 'where it was' || value === 'new sheet' || value === 'selection')
                  setWanted(value)
              }}
            >
              {earlier && <Radio value="where it was" label={`Where it was (${addressOf(earlier)})`} />}
              <Radio value="new sheet" label="On a new sheet" />
              <Radio value="selection" label="At the selected cell" />
            </RadioGroup>
          </Field>
          <div className={classes.buttons}>
            <Button
              appearance="primary"
              size="small"
              disabledFocusable={working !== null}
              onClick={() =>
                void (way === 'values' ? books.writeTable({ kind: place }) : books.writeLive({ kind: place }))
              }
            >
              Write table
            </Button>
          </div>
        </>
      )}
      {way === 'values' && (
        <Disclosure summary="What it will hold" open={false}>
          <Contents breakdown={breakdown} nesting={settings.nesting} />
        </Disclosure>
      )}
    </Section>
  )
}

/** The list of trades, before and after, on a sheet of its own. */
function TradesTable({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStepStyles()
  const { trades, faults, working } = state
  // the sentence of a fault stands where it was asked for
  const [asked, setAsked] = useKept('trades written', false)
  if (!trades) return null
  const { comparison } = trades
  const none = typeof comparison === 'string'
  return (
    <Folded title="Trades, before and after" headline={none ? 'None yet' : 'Both sides, with limits'}>
      <p className={classes.small}>
        {none
          ? comparison
          : 'Weights, volatility, contributions and limits on both sides, written to a sheet of its own.'}
      </p>
      {asked && <FaultLine text={faults.trades} />}
      <div className={classes.buttons}>
        <Button
          size="small"
          disabledFocusable={none || working !== null}
          onClick={() => {
            setAsked(true)
            void books.writeTrades()
          }}
        >
          Write trades
        </Button>
      </div>
    </Folded>
  )
}

/** The list of what was found about the data, on a sheet of its own. */
function ChecksList({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStepStyles()
  const { checks, working } = state
  if (!checks) return null
  return (
    <Folded title="List of data checks" headline={checks.length > 0 ? countsOf(checks) : 'Nothing found'}>
      <p className={classes.small}>Written to a sheet of its own, with links to the cells.</p>
      <div className={classes.buttons}>
        <Button size="small" disabledFocusable={working !== null} onClick={() => void books.writeChecks()}>
          Write list
        </Button>
      </div>
    </Folded>
  )
}

/** What to write where, what is kept, and what has changed since. */
export default function ReportView() {
  const classes = { ...useStepStyles(), ...useStyles() }
  const state = useBooksState()
  const { breakdown, reporting, faults } = state
  // two sections share one field of faults: the sentence stands where it was asked for
  const [asked, setAsked] = useKept<'kept' | 'change' | null>('history asked', null)
  const faultOf = (section: 'kept' | 'change') => (asked === section ? faults.history : undefined)
  return (
    <div className={classes.view}>
      {breakdown ? (
        <BreakdownTable state={state} breakdown={breakdown} />
      ) : (
        <p className={classes.small}>There is a table to write once the figures are computed.</p>
      )}
      <div className={classes.sections}>
        {breakdown && (
          <>
            <Folded title="Proof" headline={proofHeadline(reporting.proof)}>
              <Proof state={state} breakdown={breakdown} />
            </Folded>
            <Folded title="Committee page" headline="One page to print">
              <Committee state={state} breakdown={breakdown} />
            </Folded>
          </>
        )}
        {(breakdown || reporting.kept.length > 0) && (
          <>
            <Folded title="Kept results" headline={keptHeadline(reporting.kept)}>
              <KeptResults
                state={state}
                canKeep={breakdown !== null}
                fault={faultOf('kept')}
                asked={() => setAsked('kept')}
              />
            </Folded>
            <Folded title="What changed" headline={changeHeadline(reporting)}>
              <WhatChanged state={state} fault={faultOf('change')} asked={() => setAsked('change')} />
            </Folded>
          </>
        )}
        {breakdown && (
          <Folded title="Copy and export" headline="The table to the clipboard, pictures as files">
            <CopyAndExport state={state} breakdown={breakdown} />
          </Folded>
        )}
        <TradesTable state={state} />
        <ChecksList state={state} />
      </div>
    </div>
  )
}

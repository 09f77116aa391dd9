import type { ReactNode } from 'react'
import { Button, Field, makeStyles, mergeClasses, Select, tokens } from '@fluentui/react-components'
import { Dismiss12Regular } from '@fluentui/react-icons'
import {
  numberText,
  ROLES,
  sameArea,
  type Area,
  type BooksState,
  type Finding,
  type HoldingsReading,
  type LookBack,
  type ReturnsReading,
  type Role,
} from '../sheet'
import { AskedButton, Choice, Disclosure, Entry, Section, typedNumber } from './controls'
import { Findings, PlaceLink, Sentence } from './place'
import { useBooks, useBooksState } from './store'

const useStyles = makeStyles({
  view: { display: 'grid', rowGap: tokens.spacingVerticalXXL },
  quiet: { color: tokens.colorNeutralForeground3 },
  small: {
    margin: 0,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    overflowWrap: 'anywhere',
  },
  read: {
    paddingLeft: tokens.spacingHorizontalM,
    borderLeft: `3px solid ${tokens.colorBrandStroke1}`,
  },
  columns: {
    display: 'grid',
    rowGap: tokens.spacingVerticalXS,
    listStyleType: 'none',
    margin: 0,
    padding: 0,
  },
  column: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) 150px',
    columnGap: tokens.spacingHorizontalS,
    alignItems: 'center',
  },
  ellipsis: { overflow: 'hidden', textOverflow: 'ellipsis', whiteSpace: 'nowrap' },
  changed: { color: tokens.colorBrandForeground1, fontWeight: tokens.fontWeightSemibold },
  pairs: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) minmax(0, 1fr)',
    columnGap: tokens.spacingHorizontalM,
    rowGap: tokens.spacingVerticalS,
    alignItems: 'start',
  },
  // a choice with what depends on it below
  cell: { display: 'grid', rowGap: tokens.spacingVerticalS, minWidth: 0 },
  capital: { display: 'flex', columnGap: tokens.spacingHorizontalS, alignItems: 'start' },
  // beside the line of entry, below its label
  besideEntry: { marginTop: '22px', flexShrink: 0 },
  grow: { flexGrow: 1, minWidth: 0 },
  chips: { display: 'flex', flexWrap: 'wrap', gap: tokens.spacingHorizontalXS, alignItems: 'center' },
  rule: {
    borderTop: `1px solid ${tokens.colorNeutralStroke2}`,
    paddingTop: tokens.spacingVerticalL,
  },
  buttons: { display: 'flex', flexWrap: 'wrap', gap: tokens.spacingHorizontalS },
})

const capitalised = (text: string): string => text.charAt(0).toUpperCase() + text.slice(1)

/** The step's button with what it led to: the address read and its one line, or the sentence of the fault at the button. */
function Step({
  title,
  field,
  help,
  area,
  summary,
  fault,
  next,
  children,
}: {
  title: string
  field: 'holdings' | 'returns'
  help: string
  area: Area | null
  summary: string | null
  fault: string | undefined
  /** whether this is what is to be done next */
  next: boolean
  children: ReactNode
}) {
  const books = useBooks()
  const classes = useStyles()
  return (
    <Section
      title={title}
      action={
        <Button
          size="small"
          appearance={next ? 'primary' : 'secondary'}
          onClick={() => void books.takeSelection(field)}
          aria-label={`Use selection for ${field}`}
        >
          Use selection
        </Button>
      }
    >
      {fault && <Field validationMessage={<Sentence text={fault} />} />}
      {area ? (
        <p className={mergeClasses(classes.small, classes.read)}>
          <PlaceLink area={area} />
          <br />
          {summary}
        </p>
      ) : (
        <p className={mergeClasses(classes.small, classes.quiet)}>{help}</p>
      )}
      {children}
    </Section>
  )
}

function Columns({ reading, open }: { reading: HoldingsReading; open: boolean }) {
  const books = useBooks()
  const classes = useStyles()
  const changed = reading.columns.filter(({ role, proposed }) => role !== proposed).length
  const count = `Columns (${reading.columns.length})${changed > 0 ? `, ${changed} changed` : ''}`
  return (
    <Disclosure summary={count} open={open || changed > 0}>
      <ul className={classes.columns}>
        {reading.columns.map(({ header, role, proposed, sample }, index) => (
          <li key={index} className={classes.column}>
            <div className={classes.small}>
              <div className={classes.ellipsis} title={header}>
                {header}
              </div>
              <div className={mergeClasses(classes.ellipsis, classes.quiet)} title={sample}>
                {role === proposed ? sample : <span className={classes.changed}>Proposed: {proposed}</span>}
              </div>
            </div>
            <Select
              size="small"
              aria-label={`Role of ${header}`}
              value={role}
              onChange={(_, data) => {
                const chosen = ROLES.find((known) => known === data.value)
                if (chosen) void books.assignRole(header, chosen)
              }}
            >
              {ROLES.map((known: Role) => (
                <option key={known} value={known}>
                  {capitalised(known)}
                </option>
              ))}
            </Select>
          </li>
        ))}
      </ul>
    </Disclosure>
  )
}

function Capital({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStyles()
  const { capital } = state.settings
  return (
    <div className={classes.capital}>
      <div className={classes.grow}>
        <Entry<number | null>
          label="Capital"
          shown={capital === null ? '' : numberText(capital, Number.isInteger(capital) ? 0 : 2)}
          hint="Amounts are divided by it. Empty: by their sum."
          fault={state.faults.capital}
          read={(text) => {
            if (text === '') return { value: null }
            const value = typedNumber(text.replaceAll(/,(?=\d{3}(?:\D|$))/g, ''))
            return value !== null && value > 0 ? { value } : { needed: 'A number above 0 is needed.' }
          }}
          commit={(value) => void books.choose({ capital: value })}
        />
      </div>
      <Button
        size="small"
        className={classes.besideEntry}
        onClick={() => void books.takeSelection('capital')}
      >
        Use selected cell
      </Button>
    </div>
  )
}

function Riskless({ names }: { names: readonly string[] }) {
  const books = useBooks()
  const classes = useStyles()
  if (names.length === 0) return null
  return (
    <div className={mergeClasses(classes.small, classes.chips)} role="group" aria-label="Marked as riskless">
      <span>Marked as riskless:</span>
      {names.map((name) => (
        <Button
          key={name}
          size="small"
          icon={<Dismiss12Regular />}
          iconPosition="after"
          aria-label={`${name}: no longer riskless`}
          onClick={() => void books.markRiskless(name, false)}
        >
          {name}
        </Button>
      ))}
    </div>
  )
}

/** Where a finding that stops points at a holding without a series, the holding may be cash: the user may say so there. */
function RisklessChoice({ finding }: { finding: Finding }) {
  const books = useBooks()
  const { holdings, returns } = useBooksState()
  if (finding.weight !== 'stops' || !returns?.names) return null
  const holding = holdings?.holdings.find(({ cell }) => sameArea(cell, finding.area))
  const plain = (name: string): string => name.trim().toLowerCase()
  if (!holding || returns.names.some((name) => plain(name) === plain(holding.name))) return null
  return (
    <Button
      size="small"
      aria-label={`Mark as riskless: ${holding.name}`}
      onClick={() => void books.markRiskless(holding.name, true)}
    >
      Mark as riskless
    </Button>
  )
}

function Holdings({ state }: { state: BooksState }) {
  const { holdings, settings, faults, breakdown } = state
  const inUse = (role: Role): boolean => holdings?.columns.some((column) => column.role === role) ?? false
  return (
    <Step
      title="Holdings"
      field="holdings"
      help="Select the holdings in the sheet: names, weights or amounts, any group columns, with their headings. Then press Use selection."
      area={holdings?.area ?? null}
      summary={holdings?.summary ?? null}
      fault={faults.holdings}
      next={holdings === null}
    >
      {holdings && (
        <>
          <Findings
            findings={holdings.findings}
            label="Found in the holdings"
            after={(finding) => <RisklessChoice finding={finding} />}
          />
          <Riskless names={settings.riskless} />
          {(inUse('amount') || inUse('exposure')) && !inUse('weight') && <Capital state={state} />}
          <Columns reading={holdings} open={breakdown === null} />
        </>
      )}
    </Step>
  )
}

/** Days from the start of the workbook's calendar to that of a date field, 1 January 1970. */
const EPOCH = 25569
const dateFieldOf = (serial: number): string =>
  new Date((Math.floor(serial) - EPOCH) * 86400000).toISOString().slice(0, 10)
const serialOf = (field: string): number | null => {
  const time = Date.parse(`${field}T00:00:00Z`)
  return Number.isNaN(time) ? null : time / 86400000 + EPOCH
}

function LookBackFields({ state, reading }: { state: BooksState; reading: ReturnsReading }) {
  const books = useBooks()
  const classes = useStyles()
  const { lookBack } = state.settings
  const dates = reading.dates
  const begin = (kind: LookBack['kind']): LookBack => {
    switch (kind) {
      case 'all':
        return { kind }
      case 'last':
        return { kind, dates: dates?.length ?? 100 }
      case 'since':
        return { kind, date: Math.floor(dates?.[0] ?? 0) }
    }
  }
  const choices: (readonly [LookBack['kind'], string])[] = [
    ['all', 'All dates'],
    ['last', 'Last dates'],
  ]
  if (dates) choices.push(['since', 'Since a date'])
  return (
    <div className={classes.cell}>
      <Choice
        label="Look-back"
        value={lookBack.kind}
        choices={choices}
        fault={lookBack.kind === 'all' ? state.faults['look-back'] : undefined}
        choose={(kind) => void books.choose({ lookBack: begin(kind) })}
      />
      {lookBack.kind === 'last' && (
        <Entry
          label="Number of dates"
          shown={String(lookBack.dates)}
          fault={state.faults['look-back']}
          read={(text) => {
            const value = typedNumber(text)
            return value !== null && Number.isInteger(value) && value >= 2
              ? { value }
              : { needed: 'A whole number of 2 or more is needed.' }
          }}
          commit={(value) => void books.choose({ lookBack: { kind: 'last', dates: value } })}
        />
      )}
      {lookBack.kind === 'since' && (
        <Entry
          label="Since"
          type="date"
          shown={dateFieldOf(lookBack.date)}
          fault={state.faults['look-back']}
          read={(text) => {
            const value = serialOf(text)
            return value !== null ? { value } : { needed: 'A date is needed.' }
          }}
          commit={(value) => void books.choose({ lookBack: { kind: 'since', date: value } })}
        />
      )}
    </div>
  )
}

const CONTENTS = { returns: 'Returns', prices: 'Prices', covariance: 'Covariance matrix' } as const
const FOUND = 'as found'

function ReturnsFields({ state, reading }: { state: BooksState; reading: ReturnsReading }) {
  const books = useBooks()
  const classes = useStyles()
  const { settings, faults } = state
  const { estimator } = settings
  const series = reading.content !== 'covariance'
  return (
    <div className={classes.pairs}>
      <div className={classes.cell}>
        <Choice
          label="Content"
          value={settings.content ?? FOUND}
          choices={[
            [FOUND, `${CONTENTS[reading.content]} (found)`],
            ['returns', CONTENTS.returns],
            ['prices', CONTENTS.prices],
            ['covariance', CONTENTS.covariance],
          ]}
          choose={(content) => void books.choose({ content: content === FOUND ? null : content })}
        />
        {reading.content === 'prices' && (
          <Choice
            label="Returns formed"
            value={settings.returnKind}
            choices={[
              ['simple', 'Simple'],
              ['log', 'Logarithmic'],
            ]}
            choose={(returnKind) => void books.choose({ returnKind })}
          />
        )}
      </div>
      {series && (
        <>
          <Choice
            label="Dates run"
            value={settings.orientation ?? FOUND}
            choices={[
              [FOUND, reading.orientation === 'dates down' ? 'Down (found)' : 'Across (found)'],
              ['dates down', 'Down'],
              ['dates across', 'Across'],
            ]}
            choose={(orientation) =>
              void books.choose({ orientation: orientation === FOUND ? null : orientation })
            }
          />
          <LookBackFields state={state} reading={reading} />
          <div className={classes.cell}>
            <Choice
              label="Estimator"
              value={estimator.kind}
              choices={[
                ['sample', 'Sample'],
                ['exponential', 'Exponential'],
              ]}
              hint={estimator.kind === 'sample' ? 'Equal weights over time' : 'Newer dates weigh more'}
              fault={estimator.kind === 'sample' ? faults.estimator : undefined}
              choose={(kind) =>
                void books.choose({ estimator: kind === 'sample' ? { kind } : { kind, decay: 0.94 } })
              }
            />
            {estimator.kind === 'exponential' && (
              <Entry
                label="Decay factor"
                shown={String(estimator.decay)}
                hint={`Half-life ${numberText(Math.log(0.5) / Math.log(estimator.decay), 1)} dates`}
                fault={faults.estimator}
                read={(text) => {
                  const value = typedNumber(text)
                  return value !== null && value > 0 && value < 1
                    ? { value }
                    : { needed: 'A number between 0 and 1 is needed.' }
                }}
                commit={(decay) => void books.choose({ estimator: { kind: 'exponential', decay } })}
              />
            )}
          </div>
        </>
      )}
      <Entry<number | null>
        label="Periods a year"
        shown={String(settings.periodsPerYear ?? reading.proposedPeriodsPerYear ?? '')}
        hint={
          settings.periodsPerYear !== null
            ? 'Empty: as proposed'
            : reading.proposedPeriodsPerYear !== null
              ? `Proposed: ${reading.frequency} dates`
              : 'Nothing to propose from'
        }
        fault={faults['periods per year']}
        read={(text) => {
          if (text === '') return { value: null }
          const value = typedNumber(text)
          return value !== null && value > 0 ? { value } : { needed: 'A number above 0 is needed.' }
        }}
        commit={(periodsPerYear) => void books.choose({ periodsPerYear })}
      />
    </div>
  )
}

function Returns({ state }: { state: BooksState }) {
  const { holdings, returns, faults } = state
  return (
    <Step
      title="Returns"
      field="returns"
      help="Select the block of returns, prices or covariances, with its names and dates. Then press Use selection."
      area={returns?.area ?? null}
      summary={returns?.summary ?? null}
      fault={faults.returns}
      next={holdings !== null && returns === null}
    >
      {returns && (
        <>
          <Findings
            findings={returns.findings}
            label="Found in the returns"
            after={(finding) => <RisklessChoice finding={finding} />}
          />
          <ReturnsFields state={state} reading={returns} />
        </>
      )}
    </Step>
  )
}

/** The book's own name, and the way to a second one. */
function Book({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStyles()
  if (!state.holdings && !state.returns && state.books.length < 2) return null
  const title = state.books.find(({ id }) => id === state.current)?.title ?? ''
  return (
    <div className={classes.rule}>
      <Section title="This book" level={3}>
        <Entry
          label="Name"
          shown={title}
          read={(text) => (text === '' ? { needed: 'A name is needed.' } : { value: text })}
          commit={(name) => void books.rename(name)}
        />
        <div className={mergeClasses(classes.small, classes.buttons)}>
          <Button size="small" onClick={() => void books.addBook()}>
            Add another book
          </Button>
          <AskedButton
            question="Forget the link to these cells? The cells themselves stay as they are."
            yes="Forget the link"
            act={() => void books.removeBook()}
          >
            Forget the link
          </AskedButton>
        </div>
      </Section>
    </div>
  )
}

/** What was read, which column is what, and what is wrong with it. */
export function DataView() {
  const classes = useStyles()
  const state = useBooksState()
  return (
    <div className={classes.view}>
      <Holdings state={state} />
      <Returns state={state} />
      <Book state={state} />
    </div>
  )
}

import type { Area, BooksState, Finding, LookBack, ReturnsReading } from '../sheet'
import { Choice, Entry, typedNumber } from './controls'
import { EstimatorFields, GapFields } from './estimator'
import { Findings } from './place'
import { RisklessChoice, Step, useStepStyles } from './step'
import { useBooks } from './store'

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
  const classes = useStepStyles()
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
  const classes = useStepStyles()
  const { settings, faults } = state
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
      {series && (
        <>
          <EstimatorFields state={state} />
          <GapFields state={state} />
        </>
      )}
    </div>
  )
}

/** What was found in reading, without what a data check tells of the same cells with more to it. */
export function untold(findings: readonly Finding[], checks: BooksState['checks']): readonly Finding[] {
  const told = (checks ?? []).flatMap(({ check }) => check.areas)
  const begins = (area: Area, at: Area): boolean =>
    area.sheet === at.sheet && area.row === at.row && area.column === at.column
  return findings.filter(
    ({ weight, area }) => weight === 'stops' || !area || !told.some((cells) => begins(cells, area)),
  )
}

/** The step of the returns: what was read, which dates count, and what the covariance is estimated by. */
export function Returns({ state }: { state: BooksState }) {
  const { holdings, returns, faults, checks } = state
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
            findings={untold(returns.findings, checks)}
            label="Found in the returns"
            after={(finding) => <RisklessChoice finding={finding} />}
          />
          <ReturnsFields state={state} reading={returns} />
        </>
      )}
    </Step>
  )
}

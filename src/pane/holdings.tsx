import { Button, makeStyles, mergeClasses, Select, tokens } from '@fluentui/react-components'
import { Dismiss12Regular } from '@fluentui/react-icons'
import { numberText, ROLES, type BooksState, type HoldingsReading, type Role } from '../sheet'
import { Disclosure, Entry, typedNumber } from './controls'
import { Findings } from './place'
import { RisklessChoice, Step, useStepStyles } from './step'
import { useBooks } from './store'

const useStyles = makeStyles({
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
  capital: { display: 'flex', columnGap: tokens.spacingHorizontalS, alignItems: 'start' },
  // beside the line of entry, below its label
  besideEntry: { marginTop: '22px', flexShrink: 0 },
  grow: { flexGrow: 1, minWidth: 0 },
  chips: { display: 'flex', flexWrap: 'wrap', gap: tokens.spacingHorizontalXS, alignItems: 'center' },
})

const capitalised = (text: string): string => text.charAt(0).toUpperCase() + text.slice(1)

function Columns({ reading, open }: { reading: HoldingsReading; open: boolean }) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
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
  const classes = { ...useStepStyles(), ...useStyles() }
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
  const classes = { ...useStepStyles(), ...useStyles() }
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

/** The step of the holdings: what was read, and which column is what. */
export function Holdings({ state }: { state: BooksState }) {
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

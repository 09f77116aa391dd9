import type { BooksState } from '../sheet'
import { listOf } from '../sheet'
import { Choice, Entry, Section } from './controls'
import { FaultLine, useStepStyles } from './step'
import { useBooks } from './store'

/** The step of the base currency: there where a column of the holdings names their currencies. */
export function Currency({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStepStyles()
  const { holdings, returns, settings, faults } = state
  const { currency } = settings
  if (!holdings || !returns || (holdings.currencyHeader === null && currency === null)) return null
  const all = [...new Set(holdings.holdings.map((holding) => holding.currency))]
  const labels = all.filter((label) => label !== '')
  return (
    <Section title="Currency">
      <div className={classes.cell}>
        <Entry
          label="Base currency"
          shown={currency?.base ?? ''}
          hint={`Empty: risk is not split by currency.${labels.length > 0 ? ` In the holdings: ${listOf(labels, 6)}.` : ''}${all.includes('') ? ' Blank cells count as in the base currency.' : ''}`}
          read={(text) => ({ value: text })}
          commit={(base) =>
            void books.choose({
              currency: base === '' ? null : { base, returnsIn: currency?.returnsIn ?? 'base' },
            })
          }
        />
        {currency && (
          <Choice
            label="Returns of foreign holdings stand in"
            value={currency.returnsIn}
            choices={[
              ['base', `The base currency, ${currency.base}`],
              ['local', 'Their own currencies'],
            ]}
            hint="The returns need a series for each foreign currency, under its name: what one unit of it returns in the base currency."
            choose={(returnsIn) => void books.choose({ currency: { ...currency, returnsIn } })}
          />
        )}
        <FaultLine text={faults.currency} />
      </div>
    </Section>
  )
}

import { useMemo } from 'react'
import { mergeClasses } from '@fluentui/react-components'
import { matchHoldings, quote, type BenchmarkChoice, type BooksState } from '../sheet'
import { Choice, Section } from './controls'
import { useStepStyles } from './step'
import { useBooks } from './store'

/** How each convention splits the tracking error. */
export const CONVENTIONS = {
  'own returns': 'Each position by its own return.',
  'benchmark-relative returns':
    'Each position by its return less the benchmark’s; what the net active weight has of the benchmark is a line of its own.',
} as const

const SERIES = 'series '

const choiceOf = (value: string): BenchmarkChoice =>
  value === 'column' || value === 'none'
    ? { kind: value }
    : { kind: 'series', name: value.slice(SERIES.length) }

/** The series of the returns, those that nothing is held of first. */
function useSeries({ holdings, returns, settings }: BooksState) {
  const { riskless } = settings
  return useMemo(() => {
    if (!holdings || !returns?.names) return { held: [], free: [] }
    const taken = new Set(matchHoldings(holdings, returns, riskless).seriesOf)
    const named = returns.names.map((name) => [`${SERIES}${name}`, name] as const)
    return {
      held: named.filter((_, i) => taken.has(i)),
      free: named.filter((_, i) => !taken.has(i)),
    }
  }, [holdings, returns, riskless])
}

/** The step of the benchmark: none, the weights in a column of the holdings, or one series of the returns. */
export function Benchmark({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStepStyles()
  const { holdings, returns, settings, faults } = state
  const { benchmark, convention } = settings
  const { held, free } = useSeries(state)
  if (!holdings || !returns) return null
  const column = holdings.columns.find(({ role }) => role === 'benchmark weight')
  const choices: (readonly [string, string])[] = [['none', 'None']]
  if (column) choices.push(['column', `Weights in column ${quote(column.header)}`])
  const value =
    benchmark.kind === 'series'
      ? `${SERIES}${benchmark.name}`
      : benchmark.kind === 'column' && column
        ? 'column'
        : 'none'
  const known = [...choices, ...free, ...held].some(([choice]) => choice === value)
  if (!known) choices.push([value, `${value.slice(SERIES.length)} (not among the returns)`])
  const more =
    returns.content === 'covariance'
      ? []
      : [
          { heading: 'Series of the returns, not held', choices: free },
          { heading: 'Series of the returns, held', choices: held },
        ].filter((group) => group.choices.length > 0)
  return (
    <Section title="Benchmark">
      <div className={classes.cell}>
        <Choice
          label="Measured against"
          value={value}
          choices={choices}
          more={more}
          hint={
            value === 'none' && !column
              ? 'A column of the holdings with the role Benchmark weight may be one, too.'
              : undefined
          }
          fault={faults.benchmark}
          choose={(chosen) => void books.choose({ benchmark: choiceOf(chosen) })}
        />
        {value !== 'none' && (
          <Choice
            label="Tracking error split by"
            value={convention}
            choices={[
              ['own returns', 'Own returns'],
              ['benchmark-relative returns', 'Benchmark-relative returns'],
            ]}
            hint={CONVENTIONS[convention]}
            choose={(chosen) => void books.choose({ convention: chosen })}
          />
        )}
      </div>
      {value === 'none' && (
        <p className={mergeClasses(classes.small, classes.quiet)}>
          Without one, risk is shown by itself, with no tracking error.
        </p>
      )}
    </Section>
  )
}

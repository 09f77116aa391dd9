import { useMemo } from 'react'
import { mergeClasses } from '@fluentui/react-components'
import { matchHoldings, type BooksState, type EstimatorChoice, type GapRule } from '../sheet'
import { Choice, Entry, typedNumber } from './controls'
import { useStepStyles } from './step'
import { useBooks } from './store'

type Kind = EstimatorChoice['kind']

const HINTS: { readonly [K in Kind]: string } = {
  sample: 'Every date counts alike, divisor T − 1.',
  population: 'Every date counts alike, divisor T.',
  exponential: 'Newer dates weigh more: follows changes of volatility, rests on fewer dates.',
  shrinkage: 'Pulled toward a simpler covariance: steadier where holdings are many for the dates there are.',
  lagged: 'Counts what a date has to do with those before it: for stale prices and different closing times.',
  factors: 'Holdings move together by the factors alone; what is left of each is its own.',
}

const TARGETS = {
  correlation: 'Constant correlation',
  identity: 'Identity',
  oas: 'Identity (OAS)',
} as const

const TARGET_HINTS: { readonly [T in keyof typeof TARGETS]: string } = {
  correlation: 'Variances stay as they are; correlations are pulled to their mean (Ledoit & Wolf 2004).',
  identity: 'Variances are pulled to their mean, correlations to 0 (Ledoit & Wolf 2004).',
  oas: 'As identity; intensity by oracle approximation, for normal returns (Chen et al. 2010).',
}

const LAGS = Array.from({ length: 10 }, (_, k) => String(k + 1))

/** Weights halve over this many dates. */
export const halfLifeOf = (decay: number): number => Math.log(0.5) / Math.log(decay)
export const decayOf = (halfLife: number): number => 0.5 ** (1 / halfLife)

/** As many digits as a reader tells apart; the figure itself keeps all of them. */
const shortened = (value: number, digits: number): string => String(Number(value.toPrecision(digits)))

/** Decay factor and half-life say the same: either is typed, the other follows. */
function Decay({ decay, fault }: { decay: number; fault: string | undefined }) {
  const books = useBooks()
  const commit = (factor: number): void =>
    void books.choose({ estimator: { kind: 'exponential', decay: factor } })
  return (
    <>
      <Entry
        label="Decay factor"
        shown={shortened(decay, 6)}
        fault={fault}
        read={(text) => {
          const value = typedNumber(text)
          return value !== null && value > 0 && value < 1
            ? { value }
            : { needed: 'A number between 0 and 1 is needed.' }
        }}
        commit={commit}
      />
      <Entry
        label="Half-life, dates"
        shown={shortened(halfLifeOf(decay), 4)}
        read={(text) => {
          const value = typedNumber(text)
          return value !== null && value > 0 && decayOf(value) > 0 && decayOf(value) < 1
            ? { value }
            : { needed: 'A number of dates above 0 is needed.' }
        }}
        commit={(halfLife) => commit(decayOf(halfLife))}
      />
    </>
  )
}

/** What the covariance is estimated by, and what goes with it. */
export function EstimatorFields({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStepStyles()
  const { estimator } = state.settings
  const fault = state.faults.estimator
  const choose = (choice: EstimatorChoice): void => void books.choose({ estimator: choice })
  const begin = (kind: Kind): void => {
    switch (kind) {
      case 'exponential':
        return choose({ kind, decay: 0.94 })
      case 'shrinkage':
        return choose({ kind, target: 'correlation' })
      case 'lagged':
        return choose({ kind, lags: 1 })
      default:
        return choose({ kind })
    }
  }
  const choices: (readonly [Kind, string])[] = [
    ['sample', 'Sample covariance'],
    ['exponential', 'Exponential weighting'],
    ['shrinkage', 'Shrinkage'],
    ['lagged', 'Lagged terms'],
  ]
  // once chosen it stays in the list, so that the field says what holds
  if (state.factors || estimator.kind === 'factors') choices.push(['factors', 'Factor model'])
  return (
    <>
      <div className={classes.wide}>
        <Choice
          label="Estimator"
          value={estimator.kind}
          choices={choices}
          hint={HINTS[estimator.kind]}
          fault={estimator.kind === 'exponential' ? undefined : fault}
          choose={begin}
        />
      </div>
      {estimator.kind === 'exponential' && <Decay decay={estimator.decay} fault={fault} />}
      {estimator.kind === 'shrinkage' && (
        <div className={classes.wide}>
          <Choice
            label="Target of shrinkage"
            value={estimator.target}
            choices={Object.entries(TARGETS).map(([target, text]) => [target as keyof typeof TARGETS, text])}
            hint={TARGET_HINTS[estimator.target]}
            choose={(target) => choose({ kind: 'shrinkage', target })}
          />
        </div>
      )}
      {estimator.kind === 'lagged' && (
        <Choice
          label="Lagged terms"
          value={String(estimator.lags)}
          choices={LAGS.map((count) => [count, count])}
          choose={(count) => choose({ kind: 'lagged', lags: Number(count) })}
        />
      )}
    </>
  )
}

const RULES: { readonly [R in GapRule]: readonly [name: string, hint: string] } = {
  'common dates': ['Dates common to all holdings', 'Dates on which some holding has no return are left out.'],
  'own overlap': [
    'Each pair’s own overlap',
    'Each covariance from the dates its two holdings share; the matrix may need mending.',
  ],
  completed: [
    'Completed from the longer histories',
    'Short histories by regression on the longer ones (Stambaugh 1997).',
  ],
}

/** Whether a series of a holding has gaps: without any, the rules for them are all the same. */
function useGaps({ holdings, returns, settings }: BooksState): boolean {
  const { riskless } = settings
  // a new weight reads the holdings anew but not the returns: the block, which may be large, is gone through once
  const gappy = useMemo(() => {
    const found = new Uint8Array(returns?.columns ?? 0)
    if (returns) returns.values.forEach((value, k) => Number.isNaN(value) && (found[k % found.length] = 1))
    return found
  }, [returns])
  return useMemo(
    () =>
      holdings !== null &&
      returns !== null &&
      gappy.includes(1) &&
      matchHoldings(holdings, returns, riskless).seriesOf.some((series) => gappy[series] === 1),
    [gappy, holdings, returns, riskless],
  )
}

/** What is done about dates on which some holding has no return. */
export function GapFields({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStepStyles()
  const { gaps, repair, estimator } = state.settings
  if (!useGaps(state) && gaps === 'common dates') return null
  const [, hint] = RULES[gaps]
  return (
    <div className={mergeClasses(classes.cell, classes.wide)}>
      <Choice
        label="Where a return is missing"
        value={gaps}
        choices={Object.entries(RULES).map(([rule, [name]]) => [rule as GapRule, name])}
        hint={
          estimator.kind === 'sample' ? hint : `${hint} The other rules go with the sample covariance alone.`
        }
        choose={(rule) => void books.choose({ gaps: rule })}
      />
      {gaps === 'own overlap' && (
        <Choice
          label="Repair"
          value={repair}
          choices={[
            ['nearest', 'Nearest correlations'],
            ['shrunk', 'Correlations shrunk together'],
          ]}
          hint={
            repair === 'nearest'
              ? 'Changes the matrix as little as can be (Higham 2002).'
              : 'All correlations toward 0 by one factor: quick, changes more.'
          }
          choose={(rule) => void books.choose({ repair: rule })}
        />
      )}
    </div>
  )
}

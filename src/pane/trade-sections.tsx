import { lazy } from 'react'
import { makeStyles, tokens } from '@fluentui/react-components'
import { limitsSummary, type BooksState, type Breakdown, type Comparison, type TradesState } from '../sheet'
import { Folded } from './controls'
import { useBooksState } from './store'

// What is folded away at first is loaded when it is wanted.
const Limits = lazy(() => import('./limits'))
const Targets = lazy(() => import('./targets'))
const Sizing = lazy(() => import('./sizing'))
const Implied = lazy(() => import('./implied-returns'))
const Stress = lazy(() => import('./stress'))

const useStyles = makeStyles({
  sections: { minWidth: 0, borderBottom: `1px solid ${tokens.colorNeutralStroke2}` },
})

interface Shown {
  readonly breakdown: Breakdown
  readonly trades: TradesState
}

/** A field of faults that several sections of a view share: the sentence stands where it was asked for. */
interface SharedFault<Asked> {
  readonly faultOf: (which: Asked) => string | undefined
  readonly asked: (which: Asked) => void
}

const targetHeadline = ({ proposal, pending, outdated }: TradesState): string =>
  proposal === null || !pending
    ? 'A volatility, a share of risk, risk budgets, limits'
    : `${proposal.title}: ${proposal.met ? 'met' : 'not met'}${outdated === null ? '' : ', before something changed'}`

/** What a list of trades is made for: the limits, and weights that are looked for. They stand before the list. */
export function Aims({
  breakdown,
  trades,
  comparison,
  state,
  faultOf,
  asked,
}: Shown &
  SharedFault<'target'> & {
    readonly comparison: Comparison | string
    readonly state: BooksState
  }) {
  const classes = useStyles()
  const { limits } = breakdown
  return (
    <div className={classes.sections}>
      <Folded title="Limits" headline={limits.length === 0 ? 'None yet' : limitsSummary(limits)}>
        <Limits
          states={limits}
          after={typeof comparison === 'string' ? null : comparison.limitsAfter}
          fault={state.faults.limits}
        />
      </Folded>
      <Folded title="Targets" headline={targetHeadline(trades)}>
        <Targets
          state={state}
          breakdown={breakdown}
          trades={trades}
          fault={faultOf('target')}
          asked={() => asked('target')}
        />
      </Folded>
    </div>
  )
}

/** What else helps to size a trade, and what the book would meet. They stand after the list. */
export function Questions({ breakdown, trades, faultOf, asked }: Shown & SharedFault<'scenarios'>) {
  const classes = useStyles()
  const state = useBooksState()
  return (
    <div className={classes.sections}>
      <Folded title="Sizing" headline="Risk against the weight of one holding, trades that lower risk most">
        <Sizing trades={trades} breakdown={breakdown} decimal={state.decimal} />
      </Folded>
      <Folded title="Implied returns" headline="What today’s weights ask each holding to earn">
        <Implied state={state} breakdown={breakdown} />
      </Folded>
      <Folded title="Stress" headline="Other volatilities and correlations, the past replayed">
        <Stress
          breakdown={breakdown}
          trades={trades}
          busy={state.working !== null}
          fault={faultOf('scenarios')}
          asked={() => asked('scenarios')}
        />
      </Folded>
    </div>
  )
}

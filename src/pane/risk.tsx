import { lazy, Suspense, useCallback, useState } from 'react'
import { makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import {
  bandText,
  confidenceText,
  countOf,
  numberText,
  percentText,
  type Breakdown,
  type BooksState,
  type CurrencyRisk,
} from '../sheet'
import { Folded, Section } from './controls'
import { Figures } from './figures'
import { Remark } from './headline'
import { digitsFor, measureOf, sharesOf } from './measure'
import { Positions, sensitivity } from './positions'
import { useBooksState, useKept } from './store'

// What is drawn, and what is folded away at first, is loaded when it is wanted: the first paint does without.
const Picture = lazy(() => import('./picture'))
const Groups = lazy(() => import('./groups'))
const LargeLosses = lazy(() => import('./large-losses'))
const AgainstBenchmark = lazy(() => import('./against-benchmark'))
const Currencies = lazy(() => import('./currencies'))
const Factors = lazy(() => import('./factors'))
const HowSure = lazy(() => import('./how-sure'))
const BackTest = lazy(() => import('./back-test'))

const useStyles = makeStyles({
  view: { display: 'grid', rowGap: tokens.spacingVerticalXXL, minWidth: 0 },
  sections: { minWidth: 0, borderBottom: `1px solid ${tokens.colorNeutralStroke2}` },
  quiet: { margin: 0, color: tokens.colorNeutralForeground2 },
  text: { margin: 0, fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
  reading: {
    padding: `${tokens.spacingVerticalS} ${tokens.spacingHorizontalM}`,
    backgroundColor: tokens.colorNeutralBackground2,
    border: `1px solid ${tokens.colorTransparentStroke}`,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    overflowWrap: 'anywhere',
  },
  // The longest usual sentence takes four lines: the rows below stay where they are while the selection moves.
  steady: { minHeight: `calc(4 * ${tokens.lineHeightBase200})` },
  name: { fontWeight: tokens.fontWeightSemibold },
})

/** The selected position in words. */
function Reading({ breakdown, position }: { breakdown: Breakdown; position: number }) {
  const classes = useStyles()
  const { decomposition: d, names } = breakdown
  const share = sharesOf(breakdown)?.[position]
  const digits = digitsFor(names.length)
  return (
    <div className={mergeClasses(classes.reading, share !== undefined && classes.steady)} role="status">
      <span className={classes.name}>{names[position]}</span>
      {share !== undefined && share < 0 && ', risk-reducing position'}: contribution to risk{' '}
      {percentText(d.contribution[position]!, digits + 1)}. {share !== undefined && sensitivity(share)}
    </div>
  )
}

function Positioned({ breakdown }: { breakdown: Breakdown }) {
  const measure = measureOf(breakdown)
  const classes = useStyles()
  const [chosen, setChosen] = useState<string | null>(null)
  const select = useCallback((position: number) => setChosen(breakdown.names[position] ?? null), [breakdown])
  const largest = measure.values.reduce((best, value, i) => (value > measure.values[best]! ? i : best), 0)
  const found = chosen === null ? -1 : breakdown.names.indexOf(chosen)
  const selected = found < 0 ? largest : found
  return (
    <Section title={`Weight and ${measure.label.toLowerCase()}`}>
      <Reading breakdown={breakdown} position={selected} />
      <Suspense fallback={<p className={classes.quiet}>Drawing…</p>}>
        <Picture breakdown={breakdown} measure={measure} selected={selected} select={select} />
      </Suspense>
    </Section>
  )
}

// ---- what the folded sections say while they are folded

/** The largest group of the first column. */
function groupsHeadline({ byGroup }: Breakdown): string {
  const [first] = byGroup
  if (!first) return ''
  const { contribution, share } = first.parts
  const most = contribution.reduce((best, value, g) => (value > contribution[best]! ? g : best), 0)
  const name = `${first.header}: ${first.labels[most] ?? ''}`
  return share
    ? `${name} has the largest share of risk, ${percentText(share[most]!, 1)}`
    : `${name} contributes most, ${percentText(contribution[most]!, 2)}`
}

const tailsHeadline = ({ tails }: Breakdown): string =>
  typeof tails === 'string'
    ? 'Not computed'
    : tails.risk.shortfall === null
      ? `Value at risk ${percentText(tails.risk.valueAtRisk, 2)}, ${tails.label}`
      : `Expected shortfall ${percentText(tails.risk.shortfall, 2)}, ${tails.label}`

function factorsHeadline({ factors, decomposition }: Breakdown): string {
  if (!factors) return 'The factor model is not the estimator'
  const systematic = factors.systematic.reduce((sum, part) => sum + part, 0)
  return `Systematic ${percentText(systematic, 2)} of the ${percentText(decomposition.volatility, 2)} of volatility`
}

const sureHeadline = ({ bands, decomposition }: Breakdown): string =>
  typeof bands === 'string'
    ? 'No error bands'
    : `Volatility ${percentText(decomposition.volatility, 2)}, 95% band ${bandText(decomposition.volatility, bands.volatility, 2)}`

function backTestHeadline({ backtest, outdated }: BooksState['studies']): string {
  if (!backtest)
    return `Forecasts against what happened: ${outdated.backtest ? 'the figures have changed since it was run' : 'not run yet'}`
  const { exceptions, expected, confidence } = backtest.result.tests
  return `${countOf(exceptions, 'exception')}, ${numberText(expected, 1)} expected at ${confidenceText(confidence)} confidence`
}

function currencyHeadline({ parts, base }: CurrencyRisk, { decomposition }: Breakdown): string {
  if (typeof parts === 'string') return 'Not split'
  const foreign = parts.currency.reduce((sum, part) => sum + part, 0)
  return `Currencies against ${base}: ${percentText(foreign, 2)} of the ${percentText(decomposition.volatility, 2)} of volatility`
}

const VERDICTS: { readonly [V in NonNullable<Breakdown['normality']>['book']['verdict']]: string } = {
  consistent: 'No sign against a normal distribution',
  'heavy-tailed': 'Tails heavier than normal',
  'light-tailed': 'Tails lighter than normal',
  'skewed-to-losses': 'Past returns lean to the side of losses',
  'skewed-to-gains': 'Past returns lean to the side of gains',
  'not-tested': 'Not tested',
}

const normalityHeadline = ({ book, partsDepart }: NonNullable<Breakdown['normality']>): string =>
  book.verdict === 'consistent' && partsDepart
    ? 'The book’s returns look normal, those of its parts do not'
    : VERDICTS[book.verdict]

function Sections({ breakdown, state }: { breakdown: Breakdown; state: BooksState }) {
  const classes = useStyles()
  const { active, byGroup, currency, normality, horizon } = breakdown
  // both studies share one field of faults: the sentence stands where it was asked for
  const [asked, setAsked] = useKept<'bootstrap' | 'back-test' | null>('study asked', null)
  return (
    <div className={classes.sections}>
      {byGroup.length > 0 && (
        <Folded title="Groups" headline={groupsHeadline(breakdown)}>
          <Groups breakdown={breakdown} nesting={state.settings.nesting} />
        </Folded>
      )}
      <Folded title="Large losses" headline={tailsHeadline(breakdown)}>
        <LargeLosses
          breakdown={breakdown}
          choice={state.settings.tails}
          fault={state.faults.tails}
          capital={state.holdings?.capital ?? null}
        />
      </Folded>
      {active && (
        <Folded
          title="Against the benchmark"
          headline={`Tracking error (ex ante) ${percentText(active.risk.trackingError, 2)} ${horizon}`}
        >
          <AgainstBenchmark active={active} breakdown={breakdown} />
        </Folded>
      )}
      {(breakdown.factors ?? state.factors) && (
        <Folded title="Factors" headline={factorsHeadline(breakdown)}>
          <Factors breakdown={breakdown} />
        </Folded>
      )}
      {currency && (
        <Folded title="Currencies" headline={currencyHeadline(currency, breakdown)}>
          <Currencies breakdown={breakdown} currency={currency} />
        </Folded>
      )}
      {normality && (
        <Folded title="Normality" headline={normalityHeadline(normality)}>
          <p className={classes.text}>{normality.sentence}</p>
        </Folded>
      )}
      <Folded title="How sure" headline={sureHeadline(breakdown)}>
        <HowSure
          breakdown={breakdown}
          state={state}
          fault={asked === 'bootstrap' ? state.faults.study : undefined}
          asked={() => setAsked('bootstrap')}
        />
      </Folded>
      <Folded title="Back-test" headline={backTestHeadline(state.studies)}>
        <BackTest
          state={state}
          fault={asked === 'back-test' ? state.faults.study : undefined}
          asked={() => setAsked('back-test')}
        />
      </Folded>
    </div>
  )
}

/** How much risk, and where it comes from. */
export function RiskView() {
  const classes = useStyles()
  const state = useBooksState()
  const { breakdown, status } = state
  if (!breakdown)
    return (
      <p className={classes.quiet}>
        {status.kind === 'nothing linked'
          ? 'The figures appear here once holdings and returns are read, under Data.'
          : 'Press Compute (Ctrl+Enter) for the figures.'}
      </p>
    )
  return (
    <div className={classes.view}>
      {status.kind === 'failed' && <Remark text="Figures as last computed, before the failure told above." />}
      <Figures breakdown={breakdown} checks={state.checks} />
      {breakdown.sharesWithheld !== null && <Remark text={breakdown.sharesWithheld} />}
      {breakdown.decomposition.volatility > 0 && <Positioned breakdown={breakdown} />}
      <Section title="Positions">
        <Positions breakdown={breakdown} />
      </Section>
      <Sections breakdown={breakdown} state={state} />
    </div>
  )
}

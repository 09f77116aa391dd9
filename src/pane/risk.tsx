import { lazy, Suspense, useCallback, useState } from 'react'
import { makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import { percentText, type Breakdown } from '../sheet'
import { Section } from './controls'
import { Figures } from './figures'
import { digitsFor, measureOf, sharesOf } from './measure'
import { Groups, Positions, sensitivity } from './positions'
import { useBooksState } from './store'

// The picture and its scales are loaded when there is something to draw: the first paint does without.
const Picture = lazy(() => import('./picture'))

const useStyles = makeStyles({
  view: { display: 'grid', rowGap: tokens.spacingVerticalXXL, minWidth: 0 },
  quiet: { margin: 0, color: tokens.colorNeutralForeground2 },
  withheld: {
    margin: 0,
    padding: tokens.spacingHorizontalM,
    backgroundColor: tokens.colorNeutralBackground3,
    border: `1px solid ${tokens.colorTransparentStroke}`,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
  },
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

/** How much risk, and where it comes from. */
export function RiskView() {
  const classes = useStyles()
  const { breakdown, status } = useBooksState()
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
      {status.kind === 'failed' && (
        <p className={classes.withheld}>Figures as last computed, before the failure told above.</p>
      )}
      <Figures breakdown={breakdown} />
      {breakdown.sharesWithheld !== null && <p className={classes.withheld}>{breakdown.sharesWithheld}</p>}
      {breakdown.decomposition.volatility > 0 && <Positioned breakdown={breakdown} />}
      {breakdown.byGroup.map(({ header }, index) => (
        <Section key={index} title={`By ${header}`}>
          <Groups breakdown={breakdown} index={index} />
        </Section>
      ))}
      <Section title="Positions">
        <Positions breakdown={breakdown} />
      </Section>
    </div>
  )
}

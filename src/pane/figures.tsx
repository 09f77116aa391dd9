import { makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import {
  bandText,
  countOf,
  dateText,
  numberText,
  percentText,
  type BooksState,
  type Breakdown,
  type LimitState,
} from '../sheet'
import { countsOf } from './checks'
import { Disclosure } from './controls'
import { Headline } from './headline'
import { Findings, Sentence } from './place'
import { NONE } from './positions'

const useStyles = makeStyles({
  block: { display: 'grid', rowGap: tokens.spacingVerticalM, minWidth: 0 },
  label: {
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    color: tokens.colorNeutralForeground2,
  },
  value: { margin: 0, fontVariantNumeric: 'tabular-nums', fontWeight: tokens.fontWeightSemibold },
  band: {
    margin: 0,
    marginTop: `calc(-1 * ${tokens.spacingVerticalXS})`,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    fontVariantNumeric: 'tabular-nums',
    color: tokens.colorNeutralForeground2,
  },
  rows: { margin: 0, display: 'grid' },
  row: {
    display: 'flex',
    justifyContent: 'space-between',
    alignItems: 'baseline',
    columnGap: tokens.spacingHorizontalM,
    padding: `${tokens.spacingVerticalXS} 0`,
    borderTop: `1px solid ${tokens.colorNeutralStroke2}`,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
  },
  setting: { margin: 0, overflowWrap: 'anywhere' },
  settingRow: { display: 'grid', gridTemplateColumns: '84px minmax(0, 1fr)', justifyContent: 'start' },
  settingLabel: { color: tokens.colorNeutralForeground3 },
})

function datesLine(dates: Breakdown['dates']): string {
  if (!dates) return 'from a covariance matrix'
  const { used, dropped, first, last } = dates
  const span = first !== null && last !== null ? `, ${dateText(first)} to ${dateText(last)}` : ''
  const left = dropped > 0 ? `; ${dropped} left out` : ''
  return `${countOf(used, 'date')}${span}${left}`
}

/** The limits that are not kept, or that all are. */
function limitsLine(limits: readonly LimitState[]): string {
  const count = (status: LimitState['status']): number =>
    limits.filter((limit) => limit.status === status).length
  const parts = [
    [count('breach'), 'breached'],
    [count('over soft'), 'over soft'],
    [count('not measured'), 'not measured'],
  ] as const
  const open = parts.flatMap(([many, words]) => (many > 0 ? [`${many} ${words}`] : []))
  return open.length === 0 ? `all ${limits.length} within` : open.join(', ')
}

/** How sure the volatility is, or why that is not known. */
function Band({ breakdown: { bands, decomposition } }: { breakdown: Breakdown }) {
  const classes = useStyles()
  return (
    <p className={classes.band}>
      {typeof bands === 'string'
        ? `No error band: ${bands.charAt(0).toLowerCase()}${bands.slice(1)}`
        : `95% band ${bandText(decomposition.volatility, bands.volatility, 2)}, standard error ${percentText(bands.volatility, 2)}.`}
      {typeof bands !== 'string' && bands.note !== null && ` ${bands.note}`}
    </p>
  )
}

/** The portfolio's own figures, with what they rest on. */
export function Figures({ breakdown, checks }: { breakdown: Breakdown; checks: BooksState['checks'] }) {
  const classes = useStyles()
  const { decomposition: d, expectedReturn, effectiveWithheld, currency } = breakdown
  const rows: readonly (readonly [label: string, value: string, remark?: string | null])[] = [
    ['Diversification benefit', percentText(d.diversificationBenefit, 2)],
    ['Diversification ratio', d.diversificationRatio === null ? NONE : numberText(d.diversificationRatio, 2)],
    [
      'Effective number of positions (by risk)',
      d.effectiveNumber === null || effectiveWithheld !== null ? NONE : numberText(d.effectiveNumber, 1),
      effectiveWithheld,
    ],
    ['Net weight', percentText(breakdown.net, 1)],
    ['Gross weight', percentText(breakdown.gross, 1)],
    ...(breakdown.limits.length > 0
      ? [['Limits (under Trades)', limitsLine(breakdown.limits)] as const]
      : []),
    ...(checks
      ? [['Data checks (under Data)', checks.length > 0 ? countsOf(checks) : 'nothing found'] as const]
      : []),
  ]
  return (
    <div className={classes.block}>
      <Headline
        leading
        figures={[
          [
            `Volatility ${breakdown.horizon}${currency ? ` in ${currency.base}` : ''}`,
            percentText(d.volatility, 2),
          ],
          ...(expectedReturn
            ? ([[expectedReturn.label, percentText(expectedReturn.value, 2)]] as const)
            : []),
        ]}
      />
      <Band breakdown={breakdown} />
      <dl className={classes.rows}>
        {rows.map(([label, value, remark]) => (
          <div key={label} className={classes.row}>
            <dt>
              {label}
              {remark && <div className={classes.label}>{remark}</div>}
            </dt>
            <dd className={classes.value}>{value}</dd>
          </div>
        ))}
      </dl>
      <Findings findings={breakdown.findings} label="About these figures" />
      <Disclosure summary={`Settings: ${datesLine(breakdown.dates)}`} open={false}>
        <dl className={classes.rows}>
          {breakdown.settings.map(([label, value]) => (
            <div key={label} className={mergeClasses(classes.row, classes.settingRow)}>
              <dt className={classes.settingLabel}>{label}</dt>
              <dd className={classes.setting}>
                <Sentence text={value} />
              </dd>
            </div>
          ))}
        </dl>
      </Disclosure>
    </div>
  )
}

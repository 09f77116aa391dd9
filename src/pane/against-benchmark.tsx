import { makeStyles, tokens } from '@fluentui/react-components'
import { numberText, percentText, type Active, type Breakdown } from '../sheet'
import { CONVENTIONS } from './benchmark'
import { Headline, Remark } from './headline'
import { digitsFor } from './measure'
import { NONE } from './positions'
import { FigureTable, Pairs, TieOut, WIDTHS } from './table'

const useStyles = makeStyles({
  text: { margin: 0, fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
  pairs: { fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
})

/** Tracking error and what each active weight has of it. */
export default function AgainstBenchmark({
  active,
  breakdown: { horizon },
}: {
  active: Active
  breakdown: Breakdown
}) {
  const classes = useStyles()
  const { risk, names, sharesWithheld } = active
  const { weights } = risk.decomposition
  const digits = digitsFor(names.length)
  const shares = sharesWithheld === null ? risk.share : null
  const share = (value: number | null | undefined): string =>
    shares && typeof value === 'number' ? percentText(value, digits) : NONE
  const number = (value: number | null): string => (value === null ? 'not defined' : numberText(value, 2))
  const relative = risk.convention === 'benchmark-relative returns'
  const order = [...names.keys()].sort((a, b) => risk.contribution[b]! - risk.contribution[a]! || a - b)
  return (
    <>
      <Headline
        figures={[
          [`Tracking error (ex ante) ${horizon}`, percentText(risk.trackingError, 2)],
          [`Benchmark volatility ${horizon}`, percentText(risk.benchmarkVolatility, 2)],
        ]}
      />
      <div className={classes.pairs}>
        <Pairs
          pairs={[
            ['Beta to benchmark', number(risk.beta)],
            ['Correlation with benchmark', number(risk.correlation)],
            ['Net active weight', percentText(risk.netWeight, 1)],
            ['Benchmark', active.label],
          ]}
        />
      </div>
      <p className={classes.text}>
        Split by {risk.convention}. {CONVENTIONS[risk.convention]} The convention is chosen under Data.
      </p>
      {sharesWithheld !== null && <Remark text={sharesWithheld} />}
      <FigureTable
        label="Parts of the tracking error"
        columns={[
          { head: 'Position', width: null },
          { head: 'Active weight', width: WIDTHS.weight },
          { head: 'Contribution to tracking error', width: WIDTHS.contribution },
          { head: 'Share of tracking error', width: WIDTHS.share },
        ]}
        rows={[
          ...order.map((i) => ({
            key: i,
            name: names[i] ?? '',
            cells: [
              percentText(weights[i]!, digits),
              percentText(risk.contribution[i]!, digits + 1),
              share(shares?.[i]),
            ],
          })),
          ...(relative
            ? [
                {
                  key: 'net',
                  name: 'Net active weight',
                  strong: true,
                  cells: [
                    percentText(risk.netWeight, digits),
                    percentText(risk.netContribution, digits + 1),
                    share(risk.netShare),
                  ],
                },
              ]
            : []),
        ]}
        totals={[
          [
            'Total',
            percentText(risk.netWeight, digits),
            percentText(risk.trackingError, digits + 1),
            share(1),
          ],
        ]}
      />
      <TieOut
        parts="Contributions"
        sum={risk.contribution.reduce((sum, part) => sum + part, risk.netContribution)}
        total="tracking error"
        whole={risk.trackingError}
      />
    </>
  )
}

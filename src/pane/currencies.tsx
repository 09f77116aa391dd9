import { makeStyles, tokens } from '@fluentui/react-components'
import { CURRENCY_READING, percentText, type Breakdown, type CurrencyRisk } from '../sheet'
import { Section } from './controls'
import { Headline, Remark } from './headline'
import { digitsFor } from './measure'
import { FigureTable, TieOut, WIDTHS } from './table'

const useStyles = makeStyles({
  text: { margin: 0, fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
})

const sum = (parts: Float64Array): number => parts.reduce((total, part) => total + part, 0)

/** The volatility in local and currency parts, by currency and by position. */
export default function Currencies({
  breakdown,
  currency,
}: {
  breakdown: Breakdown
  currency: CurrencyRisk
}) {
  const classes = useStyles()
  const { decomposition: d, names } = breakdown
  const { parts, labels, base } = currency
  if (typeof parts === 'string') return <Remark text={parts} />
  const digits = digitsFor(names.length) + 1
  const [local, foreign] = [sum(parts.local), sum(parts.currency)]
  const figures = (ofLocal: number, ofCurrency: number, contribution: number): readonly string[] =>
    [ofLocal, ofCurrency, contribution].map((part) => percentText(part, digits))
  const heads = [
    { head: 'Local part', width: 54 },
    { head: 'Currency part', width: 66 },
    { head: 'Contribution to risk', width: WIDTHS.contribution },
  ]
  const order = [...names.keys()].sort((a, b) => parts.currency[b]! - parts.currency[a]! || a - b)
  return (
    <>
      <Headline
        figures={[
          ['Local part', percentText(local, 2)],
          [`Currency part, against ${base}`, percentText(foreign, 2)],
        ]}
      />
      <p className={classes.text}>{CURRENCY_READING.join(' ')}</p>
      <Section title="By currency" level={3}>
        <FigureTable
          label="By currency"
          columns={[{ head: 'Currency', width: null }, { head: 'Weight', width: WIDTHS.weight }, ...heads]}
          rows={parts.byCurrency.map((of) => ({
            key: of.label,
            name: of.label,
            cells: [percentText(of.exposure, 1), ...figures(of.local, of.currency, of.contribution)],
          }))}
          totals={[['Total', percentText(breakdown.net, 1), ...figures(local, foreign, d.volatility)]]}
        />
      </Section>
      <Section title="By position" level={3}>
        <FigureTable
          label="Currency parts by position"
          columns={[{ head: 'Position', width: null }, ...heads]}
          rows={order.map((i) => ({
            key: i,
            name: `${names[i] ?? ''} (${labels[i] ?? ''})`,
            cells: figures(parts.local[i]!, parts.currency[i]!, d.contribution[i]!),
          }))}
          totals={[['Total', ...figures(local, foreign, d.volatility)]]}
        />
        <TieOut
          parts="Local and currency parts"
          sum={local + foreign}
          total="volatility"
          whole={d.volatility}
        />
      </Section>
    </>
  )
}

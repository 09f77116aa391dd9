import { Button, makeStyles, tokens } from '@fluentui/react-components'
import { percentText, type Breakdown } from '../sheet'
import { Section } from './controls'
import { Headline } from './headline'
import { digitsFor, sharesOf } from './measure'
import { NONE } from './positions'
import { useBooks } from './store'
import { FigureTable, TieOut, WIDTHS } from './table'

const useStyles = makeStyles({
  text: { margin: 0, fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
  action: { justifySelf: 'start' },
})

const sum = (parts: Float64Array): number => parts.reduce((total, part) => total + part, 0)

/** The volatility by factor, and what the factors leave by holding. */
export default function Factors({ breakdown }: { breakdown: Breakdown }) {
  const books = useBooks()
  const classes = useStyles()
  const { factors, decomposition: d, names } = breakdown
  if (!factors)
    return (
      <>
        <p className={classes.text}>
          Factor returns are read, but the figures come from another estimator. With the factor model the
          volatility is split by factor here.
        </p>
        <Button
          size="small"
          className={classes.action}
          onClick={() => void books.choose({ estimator: { kind: 'factors' } })}
        >
          Use the factor model
        </Button>
      </>
    )
  const { systematic, specific, explained } = factors
  const digits = digitsFor(names.length)
  const shared = sharesOf(breakdown) !== null
  const row = (part: number): readonly string[] => [
    percentText(part, digits + 1),
    shared ? percentText(part / d.volatility, digits) : NONE,
  ]
  const columns = (first: string) => [
    { head: first, width: null },
    { head: 'Contribution to risk', width: WIDTHS.contribution },
    { head: 'Share of risk', width: WIDTHS.share },
  ]
  const byPart = [...systematic.keys()].sort((a, b) => systematic[b]! - systematic[a]!)
  const byHolding = [...specific.keys()].sort((a, b) => specific[b]! - specific[a]!)
  const whole = sum(systematic) + sum(specific)
  return (
    <>
      <Headline
        figures={[
          ['Systematic contribution', percentText(sum(systematic), 2)],
          ['Specific contribution', percentText(sum(specific), 2)],
        ]}
      />
      <Section title="By factor" level={3}>
        <FigureTable
          label="By factor"
          columns={columns('Factor')}
          rows={[
            ...byPart.map((j) => ({ key: j, name: factors.names[j] ?? '', cells: row(systematic[j]!) })),
            { key: 'specific', name: 'Specific to holdings', cells: row(sum(specific)) },
          ]}
          totals={[['Total', ...row(d.volatility)]]}
        />
        <TieOut parts="Factors and specific parts" sum={whole} total="volatility" whole={d.volatility} />
      </Section>
      <Section title="Specific, by holding" level={3}>
        <FigureTable
          label="Specific, by holding"
          columns={[
            ...columns('Position').slice(0, 2),
            { head: 'Variance explained', width: WIDTHS.share + 4 },
          ]}
          rows={byHolding.map((i) => ({
            key: i,
            name: names[i] ?? '',
            cells: [
              percentText(specific[i]!, digits + 1),
              Number.isNaN(explained[i]!) ? NONE : percentText(explained[i]!, digits),
            ],
          }))}
          totals={[['Total', percentText(sum(specific), digits + 1), '']]}
        />
      </Section>
    </>
  )
}

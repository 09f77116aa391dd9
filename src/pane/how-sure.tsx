import { Button, makeStyles, tokens } from '@fluentui/react-components'
import { bandText, percentText, type BooksState, type Breakdown } from '../sheet'
import { Entry, Section, typedNumber } from './controls'
import { Remark } from './headline'
import { bandsOf, digitsFor, sharesOf } from './measure'
import { NONE } from './positions'
import { FaultLine } from './step'
import { useBooks, useKept } from './store'
import { FigureTable, WIDTHS } from './table'

const useStyles = makeStyles({
  text: { margin: 0, fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
  fields: {
    display: 'grid',
    gridTemplateColumns: 'repeat(3, minmax(0, 1fr))',
    columnGap: tokens.spacingHorizontalS,
    alignItems: 'start',
  },
  action: { justifySelf: 'start' },
})

interface Asked {
  readonly breakdown: Breakdown
  readonly state: BooksState
  readonly fault: string | undefined
  /** told when the study is asked for */
  readonly asked: () => void
}

/** A whole number within limits, or what is needed. */
const whole =
  (from: number, to: number) =>
  (text: string): { readonly value: number } | { readonly needed: string } => {
    const value = typedNumber(text.replaceAll(',', ''))
    return value !== null && Number.isInteger(value) && value >= from && value <= to
      ? { value }
      : { needed: `A whole number from ${from} to ${to} is needed.` }
  }

const MOST_SEED = 2 ** 32 - 1

/** The cross-check of the closed form: what it is run with, and what comes out beside it. */
function DrawnAnew({ breakdown, state, fault, asked }: Asked) {
  const books = useBooks()
  const classes = useStyles()
  const [replicates, setReplicates] = useKept('bootstrap replicates', 1000)
  const [seed, setSeed] = useKept('bootstrap seed', 1)
  const [blockLength, setBlockLength] = useKept('bootstrap block length', 1)
  const { working, studies } = state
  const { decomposition: d, names } = breakdown
  const bands = bandsOf(breakdown)
  const shares = sharesOf(breakdown)
  const study = studies.bootstrap
  const digits = digitsFor(names.length)
  const drawn = study && (shares ? study.result.share : study.result.contribution)
  const closed = shares ? bands?.share : bands?.contribution
  const more = shares ? digits : digits + 1
  return (
    <Section title="Bootstrap" level={3}>
      <p className={classes.text}>
        The dates are drawn again with replacement, many times; how the figures vary is their error, by no
        formula.
      </p>
      <div className={classes.fields}>
        <Entry
          label="Replications"
          shown={String(replicates)}
          read={whole(40, 100_000)}
          commit={setReplicates}
        />
        <Entry label="Seed" shown={String(seed)} read={whole(0, MOST_SEED)} commit={setSeed} />
        <Entry
          label="Block, dates"
          shown={String(blockLength)}
          read={whole(1, Math.max(1, breakdown.dates?.used ?? 1))}
          commit={setBlockLength}
        />
      </div>
      <FaultLine text={fault} />
      <Button
        size="small"
        className={classes.action}
        disabledFocusable={working !== null}
        onClick={() => {
          asked()
          void books.bootstrap({ replicates, seed, blockLength })
        }}
      >
        Run the bootstrap
      </Button>
      {studies.outdated.bootstrap && (
        <p className={classes.text}>The figures have changed since it was run. Run it again for these.</p>
      )}
      {study && (
        <>
          <p className={classes.text}>{study.agreement}</p>
          <p className={classes.text}>
            Volatility, 95% of the replications: {percentText(study.result.volatility.lower, 2)} to{' '}
            {percentText(study.result.volatility.upper, 2)}
            {bands && `; band in closed form ${bandText(d.volatility, bands.volatility, 2)}`}.
          </p>
          {drawn && (
            <FigureTable
              label={`Standard error of the ${shares ? 'share of risk' : 'contribution to risk'}`}
              columns={[
                { head: 'Position', width: null },
                { head: shares ? 'Share of risk' : 'Contribution to risk', width: WIDTHS.share },
                { head: 'Standard error, closed form', width: WIDTHS.share + 6 },
                { head: 'Standard error, bootstrap', width: WIDTHS.share + 6 },
              ]}
              rows={[...d.contribution.keys()]
                .sort((a, b) => d.contribution[b]! - d.contribution[a]!)
                .map((i) => ({
                  key: i,
                  name: names[i] ?? '',
                  cells: [
                    percentText((shares ?? d.contribution)[i]!, more),
                    closed ? percentText(closed[i]!, more + 1) : NONE,
                    percentText(drawn.deviation[i]!, more + 1),
                  ],
                }))}
            />
          )}
          <p className={classes.text}>{study.method}.</p>
          <Button
            size="small"
            className={classes.action}
            disabledFocusable={working !== null}
            onClick={() => {
              asked()
              void books.writeStudy('bootstrap')
            }}
          >
            Write bootstrap
          </Button>
        </>
      )}
    </Section>
  )
}

/** What the error bands rest on, and the check that shares no formula with them. */
export default function HowSure(props: Asked) {
  const classes = useStyles()
  const { bands } = props.breakdown
  // what has no closed form here has no histories to draw from either
  if (typeof bands === 'string') return <Remark text={bands} />
  return (
    <>
      <p className={classes.text}>
        Standard error of the volatility {percentText(bands.volatility, 2)}. All bands are in closed form,
        from what each date adds to the figure: no normal distribution is assumed, so fat tails widen them.
        {bands.note !== null && ` ${bands.note}`} The bands of positions are under their names, in Positions.
      </p>
      <DrawnAnew {...props} />
    </>
  )
}

import type { MouseEvent } from 'react'
import { Button, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import { countOf, percentText, type BooksState, type CheckLine, type CorrectedVolatility } from '../sheet'
import { Disclosure, Section } from './controls'
import { GravityIcon, GravityWord, PlaceLink, Sentence } from './place'
import { useStepStyles } from './step'
import { useBooks } from './store'

const useStyles = makeStyles({
  list: { listStyleType: 'none', margin: 0, padding: 0, display: 'grid', rowGap: tokens.spacingVerticalM },
  line: {
    display: 'grid',
    gridTemplateColumns: '16px minmax(0, 1fr)',
    columnGap: tokens.spacingHorizontalS,
  },
  inside: {
    display: 'grid',
    rowGap: tokens.spacingVerticalS,
    padding: `${tokens.spacingVerticalS} ${tokens.spacingHorizontalM}`,
    backgroundColor: tokens.colorNeutralBackground2,
    border: `1px solid ${tokens.colorTransparentStroke}`,
  },
  correction: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) auto',
    columnGap: tokens.spacingHorizontalS,
    alignItems: 'center',
    paddingTop: tokens.spacingVerticalS,
    borderTop: `1px solid ${tokens.colorNeutralStroke2}`,
  },
  change: { fontVariantNumeric: 'tabular-nums', fontWeight: tokens.fontWeightSemibold },
})

/** Addresses told before the rest is counted. */
const MOST_CELLS = 5

/** The volatility as it is and as it would be, with the button that makes it so where a choice does. */
function Correction({ correction, now }: { correction: CorrectedVolatility; now: number | null }) {
  const books = useBooks()
  const classes = useStyles()
  const { label, change, volatility } = correction
  const apply = ({ currentTarget }: MouseEvent<HTMLButtonElement>): void => {
    if (!change) return
    // the button goes when its choice holds: the focus stays with the line
    currentTarget.closest('details')?.querySelector('summary')?.focus()
    void books.choose(change)
  }
  return (
    <div className={classes.correction}>
      <div>
        {label}
        <br />
        {typeof volatility === 'string' ? (
          <Sentence text={volatility} />
        ) : (
          <span className={classes.change}>
            Volatility {now !== null && `${percentText(now, 2)} → `}
            {percentText(volatility, 2)}
          </span>
        )}
      </div>
      {change && (
        <Button size="small" aria-label={`Apply: ${label}`} onClick={apply}>
          Apply
        </Button>
      )}
    </div>
  )
}

function Line({ line, now }: { line: CheckLine; now: number | null }) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const { check, corrections } = line
  const { areas } = check
  return (
    <li className={mergeClasses(classes.line, classes.small)}>
      <GravityIcon weight={check.weight} />
      <div>
        <GravityWord weight={check.weight} /> <Sentence text={check.sentence} area={check.area} />
        <Disclosure summary="What it does, what can be done" open={false}>
          <div className={classes.inside}>
            <div>{check.effect}</div>
            <div>
              <Sentence text={check.remedy} />
            </div>
            {areas.length > 1 && (
              <div>
                Cells:{' '}
                {areas.slice(0, MOST_CELLS).map((area, k) => (
                  <span key={k}>
                    {k > 0 && ', '}
                    <PlaceLink area={area} />
                  </span>
                ))}
                {areas.length > MOST_CELLS && ` and ${areas.length - MOST_CELLS} more`}
              </div>
            )}
            {corrections.map((correction) => (
              <Correction key={correction.label} correction={correction} now={now} />
            ))}
          </div>
        </Disclosure>
      </div>
    </li>
  )
}

const NOUNS = { stops: 'stop', warns: 'warning', notes: 'note' } as const

/** How many there are of each gravity. */
export function countsOf(lines: readonly CheckLine[]): string {
  const counts = (['stops', 'warns', 'notes'] as const).flatMap((weight) => {
    const count = lines.filter(({ check }) => check.weight === weight).length
    return count > 0 ? countOf(count, NOUNS[weight]) : []
  })
  return counts.join(', ')
}

/** What may be wrong with the data, what it does to the figures, and what the volatility would be with it mended. */
export function Checks({ state }: { state: BooksState }) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const { holdings, returns, checks, breakdown } = state
  if (!holdings || !returns) return null
  const quiet = mergeClasses(classes.small, classes.quiet)
  return (
    <Section title="Data checks">
      {returns.content === 'covariance' ? (
        <p className={quiet}>A covariance matrix holds no dates and no series to look over.</p>
      ) : checks === null ? (
        <p className={quiet}>Not looked over yet.</p>
      ) : checks.length === 0 ? (
        <p className={quiet}>Nothing found. Nothing is ever changed in your data by itself.</p>
      ) : (
        <>
          <p className={quiet}>
            {countsOf(checks)}. Nothing is changed by itself; Report writes them as a list.
          </p>
          <ul className={classes.list} aria-label="Found in the data">
            {checks.map((line, k) => (
              <Line
                key={`${line.check.kind} ${k}`}
                line={line}
                now={breakdown && breakdown.decomposition.volatility}
              />
            ))}
          </ul>
        </>
      )}
    </Section>
  )
}

import { Button, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import type { BooksState, Breakdown, ProofState } from '../sheet'
import { Disclosure } from './controls'
import { PlaceLink } from './place'
import { FaultLine, useStepStyles } from './step'
import { useBooks } from './store'

const useStyles = makeStyles({
  list: {
    margin: 0,
    paddingLeft: tokens.spacingHorizontalL,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase300,
  },
})

/** What formulas of the workbook's own recompute, by what the figures rest on. */
function recomputed({ dates, byGroup, active, tails, sharesWithheld }: Breakdown): readonly string[] {
  return [
    ...(dates ? ['The portfolio’s return on every date used, from your returns and weights'] : []),
    `The covariance of every holding with the portfolio${dates ? '' : ', from your matrix'}`,
    `Stand-alone risk, marginal contribution, contribution${sharesWithheld === null ? ', share' : ''}, beta and correlation of every holding, and their sums`,
    ...(byGroup.length > 0 ? [`Groups by ${byGroup.map(({ header }) => header).join(', ')}`] : []),
    ...(active ? ['Tracking error, where the benchmark is a column of weights'] : []),
    ...(typeof tails === 'string' ? [] : ['Value at risk and expected shortfall by the chosen method']),
  ]
}

/** The state of a written proof, in a few words. */
export const proofHeadline = (proof: ProofState | null): string =>
  proof === null
    ? 'Not written'
    : proof.isCurrent === null
      ? 'Written earlier'
      : proof.isCurrent
        ? 'Our figures in it are those that stand now'
        : 'Our figures in it are older than those that stand now'

/** The button that writes the proof, or brings our figures in it up to now. */
export function ProofButton({
  state: { working, reporting },
  asked,
  leading = false,
}: {
  state: BooksState
  asked?: () => void
  leading?: boolean
}) {
  const books = useBooks()
  const classes = useStepStyles()
  return (
    <div className={classes.buttons}>
      <Button
        size="small"
        appearance={leading ? 'primary' : 'secondary'}
        disabledFocusable={working !== null}
        onClick={() => {
          asked?.()
          void books.writeProof()
        }}
      >
        {reporting.proof ? 'Refresh proof' : 'Write proof'}
      </Button>
    </div>
  )
}

/** Where the proof lies, and whether our figures in it are those that stand now. */
export function ProofPlace({ proof }: { proof: ProofState | null }) {
  const classes = useStepStyles()
  if (!proof) return <p className={classes.small}>Not written yet. It gets a sheet of its own.</p>
  return (
    <p className={classes.small}>
      Lies at <PlaceLink area={proof.area} />.{' '}
      {proof.isCurrent === null
        ? 'It was written before this pane was opened: whether our figures in it are still those of now shows once it is refreshed.'
        : proof.isCurrent
          ? 'Our figures in it are those that stand now.'
          : 'Our figures in it are older than those that stand now; its formulas follow your cells all the same.'}
    </p>
  )
}

/** A sheet of the workbook's own formulas that recompute the figures beside ours. */
export default function Proof({ state, breakdown }: { state: BooksState; breakdown: Breakdown }) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const { reporting, faults } = state
  return (
    <>
      <p className={classes.small}>
        Formulas of the workbook’s own recompute the figures from your cells, each beside ours with the
        difference and whether it lies within a stated tolerance. Whoever checks them needs nothing of
        Counterpoise.
      </p>
      <ProofPlace proof={reporting.proof} />
      <FaultLine text={faults.proof} />
      <ProofButton state={state} />
      <Disclosure summary="What it recomputes, and what not" open={false}>
        <ul className={classes.list}>
          {recomputed(breakdown).map((line) => (
            <li key={line}>{line}</li>
          ))}
        </ul>
        <p className={mergeClasses(classes.small, classes.quiet)}>
          Error bands, studies and data checks are not recomputed. What else stands as a constant, and why, is
          listed at the head of the sheet.
        </p>
      </Disclosure>
    </>
  )
}

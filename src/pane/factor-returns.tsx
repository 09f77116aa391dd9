import { Button, mergeClasses } from '@fluentui/react-components'
import { listOf, type BooksState } from '../sheet'
import { Disclosure, Section } from './controls'
import { Findings } from './place'
import { FaultLine, TakeButton, Taken, useStepStyles } from './step'
import { useBooks } from './store'

/** The step of the factor returns: optional, so folded away until there are some. */
export function FactorReturns({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStepStyles()
  const { returns, factors, faults, settings } = state
  if (!returns || returns.content === 'covariance') return null
  const taken = (
    <>
      <FaultLine text={faults.factors} />
      <Taken
        area={factors?.area ?? null}
        summary={factors && factors.summary}
        help="Select a block of factor returns for the same dates, with its names and dates. Then press Use selection: a factor model can be the estimator then."
      />
    </>
  )
  if (!factors)
    return (
      <Disclosure summary="Factor returns (optional)" open={faults.factors !== undefined}>
        <div className={classes.cell}>
          {taken}
          <div>
            <TakeButton field="factors" />
          </div>
        </div>
      </Disclosure>
    )
  return (
    <Section title="Factor returns" action={<TakeButton field="factors" />}>
      {taken}
      <Findings findings={factors.findings} label="Found in the factor returns" />
      {factors.names && (
        <p className={mergeClasses(classes.small, classes.quiet)}>{listOf(factors.names, 8)}</p>
      )}
      <div className={classes.buttons}>
        {settings.estimator.kind !== 'factors' && (
          <Button size="small" onClick={() => void books.choose({ estimator: { kind: 'factors' } })}>
            Use the factor model
          </Button>
        )}
        <Button size="small" onClick={() => void books.dropFactors()}>
          Do without them
        </Button>
      </div>
    </Section>
  )
}

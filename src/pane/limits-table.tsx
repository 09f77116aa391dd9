import { Button } from '@fluentui/react-components'
import type { BooksState } from '../sheet'
import { Disclosure, Section } from './controls'
import { Findings } from './place'
import { FaultLine, TakeButton, Taken, useStepStyles } from './step'
import { useBooks } from './store'

/** How limits come to a book, in one sentence. */
export const HOW_LIMITS_COME =
  'Limits are read from a table with the headings Scope, Name, Measure, Soft and Hard, or from a column of the holdings whose heading says what it limits, such as “Limit on share of risk”.'

/** The step of the table of limits: optional, so folded away until there is one. */
export function LimitsTable({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = useStepStyles()
  const { holdings, limits, faults } = state
  if (!holdings) return null
  const taken = (
    <>
      <FaultLine text={faults.limits} />
      <Taken
        area={limits?.area ?? null}
        summary={limits && limits.summary}
        help={`Select the table of limits, then press Use selection. ${HOW_LIMITS_COME}`}
      />
    </>
  )
  if (!limits)
    return (
      <Disclosure summary="Table of limits (optional)" open={faults.limits !== undefined}>
        <div className={classes.cell}>
          {taken}
          <div>
            <TakeButton field="limits" />
          </div>
        </div>
      </Disclosure>
    )
  return (
    <Section title="Limits" action={<TakeButton field="limits" />}>
      {taken}
      <Findings findings={limits.findings} label="Found in the table of limits" />
      <div className={classes.buttons}>
        <Button size="small" onClick={() => void books.dropLimits()}>
          Do without the table
        </Button>
      </div>
    </Section>
  )
}

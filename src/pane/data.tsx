import { Button, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import type { BooksState } from '../sheet'
import { Benchmark } from './benchmark'
import { Checks } from './checks'
import { AskedButton, Entry, Section } from './controls'
import { Currency } from './currency'
import { FactorReturns } from './factor-returns'
import { Holdings } from './holdings'
import { LimitsTable } from './limits-table'
import { Returns } from './returns'
import { useStepStyles } from './step'
import { useBooks, useBooksState } from './store'

const useStyles = makeStyles({
  view: { display: 'grid', rowGap: tokens.spacingVerticalXXL, minWidth: 0 },
  rule: {
    borderTop: `1px solid ${tokens.colorNeutralStroke2}`,
    paddingTop: tokens.spacingVerticalL,
  },
})

/** The book's own name, and the way to a second one. */
function Book({ state }: { state: BooksState }) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
  if (!state.holdings && !state.returns && state.books.length < 2) return null
  const title = state.books.find(({ id }) => id === state.current)?.title ?? ''
  return (
    <div className={classes.rule}>
      <Section title="This book" level={3}>
        <Entry
          label="Name"
          shown={title}
          read={(text) => (text === '' ? { needed: 'A name is needed.' } : { value: text })}
          commit={(name) => void books.rename(name)}
        />
        <div className={mergeClasses(classes.small, classes.buttons)}>
          <Button size="small" onClick={() => void books.addBook()}>
            Add another book
          </Button>
          <AskedButton
            question={`Forget the link to these cells? The cells themselves stay as they are.${state.reporting.kept.length > 0 ? ' Results kept of this book can be compared no more.' : ''}`}
            yes="Forget the link"
            act={() => void books.removeBook()}
          >
            Forget the link
          </AskedButton>
        </div>
      </Section>
    </div>
  )
}

/** What was read, what is wrong with it, and what the figures are to be made of. */
export function DataView() {
  const classes = useStyles()
  const state = useBooksState()
  return (
    <div className={classes.view}>
      <Holdings state={state} />
      <Returns state={state} />
      <Checks state={state} />
      <LimitsTable state={state} />
      <FactorReturns state={state} />
      <Benchmark state={state} />
      <Currency state={state} />
      <Book state={state} />
    </div>
  )
}

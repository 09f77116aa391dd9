import { lazy, Suspense } from 'react'
import { Button, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import type { BacktestChoice, BacktestStudy, BooksState } from '../sheet'
import { ConfidenceEntry, Choice, Entry, typedNumber } from './controls'
import { FaultLine, useStepStyles } from './step'
import { useBooks, useKept } from './store'
import { Facts } from './table'

const Forecasts = lazy(() => import('./forecasts'))

const useStyles = makeStyles({
  text: { margin: 0, fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
})

function Outcome({ study }: { study: BacktestStudy }) {
  const classes = useStyles()
  return (
    <>
      <Suspense fallback={<p className={classes.text}>Drawing…</p>}>
        <Forecasts study={study} />
      </Suspense>
      <Facts lines={study.lines} />
      <p className={classes.text}>{study.method}.</p>
    </>
  )
}

/** The past forecast date by date and compared with what happened. */
export default function BackTest({
  state,
  fault,
  asked,
}: {
  state: BooksState
  fault: string | undefined
  /** told when the study is asked for */
  asked: () => void
}) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
  const [choice, setChoice] = useKept<BacktestChoice>('back-test', {
    window: null,
    confidence: 0.95,
    method: 'normal',
  })
  const { working, studies } = state
  const run = (of: 'this book' | 'selection'): void => {
    asked()
    void books.backtest(choice, of)
  }
  return (
    <>
      <p className={classes.text}>
        Each date is forecast from the dates before it, at today’s weights, and compared with what happened.
      </p>
      <div className={classes.pairs}>
        <Entry<number | null>
          label="Window, dates"
          shown={choice.window === null ? '' : String(choice.window)}
          hint="Empty: all before"
          read={(text) => {
            if (text === '') return { value: null }
            const value = typedNumber(text)
            return value !== null && Number.isInteger(value) && value >= 2
              ? { value }
              : { needed: 'A whole number of 2 or more is needed.' }
          }}
          commit={(window) => setChoice({ ...choice, window })}
        />
        <ConfidenceEntry
          confidence={choice.confidence}
          commit={(confidence) => setChoice({ ...choice, confidence })}
        />
        <div className={classes.wide}>
          <Choice
            label="Value at risk forecast by"
            value={choice.method}
            choices={[
              ['normal', 'Forecast volatility, normal distribution'],
              ['historical', 'Past returns in the window'],
            ]}
            choose={(method) => setChoice({ ...choice, method })}
          />
        </div>
      </div>
      <FaultLine text={fault} />
      <div className={classes.buttons}>
        <Button size="small" disabledFocusable={working !== null} onClick={() => run('this book')}>
          Run the back-test
        </Button>
        <Button size="small" disabledFocusable={working !== null} onClick={() => run('selection')}>
          Test selected forecasts
        </Button>
      </div>
      <p className={mergeClasses(classes.small, classes.quiet)}>
        Forecasts made elsewhere: select dates, the portfolio’s returns, and beside them the value at risk or
        the volatility forecast for the same dates, with headings.
      </p>
      {studies.outdated.backtest && (
        <p className={classes.text}>The figures have changed since it was run. Run it again for these.</p>
      )}
      {studies.backtest && (
        <>
          <Outcome study={studies.backtest} />
          <div className={classes.buttons}>
            <Button
              size="small"
              disabledFocusable={working !== null}
              onClick={() => {
                asked()
                void books.writeStudy('back-test')
              }}
            >
              Write back-test
            </Button>
          </div>
        </>
      )}
    </>
  )
}

import { useLayoutEffect, useRef } from 'react'
import { Button, makeStyles, mergeClasses, ProgressBar, tokens } from '@fluentui/react-components'
import {
  CheckmarkCircle16Filled,
  Circle16Regular,
  Clock16Regular,
  ErrorCircle16Filled,
  type FluentIcon,
} from '@fluentui/react-icons'
import { dateText, type BooksState, type Status } from '../sheet'
import { Sentence } from './place'
import { useBooksState, useLasting } from './store'

const useStyles = makeStyles({
  strip: {
    backgroundColor: tokens.colorNeutralBackground2,
    borderBottom: `1px solid ${tokens.colorNeutralStroke2}`,
  },
  line: {
    display: 'flex',
    alignItems: 'center',
    columnGap: tokens.spacingHorizontalS,
    // Two lines of text always have their place, so a longer sentence or the progress moves nothing below.
    minHeight: '48px',
    padding: `${tokens.spacingVerticalXS} ${tokens.spacingHorizontalM}`,
  },
  text: {
    flexGrow: 1,
    minWidth: 0,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    overflowWrap: 'anywhere',
  },
  word: { fontWeight: tokens.fontWeightSemibold },
  detail: { color: tokens.colorNeutralForeground3 },
  icon: { flexShrink: 0 },
  good: { color: tokens.colorStatusSuccessForeground1 },
  old: { color: tokens.colorStatusWarningForeground3 },
  bad: { color: tokens.colorStatusDangerForeground1 },
  plain: { color: tokens.colorNeutralForeground3 },
  button: { flexShrink: 0 },
  idle: { visibility: 'hidden' },
  bar: { display: 'block' },
})

const LOOK: {
  readonly [kind in Status['kind']]: {
    readonly Icon: FluentIcon
    readonly tone: 'good' | 'old' | 'bad' | 'plain'
  }
} = {
  'nothing linked': { Icon: Circle16Regular, tone: 'plain' },
  ready: { Icon: Circle16Regular, tone: 'plain' },
  'up to date': { Icon: CheckmarkCircle16Filled, tone: 'good' },
  stale: { Icon: Clock16Regular, tone: 'old' },
  failed: { Icon: ErrorCircle16Filled, tone: 'bad' },
}

/** The last date that counts, as a second line while all is well. */
function lastDate({ breakdown }: BooksState): string | null {
  const last = breakdown?.dates?.last
  return typeof last === 'number' ? `Returns to ${dateText(last)}` : null
}

function StatusText({ state }: { state: BooksState }) {
  const classes = useStyles()
  const { status } = state
  const word = (text: string) => <span className={classes.word}>{text}</span>
  const then = (text: string | null) =>
    text && (
      <>
        <br />
        <span className={classes.detail}>{text}</span>
      </>
    )
  switch (status.kind) {
    case 'nothing linked':
      return (
        <>
          {word('Nothing linked yet')}
          {then('Start with the holdings, under Data.')}
        </>
      )
    case 'ready':
      return (
        <>
          {word('Ready')}
          {then('Read, and not computed yet.')}
        </>
      )
    case 'up to date':
      return (
        <>
          {word('Up to date')}
          {then(lastDate(state))}
        </>
      )
    case 'stale': {
      // The word leads, whether or not the sentence begins with it.
      const rest = status.sentence.replace(/^Stale\b/, '')
      return (
        <>
          {word('Stale')}
          <Sentence text={rest === status.sentence ? `: ${rest}` : rest} area={status.since} />
        </>
      )
    }
    case 'failed':
      return (
        <>
          {word('Failed')}: <Sentence text={status.sentence} area={status.area} />
        </>
      )
  }
}

/** The one line that is always there: what the figures are worth now, what is being done, and the two buttons that act on it. */
export function StatusLine({ compute, canCompute }: { compute: () => void; canCompute: boolean }) {
  const classes = useStyles()
  const state = useBooksState()
  const working = useLasting(state.working !== null, 300) ? state.working : null
  const { Icon, tone } = LOOK[state.status.kind]
  const line = useRef<HTMLDivElement>(null)
  const cancelFocused = useRef(false)

  // When the Cancel button goes while it has the focus, the focus goes to its neighbour instead of nowhere.
  useLayoutEffect(() => {
    if (!working && cancelFocused.current) {
      cancelFocused.current = false
      line.current?.querySelector('button')?.focus()
    }
  }, [working])

  return (
    <div className={classes.strip}>
      <div className={classes.line} ref={line}>
        {!working && <Icon className={mergeClasses(classes.icon, classes[tone])} aria-hidden />}
        <div className={classes.text} role="status">
          {working ? <span className={classes.word}>{working.what}</span> : <StatusText state={state} />}
        </div>
        {working && (
          <Button
            size="small"
            className={classes.button}
            onFocus={() => (cancelFocused.current = true)}
            onBlur={() => (cancelFocused.current = false)}
            onClick={() => working.cancel()}
          >
            Cancel
          </Button>
        )}
        <Button
          appearance="primary"
          size="small"
          className={classes.button}
          disabledFocusable={!canCompute || working !== null}
          onClick={compute}
          aria-keyshortcuts="Control+Enter Meta+Enter"
        >
          Compute
        </Button>
      </div>
      <ProgressBar
        className={mergeClasses(classes.bar, !working && classes.idle)}
        thickness="medium"
        shape="square"
        aria-label="Progress"
        {...(working?.share === null ? {} : { value: working?.share ?? 0 })}
      />
    </div>
  )
}

import { useState } from 'react'
import { Button, Field, Input, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import { countOf, dateText, percentText, type BooksState, type SnapshotHead } from '../sheet'
import { AskedButton } from './controls'
import { FaultLine, useStepStyles } from './step'
import { useBooks, useKept } from './store'

const useStyles = makeStyles({
  list: { listStyleType: 'none', margin: 0, padding: 0, display: 'grid' },
  result: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) auto',
    columnGap: tokens.spacingHorizontalM,
    rowGap: tokens.spacingVerticalXXS,
    alignItems: 'baseline',
    padding: `${tokens.spacingVerticalS} 0`,
    borderTop: `1px solid ${tokens.colorNeutralStroke2}`,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    overflowWrap: 'anywhere',
  },
  strong: { fontWeight: tokens.fontWeightSemibold, fontVariantNumeric: 'tabular-nums' },
  action: { justifySelf: 'end' },
  keep: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) auto',
    columnGap: tokens.spacingHorizontalS,
    alignItems: 'end',
  },
  input: { minWidth: 0, width: '100%' },
})

/** Results drawn at first, and at each press for more. */
const STEP = 8

/** The last result of a list that is told oldest first, in a few words. */
export function keptHeadline(kept: readonly SnapshotHead[]): string {
  const last = kept.at(-1)
  if (!last) return 'None yet'
  const day =
    last.dataDate === null ? `kept on ${dateText(last.keptOn)}` : `data to ${dateText(last.dataDate)}`
  return `${countOf(kept.length, 'result')}; the last ${percentText(last.volatility, 2)}, ${day}`
}

function Result({ head, busy, remove }: { head: SnapshotHead; busy: boolean; remove: () => void }) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const { dataDate, keptOn, volatility, note, positions, trackingError } = head
  return (
    <li className={classes.result}>
      <span className={classes.strong}>
        {dataDate === null ? 'Data without dates' : `Data to ${dateText(dataDate)}`}
      </span>
      <span className={mergeClasses(classes.strong, classes.action)}>{percentText(volatility, 2)}</span>
      <span className={classes.quiet}>
        {note !== '' && (
          <>
            {note}
            <br />
          </>
        )}
        Kept on {dateText(keptOn)}, {countOf(positions, 'position')}
        {trackingError !== null && `, tracking error ${percentText(trackingError, 2)}`}
      </span>
      <div className={classes.action}>
        <AskedButton
          question={`Remove the result of ${dateText(dataDate ?? keptOn)} from this workbook?`}
          yes="Remove it"
          act={() => {
            if (!busy) remove()
          }}
        >
          Remove
        </AskedButton>
      </div>
    </li>
  )
}

/** Results kept with their dates, and the one that stands now to be kept. */
export default function KeptResults({
  state,
  canKeep,
  fault,
  asked,
}: {
  state: BooksState
  /** whether there are figures */
  canKeep: boolean
  fault: string | undefined
  asked: () => void
}) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
  const [note, setNote] = useKept(`note to keep, ${state.current}`, '')
  const [limit, setLimit] = useState(STEP)
  const busy = state.working !== null
  const keep = async (): Promise<void> => {
    asked()
    await books.keepResult(note.trim())
    if (books.state().faults.history === undefined) setNote('')
  }
  const newestFirst = [...state.reporting.kept].reverse()
  return (
    <>
      <p className={classes.small}>
        A kept result is a dated block on a sheet of this workbook: weights, volatilities, settings,
        contributions. It can be compared with later ones.
      </p>
      {canKeep && (
        <div className={classes.keep}>
          <Field label="Note (may be left out)" size="small">
            <Input
              size="small"
              className={classes.input}
              autoComplete="off"
              maxLength={200}
              value={note}
              onChange={(_, { value }) => setNote(value)}
            />
          </Field>
          <Button size="small" disabledFocusable={busy} onClick={() => void keep()}>
            Keep this result
          </Button>
        </div>
      )}
      <FaultLine text={fault} />
      {newestFirst.length === 0 ? (
        <p className={mergeClasses(classes.small, classes.quiet)}>None is kept yet.</p>
      ) : (
        <ul className={classes.list} aria-label="Kept results, newest first">
          {newestFirst.slice(0, limit).map((head) => (
            <Result
              key={head.id}
              head={head}
              busy={busy}
              remove={() => {
                asked()
                void books.removeResult(head.id)
              }}
            />
          ))}
        </ul>
      )}
      {limit < newestFirst.length && (
        <div className={classes.buttons}>
          <Button size="small" onClick={() => setLimit(limit + STEP)}>
            {`Show ${Math.min(STEP, newestFirst.length - limit)} more of ${newestFirst.length}`}
          </Button>
        </div>
      )}
    </>
  )
}

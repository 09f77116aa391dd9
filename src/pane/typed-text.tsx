import { makeStyles, tokens } from '@fluentui/react-components'
import type { TextFault } from '../sheet'
import { Sentence } from './place'

const useStyles = makeStyles({
  text: {
    margin: 0,
    overflow: 'hidden',
    fontFamily: tokens.fontFamilyMonospace,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    color: tokens.colorNeutralForeground2,
  },
  place: { color: tokens.colorStatusDangerForeground1, fontWeight: tokens.fontWeightBold },
})

/** Characters that stand beside each other in the narrowest pane. */
const WIDEST = 36

/**
 * The stretch of a text around a place in it, and where the place is in the stretch; cut ends show as an ellipsis.
 *
 * @param place from 0; at the end of the text, its length
 */
export function around(
  text: string,
  place: number,
  width = WIDEST,
): { readonly stretch: string; readonly at: number } {
  const from = Math.max(0, Math.min(place - Math.floor(width / 2), text.length + 1 - width))
  const cut = text.slice(from, from + width)
  const stretch =
    (from > 0 ? `…${cut.slice(1)}` : cut).slice(0, from + width < text.length ? -1 : undefined) +
    (from + width < text.length ? '…' : '')
  return { stretch, at: place - from }
}

/** A typed text in letters of one width, with a caret below the place that a fault speaks of. */
export function TypedText({ text, place }: { text: string; place: number | null }) {
  const classes = useStyles()
  const { stretch, at } = around(text, place ?? 0)
  return (
    <pre className={classes.text} aria-hidden>
      {stretch}
      {place !== null && (
        <>
          {'\n'}
          <span className={classes.place}>{`${' '.repeat(at)}^`}</span>
        </>
      )}
    </pre>
  )
}

/** What is wrong with a typed text, and where in it. */
export function TextFaultMessage({ text, fault }: { text: string; fault: TextFault }) {
  return (
    <>
      <Sentence text={fault.sentence} />
      {fault.column !== null && <TypedText text={text} place={fault.column} />}
    </>
  )
}

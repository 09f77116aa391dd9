import { useState } from 'react'
import { Button, Checkbox, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import {
  countOf,
  numberText,
  percentText,
  type TradesState,
  type WriteLine,
  type WritePreview,
} from '../sheet'
import { Section } from './controls'
import { PlaceLink } from './place'
import { FaultLine, useStepStyles } from './step'
import { useBooks } from './store'
import { FigureTable } from './table'

const useStyles = makeStyles({
  summary: {
    cursor: 'pointer',
    padding: `${tokens.spacingVerticalXXS} 0`,
    borderRadius: tokens.borderRadiusSmall,
    ':focus-visible': { outline: `2px solid ${tokens.colorStrokeFocus2}`, outlineOffset: '1px' },
  },
  cell: { fontSize: tokens.fontSizeBase100, lineHeight: tokens.lineHeightBase100 },
  formula: { fontFamily: tokens.fontFamilyMonospace },
  tick: {
    alignItems: 'start',
    '& label': { fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
  },
})

/** A cell of the list: where it is, and the formula that would go. */
function Cell({ line: { area, formula } }: { line: WriteLine }) {
  const classes = useStyles()
  return (
    <div className={classes.cell}>
      <PlaceLink area={area} />
      {formula !== null && (
        <>
          , in place of <span className={classes.formula}>{formula}</span>
        </>
      )}
    </div>
  )
}

/** The cells that would change; drawn only while it is open, since it may be long and follows every key. */
function Cells({ preview: { lines, unit } }: { preview: WritePreview }) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const [open, setOpen] = useState(false)
  const figure = (value: number): string =>
    unit === 'weight'
      ? percentText(value, 2)
      : numberText(
          value,
          lines.every(({ from, to }) => Number.isInteger(from) && Number.isInteger(to)) ? 0 : 2,
        )
  return (
    <details className={classes.small} open={open} onToggle={(event) => setOpen(event.currentTarget.open)}>
      <summary className={classes.summary}>{countOf(lines.length, 'cell')} would change</summary>
      {open && (
        <FigureTable
          label="Cells that would change"
          columns={[
            { head: 'Holding', width: null },
            { head: 'In the sheet', width: unit === 'weight' ? 66 : 88 },
            { head: 'To be written', width: unit === 'weight' ? 66 : 88 },
          ]}
          rows={lines.map((line, k) => ({
            key: k,
            name: line.name,
            mark: <Cell line={line} />,
            cells: [figure(line.from), figure(line.to)],
          }))}
        />
      )}
    </details>
  )
}

/** What would be written to the sheet, and the commands that write it, drop it, or take it back. */
export function Apply({
  trades,
  busy,
  fault,
  asked,
}: {
  trades: TradesState
  /** whether another action is under way */
  busy: boolean
  /** why cells could not be written or put back */
  fault: string | undefined
  /** told when cells are to be written or put back */
  asked: () => void
}) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
  const { preview, pending, applied, lines, comparison } = trades
  // what keeps the trades from being compared is told where it stands
  const refusals = preview.refusals.filter((refusal) => refusal !== comparison)
  const formulas = preview.lines.filter(({ formula }) => formula !== null).length
  const [replace, setReplace] = useState(false)
  const ready = preview.lines.length > 0 && preview.refusals.length === 0 && (formulas === 0 || replace)
  const edited = lines.some(({ sheet, before }) => sheet !== before)
  const write = (): void => {
    asked()
    setReplace(false)
    void books.applyTrades({ replaceFormulas: replace })
  }
  const takeBack = (): void => {
    asked()
    void books.undoTrades()
  }
  return (
    <Section title="Write to the sheet">
      {preview.lines.length > 0 && <Cells preview={preview} />}
      {preview.lines.length === 0 && preview.refusals.length === 0 && (
        <p className={mergeClasses(classes.small, classes.quiet)}>
          Nothing to write: the sheet holds these weights.
        </p>
      )}
      {refusals.map((refusal) => (
        <FaultLine key={refusal} text={refusal} />
      ))}
      {formulas > 0 && (
        <Checkbox
          className={classes.tick}
          checked={replace}
          onChange={(_, { checked }) => setReplace(checked === true)}
          label={`Numbers may take the place of ${countOf(formulas, 'formula')}`}
        />
      )}
      <FaultLine text={fault} />
      <div className={classes.buttons}>
        <Button appearance="primary" size="small" disabledFocusable={!ready || busy} onClick={write}>
          Apply
        </Button>
        <Button size="small" disabledFocusable={!pending} onClick={() => books.discardTrades()}>
          Discard
        </Button>
        <Button size="small" disabledFocusable={applied === null || busy} onClick={takeBack}>
          Undo
        </Button>
        <Button size="small" disabledFocusable={!edited} onClick={() => books.compareFromHere()}>
          Compare from here
        </Button>
      </div>
      {applied !== null && <p className={classes.small}>{applied}</p>}
      {edited && (
        <p className={mergeClasses(classes.small, classes.quiet)}>
          The sheet has other weights than those compared from. Compare from here takes them as the new
          starting point.
        </p>
      )}
    </Section>
  )
}

import { breakdownTable, type BooksState, type Breakdown } from '../sheet'
import { Section } from './controls'
import { CopyTable, SavePicture } from './handing-over'
import { measureOf } from './measure'
import { riskPicture } from './picture-file'
import { useStepStyles } from './step'

/** The breakdown for other programs: its table on the clipboard, its picture as a file. */
export default function CopyAndExport({
  state: { title, decimal },
  breakdown,
}: {
  state: BooksState
  breakdown: Breakdown
}) {
  const classes = useStepStyles()
  const picture = `Weight and ${measureOf(breakdown).label.toLowerCase()}`
  return (
    <>
      <Section title="Table to the clipboard" level={3}>
        <CopyTable what="table" decimal={decimal} table={() => breakdownTable(title, breakdown)} />
      </Section>
      <Section title={`Picture: ${picture.toLowerCase()}`} level={3}>
        <p className={classes.small}>
          On white, with the book’s title and the dates of the data, so that it stands on its own.
        </p>
        <SavePicture
          what={`Picture of ${picture.toLowerCase()}`}
          picture={() => riskPicture(title, breakdown)}
        />
      </Section>
    </>
  )
}

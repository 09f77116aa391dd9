import type { ReactNode } from 'react'
import { Button, Field, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import { sameArea, type Area, type Finding } from '../sheet'
import { Section } from './controls'
import { PlaceLink, Sentence } from './place'
import { useBooks, useBooksState } from './store'

/** What the steps of the Data view have in common. */
export const useStepStyles = makeStyles({
  quiet: { color: tokens.colorNeutralForeground3 },
  small: {
    margin: 0,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    overflowWrap: 'anywhere',
  },
  read: {
    paddingLeft: tokens.spacingHorizontalM,
    borderLeft: `3px solid ${tokens.colorBrandStroke1}`,
  },
  pairs: {
    display: 'grid',
    gridTemplateColumns: 'minmax(0, 1fr) minmax(0, 1fr)',
    columnGap: tokens.spacingHorizontalM,
    rowGap: tokens.spacingVerticalS,
    alignItems: 'start',
  },
  wide: { gridColumn: '1 / -1' },
  // a choice with what depends on it below
  cell: { display: 'grid', rowGap: tokens.spacingVerticalS, minWidth: 0 },
  buttons: { display: 'flex', flexWrap: 'wrap', gap: tokens.spacingHorizontalS },
})

/** The button that takes the selected cells for a step. */
export function TakeButton({
  field,
  next = false,
}: {
  field: 'holdings' | 'returns' | 'factors' | 'limits'
  /** whether this is what is to be done next */
  next?: boolean
}) {
  const books = useBooks()
  return (
    <Button
      size="small"
      appearance={next ? 'primary' : 'secondary'}
      onClick={() => void books.takeSelection(field)}
      aria-label={`Use selection for ${field === 'factors' ? 'factor returns' : field}`}
    >
      Use selection
    </Button>
  )
}

/** What a step's selection led to: the address read and its one line, or what is to be selected. */
export function Taken({ area, summary, help }: { area: Area | null; summary: string | null; help: string }) {
  const classes = useStepStyles()
  return area ? (
    <p className={mergeClasses(classes.small, classes.read)}>
      <PlaceLink area={area} />
      <br />
      {summary}
    </p>
  ) : (
    <p className={mergeClasses(classes.small, classes.quiet)}>{help}</p>
  )
}

/** The sentence of a fault where no field of its own carries it. */
export const FaultLine = ({ text }: { text: string | undefined }) =>
  text ? <Field validationMessage={<Sentence text={text} />} /> : null

/** A step of the Data view: its button, and what it led to or the sentence of its fault. */
export function Step({
  title,
  field,
  help,
  area,
  summary,
  fault,
  next,
  children,
}: {
  title: string
  field: 'holdings' | 'returns'
  help: string
  area: Area | null
  summary: string | null
  fault: string | undefined
  next: boolean
  children: ReactNode
}) {
  return (
    <Section title={title} action={<TakeButton field={field} next={next} />}>
      <FaultLine text={fault} />
      <Taken area={area} summary={summary} help={help} />
      {children}
    </Section>
  )
}

/** Where a finding that stops points at a holding without a series, the holding may be cash: the user may say so there. */
export function RisklessChoice({ finding }: { finding: Finding }) {
  const books = useBooks()
  const { holdings, returns } = useBooksState()
  if (finding.weight !== 'stops' || !returns?.names) return null
  const holding = holdings?.holdings.find(({ cell }) => sameArea(cell, finding.area))
  const plain = (name: string): string => name.trim().toLowerCase()
  if (!holding || returns.names.some((name) => plain(name) === plain(holding.name))) return null
  return (
    <Button
      size="small"
      aria-label={`Mark as riskless: ${holding.name}`}
      onClick={() => void books.markRiskless(holding.name, true)}
    >
      Mark as riskless
    </Button>
  )
}

import { Suspense, useId, useState, type ReactNode } from 'react'
import { Button, Field, Input, makeStyles, mergeClasses, Select, tokens } from '@fluentui/react-components'
import { ChevronDown16Regular, ChevronRight16Regular } from '@fluentui/react-icons'
import { confidenceText } from '../sheet'
import { Sentence } from './place'
import { useKept } from './store'

const useStyles = makeStyles({
  section: { display: 'grid', rowGap: tokens.spacingVerticalS, minWidth: 0 },
  head: {
    display: 'flex',
    alignItems: 'center',
    justifyContent: 'space-between',
    columnGap: tokens.spacingHorizontalS,
    minHeight: '28px',
  },
  title: {
    margin: 0,
    fontSize: tokens.fontSizeBase400,
    lineHeight: tokens.lineHeightBase400,
    fontWeight: tokens.fontWeightSemibold,
  },
  small: { fontSize: tokens.fontSizeBase300, lineHeight: tokens.lineHeightBase300 },
  disclosure: { fontSize: tokens.fontSizeBase200, lineHeight: tokens.lineHeightBase200 },
  summary: {
    cursor: 'pointer',
    paddingTop: tokens.spacingVerticalXXS,
    paddingBottom: tokens.spacingVerticalXXS,
    color: tokens.colorNeutralForeground2,
    borderRadius: tokens.borderRadiusSmall,
    ':focus-visible': { outline: `2px solid ${tokens.colorStrokeFocus2}`, outlineOffset: '1px' },
  },
  inside: { paddingTop: tokens.spacingVerticalS },
  folded: { borderTop: `1px solid ${tokens.colorNeutralStroke2}`, minWidth: 0 },
  foldedHead: { margin: 0, font: 'inherit' },
  fold: {
    display: 'grid',
    gridTemplateColumns: '16px minmax(0, 1fr)',
    columnGap: tokens.spacingHorizontalXS,
    width: '100%',
    padding: `${tokens.spacingVerticalS} 0`,
    border: 'none',
    background: 'none',
    font: 'inherit',
    color: 'inherit',
    textAlign: 'left',
    cursor: 'pointer',
    ':hover': { backgroundColor: tokens.colorNeutralBackground3 },
    ':focus-visible': { outline: `2px solid ${tokens.colorStrokeFocus2}`, outlineOffset: '-2px' },
  },
  foldIcon: { marginTop: '3px' },
  headline: {
    gridColumn: 2,
    fontSize: tokens.fontSizeBase200,
    lineHeight: tokens.lineHeightBase200,
    fontVariantNumeric: 'tabular-nums',
    color: tokens.colorNeutralForeground2,
    overflowWrap: 'anywhere',
  },
  foldedInside: {
    display: 'grid',
    rowGap: tokens.spacingVerticalL,
    minWidth: 0,
    padding: `${tokens.spacingVerticalS} 0 ${tokens.spacingVerticalXXL}`,
  },
  waiting: { color: tokens.colorNeutralForeground3 },
  control: { minWidth: 0, width: '100%' },
})

/** A part of a view under its own heading, with at most one action at the heading's right. */
export function Section({
  title,
  level = 2,
  action,
  children,
}: {
  title: string
  level?: 2 | 3
  action?: ReactNode
  children: ReactNode
}) {
  const classes = useStyles()
  const Heading = level === 2 ? 'h2' : 'h3'
  return (
    <section className={classes.section} aria-label={title}>
      <div className={classes.head}>
        <Heading className={mergeClasses(classes.title, level === 3 && classes.small)}>{title}</Heading>
        {action}
      </div>
      {children}
    </section>
  )
}

/** Details one may open; `open` is only where it starts. */
export function Disclosure({
  summary,
  open,
  children,
}: {
  summary: ReactNode
  open: boolean
  children: ReactNode
}) {
  const classes = useStyles()
  const [opened, setOpened] = useState(open)
  return (
    <details
      className={classes.disclosure}
      open={opened}
      onToggle={(event) => setOpened(event.currentTarget.open)}
    >
      <summary className={classes.summary}>{summary}</summary>
      <div className={classes.inside}>{children}</div>
    </details>
  )
}

/**
 * A section that is folded away to its title and its headline figure, and stays as the user left it while the pane is open. What is
 * inside may come in a chunk of its own: it is asked for when the section is opened.
 */
export function Folded({
  title,
  headline,
  children,
}: {
  title: string
  headline: string
  children: ReactNode
}) {
  const classes = useStyles()
  const [open, setOpen] = useKept(`open: ${title}`, false)
  const id = useId()
  const Chevron = open ? ChevronDown16Regular : ChevronRight16Regular
  return (
    <section className={classes.folded} aria-labelledby={`${id}title`}>
      <h2 className={classes.foldedHead}>
        <button
          type="button"
          className={classes.fold}
          aria-expanded={open}
          aria-controls={open ? `${id}inside` : undefined}
          onClick={() => setOpen(!open)}
        >
          <Chevron className={classes.foldIcon} aria-hidden />
          <span id={`${id}title`} className={classes.title}>
            {title}
          </span>
          <span className={classes.headline}>{headline}</span>
        </button>
      </h2>
      {open && (
        <div id={`${id}inside`} className={classes.foldedInside}>
          <Suspense fallback={<span className={classes.waiting}>Drawing…</span>}>{children}</Suspense>
        </div>
      )}
    </section>
  )
}

/** A choice of one among a few, with the sentence of a fault below it. */
export function Choice<T extends string>({
  label,
  value,
  choices,
  more = [],
  hint,
  fault,
  choose,
}: {
  label: string
  value: T
  choices: readonly (readonly [T, string])[]
  /** further ones, under headings */
  more?: readonly { readonly heading: string; readonly choices: readonly (readonly [T, string])[] }[]
  hint?: string | undefined
  fault?: string | undefined
  choose: (value: T) => void
}) {
  const classes = useStyles()
  const all = [...choices, ...more.flatMap((group) => group.choices)]
  const options = (of: typeof choices) =>
    of.map(([choice, text]) => (
      <option key={choice} value={choice}>
        {text}
      </option>
    ))
  return (
    <Field
      label={label}
      size="small"
      hint={hint ?? null}
      validationMessage={fault === undefined ? null : <Sentence text={fault} />}
    >
      <Select
        size="small"
        className={classes.control}
        value={value}
        onChange={(_, data) => {
          const chosen = all.find(([choice]) => choice === data.value)
          if (chosen) choose(chosen[0])
        }}
      >
        {options(choices)}
        {more.map((group) => (
          <optgroup key={group.heading} label={group.heading}>
            {options(group.choices)}
          </optgroup>
        ))}
      </Select>
    </Field>
  )
}

/**
 * A line of text that is handed over when the field is left or Enter pressed, not at every key: each change may cost a reading of the
 * sheet. `read` turns the text into a value or answers with what is needed; Escape takes back what was typed.
 */
export function Entry<T>({
  label,
  shown,
  hint,
  fault,
  type = 'text',
  read,
  commit,
}: {
  label: string
  /** the value that holds, as text */
  shown: string
  hint?: string | undefined
  fault?: string | undefined
  type?: 'text' | 'date'
  read: (text: string) => { readonly value: T } | { readonly needed: string }
  commit: (value: T) => void
}) {
  const classes = useStyles()
  const [draft, setDraft] = useState<string | null>(null)
  const [needed, setNeeded] = useState<string | null>(null)
  const finish = (): void => {
    if (draft === null) return
    const outcome = read(draft.trim())
    if ('needed' in outcome) return setNeeded(outcome.needed)
    setDraft(null)
    setNeeded(null)
    if (draft.trim() !== shown) commit(outcome.value)
  }
  const message = needed ?? fault
  return (
    <Field
      label={label}
      size="small"
      hint={hint ?? null}
      validationMessage={message === undefined ? null : <Sentence text={message} />}
    >
      <Input
        size="small"
        className={classes.control}
        type={type}
        inputMode={type === 'text' ? 'decimal' : undefined}
        autoComplete="off"
        value={draft ?? shown}
        onChange={(_, data) => setDraft(data.value)}
        onBlur={finish}
        onKeyDown={(event) => {
          if (event.key === 'Enter') finish()
          if (event.key === 'Escape') {
            setDraft(null)
            setNeeded(null)
          }
        }}
      />
    </Field>
  )
}

/** A confidence level as a percentage above 50 and below 100, handed over as a fraction. */
export function ConfidenceEntry({
  confidence,
  commit,
}: {
  confidence: number
  commit: (confidence: number) => void
}) {
  return (
    <Entry
      label="Confidence level, %"
      shown={confidenceText(confidence).replace('%', '')}
      read={(text) => {
        const value = typedNumber(text.replace(/%$/, ''))
        return value !== null && value > 50 && value < 100
          ? { value: Number((value / 100).toFixed(8)) }
          : { needed: 'A number between 50 and 100 is needed.' }
      }}
      commit={commit}
    />
  )
}

/** A fraction as a percentage is typed, without its sign: at most six decimals. */
export const typedPercentText = (fraction: number): string => String(Number((fraction * 100).toFixed(6)))

/** A percentage, with its sign or without, as a fraction; null when it is none. */
export function typedPercent(text: string): number | null {
  const value = typedNumber(text.replaceAll('\u2212', '-').replace(/\s*%$/, ''))
  return value === null ? null : Number((value / 100).toFixed(12))
}

/** A percentage within bounds, handed over as a fraction. */
export function PercentEntry({
  label,
  value,
  from = -Infinity,
  to = Infinity,
  hint,
  fault,
  commit,
}: {
  label: string
  value: number
  /** the least and the most it may be, fractions */
  from?: number
  to?: number
  hint?: string | undefined
  fault?: string | undefined
  commit: (value: number) => void
}) {
  const bounds =
    from > -Infinity && to < Infinity
      ? ` from ${typedPercentText(from)}% to ${typedPercentText(to)}%`
      : from > -Infinity
        ? ` of ${typedPercentText(from)}% or more`
        : to < Infinity
          ? ` of ${typedPercentText(to)}% or less`
          : ''
  return (
    <Entry
      label={label}
      shown={typedPercentText(value)}
      hint={hint}
      fault={fault}
      read={(text) => {
        const typed = typedPercent(text)
        return typed !== null && typed >= from && typed <= to
          ? { value: typed }
          : { needed: `A percentage${bounds} is needed.` }
      }}
      commit={commit}
    />
  )
}

/** A number typed with a point or a comma before its decimals; null when it is none. */
export function typedNumber(text: string): number | null {
  const plain = text.replace(/\s/g, '').replace(/^(-?\d*),(\d+)$/, '$1.$2')
  const value = plain === '' ? NaN : Number(plain)
  return Number.isFinite(value) ? value : null
}

/** A button that asks once more in its own place before it acts: hosts block the browser's questions. */
export function AskedButton({
  children,
  question,
  yes,
  act,
}: {
  children: string
  question: string
  yes: string
  act: () => void
}) {
  const [asking, setAsking] = useState(false)
  // The button that comes back takes the focus its answer had; at first nothing takes any.
  const [asked, setAsked] = useState(false)
  return asking ? (
    <div role="group" aria-label={question}>
      <div>{question}</div>
      <Button
        autoFocus
        size="small"
        onClick={() => {
          setAsking(false)
          act()
        }}
      >
        {yes}
      </Button>{' '}
      <Button size="small" onClick={() => setAsking(false)}>
        Keep it
      </Button>
    </div>
  ) : (
    <Button
      autoFocus={asked}
      size="small"
      onClick={() => {
        setAsked(true)
        setAsking(true)
      }}
    >
      {children}
    </Button>
  )
}

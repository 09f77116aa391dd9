import { memo, useId, useRef, useState, type FocusEvent, type KeyboardEvent } from 'react'
import { Button, Field, Input, makeStyles, mergeClasses, Select, tokens } from '@fluentui/react-components'
import { Dismiss12Regular } from '@fluentui/react-icons'
import {
  countOf,
  percentText,
  RULE_FUNCTIONS,
  RULE_NAMES,
  type Entry,
  type Financing,
  type TextFault,
  type TradeLine,
  type TradesState,
} from '../sheet'
import { Choice, Disclosure, Section } from './controls'
import { digitsFor } from './measure'
import { NONE } from './positions'
import { FaultLine, useStepStyles } from './step'
import { useBooks, useKept, useLasting } from './store'
import { useTableStyles } from './table'
import { TextFaultMessage, TypedText } from './typed-text'

const useStyles = makeStyles({
  entry: {
    boxSizing: 'border-box',
    width: '100%',
    minWidth: 0,
    padding: '1px 1px 1px 2px',
    border: 'none',
    borderBottom: `1px solid ${tokens.colorNeutralStrokeAccessible}`,
    borderRadius: `${tokens.borderRadiusSmall} ${tokens.borderRadiusSmall} 0 0`,
    backgroundColor: tokens.colorNeutralBackground1,
    color: tokens.colorNeutralForeground1,
    font: 'inherit',
    fontVariantNumeric: 'tabular-nums',
    textAlign: 'right',
    // a line reached by the keyboard is not hidden below what stays in sight above
    scrollMarginTop: '100px',
    scrollMarginBottom: '40px',
    '::placeholder': { color: tokens.colorNeutralForeground3, opacity: 1 },
    ':hover': { backgroundColor: tokens.colorNeutralBackground3 },
    ':focus': { outline: `2px solid ${tokens.colorStrokeFocus2}`, outlineOffset: '-1px' },
  },
  typed: { fontWeight: tokens.fontWeightSemibold, borderBottomColor: tokens.colorCompoundBrandStroke },
  moved: {
    '::placeholder': { color: tokens.colorNeutralForeground1, fontWeight: tokens.fontWeightSemibold },
  },
  wrong: { borderBottomColor: tokens.colorPaletteRedBorder2 },
  // the text of a field stands on the line of the figure beside it
  entryCell: { paddingTop: '3px', paddingBottom: '1px' },
  open: { borderBottom: 'none' },
  below: { padding: `0 0 ${tokens.spacingVerticalXS}` },
  mark: {
    display: 'flex',
    alignItems: 'center',
    columnGap: tokens.spacingHorizontalXS,
    fontSize: tokens.fontSizeBase100,
    lineHeight: tokens.lineHeightBase100,
    color: tokens.colorNeutralForeground2,
  },
  remove: { minWidth: 'auto', width: '20px', height: '20px' },
  finding: { display: 'flex', flexWrap: 'wrap', gap: tokens.spacingHorizontalS, alignItems: 'center' },
  find: { flexGrow: 1, minWidth: 0 },
  adding: { display: 'flex', columnGap: tokens.spacingHorizontalS, alignItems: 'end' },
  grow: { flexGrow: 1, minWidth: 0 },
  control: { minWidth: 0, width: '100%' },
  names: { margin: 0, display: 'grid', rowGap: tokens.spacingVerticalXXS },
  ruleName: {
    display: 'grid',
    gridTemplateColumns: '96px minmax(0, 1fr)',
    columnGap: tokens.spacingHorizontalS,
  },
  proposal: { fontWeight: tokens.fontWeightSemibold },
  apart: { marginTop: tokens.spacingVerticalS },
  code: { fontFamily: tokens.fontFamilyMonospace },
  meaning: { margin: 0 },
  more: { justifySelf: 'start' },
})

/** A list up to this long is shown whole; of a longer one, what moves and what is looked for. */
const LONG = 40
/** Rows drawn at first, and at each press for more: where the whole book pays, all of them change at every key. */
const STEP = 50
/** A fault that a further key takes away is not worth a sentence. */
const TYPING_MS = 400
/** Characters of a typed text that its cell shows. */
const SHOWN = 9

const ENTRIES: readonly (readonly [Entry, string])[] = [
  ['change', 'Change of weight'],
  ['new weight', 'New weight'],
]

/** A minus copied from a figure is one. */
const asTyped = (text: string): string => text.replaceAll('\u2212', '-')

const signed = (change: number, digits: number): string => {
  const text = percentText(change, digits)
  return change > 0 && /[1-9]/.test(text) ? `+${text}` : text
}

const ORIGINS: { readonly [O in TradeLine['origin']]: string | null } = {
  none: null,
  sheet: null,
  typed: null,
  rule: 'by the rule',
  proposal: 'proposed',
  financing: 'pays for the trades',
}

/** What moved a line, in the words below its name. */
function marksOf(
  { before, sheet, origin, candidate, typed, fault }: TradeLine,
  payer: Financing['kind'],
  digits: number,
): readonly string[] {
  const by = origin === 'financing' && payer === 'pro rata' ? payer : ORIGINS[origin]
  return [
    ...(candidate ? ['not held'] : []),
    ...(sheet !== before ? [`edited in the sheet: ${percentText(sheet, digits)}`] : []),
    ...(fault !== null && typed === null ? ['no weight by the rule'] : by === null ? [] : [by]),
  ]
}

const sameLine = (a: TradeLine, b: TradeLine): boolean =>
  a.key === b.key &&
  a.before === b.before &&
  a.sheet === b.sheet &&
  a.after === b.after &&
  a.origin === b.origin &&
  a.candidate === b.candidate &&
  a.typed?.entry === b.typed?.entry &&
  a.typed?.text === b.typed?.text &&
  a.fault?.sentence === b.fault?.sentence &&
  a.fault?.column === b.fault?.column

/** One position: its weight before, and the two fields that say the same thing in two ways, what it changes by and what it becomes. */
const Line = memo(
  function Line({
    line,
    stop,
    payer,
    digits,
  }: {
    line: TradeLine
    stop: boolean
    payer: Financing['kind']
    /** decimals of a weight */
    digits: number
  }) {
    const books = useBooks()
    const classes = { ...useTableStyles(), ...useStyles() }
    const id = useId()
    const { key, before, after, typed, candidate } = line
    // while a line is typed into, its text is the field's own: the figures may come a moment later
    const [draft, setDraft] = useState<TradeLine['typed']>(null)
    const atFocus = useRef<TradeLine['typed']>(null)
    const entered = draft ?? typed
    // where nothing is typed for the line, the fault is the rule's, and stands with it
    const own = entered === null ? null : line.fault
    const lasting = useLasting(own !== null, TYPING_MS)
    const fault = lasting || draft === null ? own : null
    const moved = after !== before
    const below = fault !== null || (entered !== null && entered.text.length > SHOWN)
    const type = (entry: Entry, text: string): void => {
      setDraft({ entry, text })
      books.trade({ line: { key, entry, text: asTyped(text) } })
    }
    const figures: { readonly [E in Entry]: string } = {
      change: moved ? signed(after - before, digits) : NONE,
      'new weight': percentText(after, digits),
    }
    const cell = mergeClasses(classes.cell, below && classes.open)
    return (
      <>
        <tr data-key={key}>
          <th scope="row" className={mergeClasses(cell, classes.name)}>
            {key}
            {marksOf(line, payer, digits).map((mark) => (
              <div key={mark} className={classes.mark}>
                {mark}
                {candidate && mark === 'not held' && (
                  <Button
                    size="small"
                    appearance="subtle"
                    className={classes.remove}
                    icon={<Dismiss12Regular />}
                    aria-label={`Take ${key} off the list`}
                    onClick={({ currentTarget }) => {
                      // the line goes, the focus stays with the list
                      const own = currentTarget.closest('tr')
                      const others = [...(own?.parentElement?.querySelectorAll('input') ?? [])]
                      others.find((input) => !own?.contains(input))?.focus()
                      void books.dropCandidate(line.name)
                    }}
                  />
                )}
              </div>
            ))}
          </th>
          <td className={cell}>{percentText(before, digits)}</td>
          {ENTRIES.map(([entry, label]) => {
            const isOwn = entered?.entry === entry
            return (
              <td key={entry} className={mergeClasses(cell, classes.entryCell)}>
                <input
                  data-entry={entry}
                  className={mergeClasses(
                    classes.entry,
                    isOwn && classes.typed,
                    moved && classes.moved,
                    isOwn && fault !== null && classes.wrong,
                  )}
                  tabIndex={stop ? 0 : -1}
                  autoComplete="off"
                  spellCheck={false}
                  aria-label={`${label}: ${key}`}
                  aria-invalid={isOwn && fault !== null}
                  aria-describedby={isOwn && fault !== null ? id : undefined}
                  value={isOwn ? entered.text : ''}
                  placeholder={figures[entry]}
                  onFocus={() => (atFocus.current = typed)}
                  onChange={(event) => type(entry, event.currentTarget.value)}
                  onBlur={() => setDraft(null)}
                  onKeyDown={(event) => {
                    if (event.key !== 'Escape' || draft === null) return
                    type(atFocus.current?.entry ?? entry, atFocus.current?.text ?? '')
                  }}
                />
              </td>
            )
          })}
        </tr>
        {below && (
          <tr>
            <td colSpan={4} id={id} className={mergeClasses(classes.cell, classes.name, classes.below)}>
              {fault ? (
                <Field validationMessage={<TextFaultMessage text={entered?.text ?? ''} fault={fault} />} />
              ) : (
                <TypedText text={entered?.text ?? ''} place={null} />
              )}
            </td>
          </tr>
        )}
      </>
    )
  },
  (a, b) => a.stop === b.stop && a.payer === b.payer && a.digits === b.digits && sameLine(a.line, b.line),
)

const COLUMNS = [
  ['Holding', null],
  ['Before', 60],
  ['Change', 73],
  ['After', 68],
] as const

/** Lines in an order that is kept, those that came since at the end. */
function inOrder(
  keys: readonly string[],
  lines: readonly TradeLine[],
  all: readonly TradeLine[],
): readonly TradeLine[] {
  const byKey = new Map(all.map((line) => [line.key, line]))
  const kept = new Set(keys)
  return [...keys.flatMap((key) => byKey.get(key) ?? []), ...lines.filter(({ key }) => !kept.has(key))]
}

/** The lines, one of them a stop of the Tab key: up and down move between them. While the focus is within, none goes and none changes its place. */
function Lines({
  lines,
  all,
  payer,
}: {
  /** those to be shown */
  lines: readonly TradeLine[]
  all: readonly TradeLine[]
  payer: Financing['kind']
}) {
  const classes = { ...useTableStyles(), ...useStyles() }
  // weights of a large book are small, and what moves them smaller
  const digits = digitsFor(all.length) + 1
  const [limit, setLimit] = useState(STEP)
  const [reached, setReached] = useState<string | null>(null)
  const [held, setHeld] = useState<readonly string[] | null>(null)
  const shown = (held ? inOrder(held, lines, all) : lines).slice(0, limit)
  const stop = shown.some(({ key }) => key === reached) ? reached : shown[0]?.key

  const enter = ({ target }: FocusEvent<HTMLTableSectionElement>): void => {
    setReached(target.closest<HTMLElement>('tr[data-key]')?.dataset.key ?? reached)
    setHeld(held ?? lines.map(({ key }) => key))
  }
  const leave = ({ currentTarget, relatedTarget }: FocusEvent<HTMLTableSectionElement>): void => {
    if (!currentTarget.contains(relatedTarget)) setHeld(null)
  }

  const move = (event: KeyboardEvent<HTMLTableSectionElement>): void => {
    const { target, currentTarget, key } = event
    const steps: { readonly [key: string]: number } = { ArrowDown: 1, Enter: 1, ArrowUp: -1 }
    const step = steps[key]
    if (step === undefined || event.ctrlKey || event.metaKey || !(target instanceof HTMLInputElement)) return
    event.preventDefault()
    const column = currentTarget.querySelectorAll<HTMLInputElement>(
      `input[data-entry="${target.dataset.entry}"]`,
    )
    const next = column[[...column].indexOf(target) + step]
    next?.focus()
    next?.select()
  }
  return (
    <>
      <table className={classes.table} aria-label="Trades">
        <colgroup>
          {COLUMNS.map(([head, width]) => (
            <col key={head} style={width === null ? undefined : { width: `${width}px` }} />
          ))}
        </colgroup>
        <thead>
          <tr>
            {COLUMNS.map(([head, width]) => (
              <th
                key={head}
                scope="col"
                className={mergeClasses(classes.head, classes.plainHead, width === null && classes.left)}
              >
                {head}
              </th>
            ))}
          </tr>
        </thead>
        <tbody onKeyDown={move} onFocus={enter} onBlur={leave}>
          {shown.map((line) => (
            <Line key={line.key} line={line} stop={line.key === stop} payer={payer} digits={digits} />
          ))}
        </tbody>
      </table>
      {limit < lines.length && (
        <Button size="small" className={classes.more} onClick={() => setLimit(limit + STEP)}>
          {`Show ${Math.min(STEP, lines.length - limit)} more of ${lines.length.toLocaleString('en-US')}`}
        </Button>
      )}
    </>
  )
}

/** What is wrong with the rule: its text, or what it comes to for a holding; for many, the first is told and the rest counted. */
function ruleFaultOf({ rule, lines }: TradesState): TextFault | null {
  const [first, ...others] = lines.filter(({ fault, typed }) => fault !== null && typed === null)
  if (!first?.fault) return rule.fault
  const more = others.length === 0 ? '' : ` So it is for ${countOf(others.length, 'more holding')}.`
  return { ...first.fault, sentence: `${first.fault.sentence}${more}` }
}

/** What every holding without a trade of its own becomes. */
function RuleField({ trades }: { trades: TradesState }) {
  const books = useBooks()
  const classes = { ...useStepStyles(), ...useStyles() }
  const { rule, loading, preview } = trades
  const [draft, setDraft] = useState<string | null>(null)
  const atFocus = useRef('')
  const told = ruleFaultOf(trades)
  const lasting = useLasting(told !== null, TYPING_MS)
  const slow = useLasting(loading, TYPING_MS)
  const text = draft ?? rule.text
  const fault = lasting || draft === null ? told : null
  // what does not keep the rule from counting is a remark
  const remark = rule.fault !== null && !preview.refusals.includes(rule.fault.sentence)
  const type = (typed: string): void => {
    setDraft(typed)
    books.trade({ rule: asTyped(typed) })
  }
  return (
    <div>
      <Field
        label="Rule for all holdings"
        size="small"
        hint={
          slow
            ? 'Loading what reads expressions…'
            : 'Such as weight * 0.9 or min(weight, 5%). What is typed for one holding goes before it.'
        }
        validationState={fault === null ? 'none' : fault === rule.fault && remark ? 'warning' : 'error'}
        validationMessage={fault && <TextFaultMessage text={text} fault={fault} />}
      >
        <Input
          size="small"
          className={classes.control}
          autoComplete="off"
          spellCheck={false}
          value={text}
          onFocus={() => (atFocus.current = rule.text)}
          onChange={(_, data) => type(data.value)}
          onBlur={() => setDraft(null)}
          onKeyDown={(event) => {
            if (event.key === 'Escape' && draft !== null) type(atFocus.current)
          }}
        />
      </Field>
      <Disclosure summary="What a rule can say" open={false}>
        <dl className={classes.names}>
          {Object.entries({ ...RULE_NAMES, ...RULE_FUNCTIONS }).map(([name, meaning]) => (
            <div key={name} className={classes.ruleName}>
              <dt className={classes.code}>{name}</dt>
              <dd className={classes.meaning}>{meaning}</dd>
            </div>
          ))}
        </dl>
        <p className={mergeClasses(classes.small, classes.apart)}>
          Also numbers, + − * / and parentheses, comparisons, and, or, not, and condition ? this : that. 2% is
          2/100 wherever it stands: weight - 2% takes two points of capital away. Figures are those of the
          weights in the sheet.
        </p>
      </Disclosure>
    </div>
  )
}

/** What pays for the trades. */
const Payer = memo(
  function Payer({
    financing,
    fault,
    keys,
  }: {
    financing: Financing
    fault: string | null
    keys: readonly string[]
  }) {
    const books = useBooks()
    const ofPosition = (key: string): string => `position ${key}`
    return (
      <Choice<string>
        label="What pays for the trades"
        value={financing.kind === 'position' ? ofPosition(financing.key) : financing.kind}
        choices={[
          ['cash', 'Cash beyond the holdings'],
          ['pro rata', 'The rest of the book, pro rata'],
        ]}
        more={[{ heading: 'One holding', choices: keys.map((key) => [ofPosition(key), key] as const) }]}
        fault={fault ?? undefined}
        choose={(value) => {
          const key = keys.find((one) => ofPosition(one) === value)
          books.trade({
            financing:
              key !== undefined
                ? { kind: 'position', key }
                : { kind: value === 'pro rata' ? 'pro rata' : 'cash' },
          })
        }}
      />
    )
  },
  (a, b) =>
    a.fault === b.fault &&
    a.financing === b.financing &&
    a.keys.length === b.keys.length &&
    a.keys.every((key, k) => key === b.keys[k]),
)

/** Series of the returns that no holding goes with, to be traded from a weight of 0. */
function Candidates({
  candidates,
  added,
  fault,
  asked,
}: {
  candidates: readonly string[]
  /** how many are on the list already */
  added: number
  fault: string | undefined
  asked: () => void
}) {
  const books = useBooks()
  const classes = useStyles()
  const [wanted, setWanted] = useState('')
  const chosen = candidates.includes(wanted) ? wanted : (candidates[0] ?? '')
  if (candidates.length + added === 0) return <FaultLine text={fault} />
  return (
    <Disclosure summary={`Series that are not held (${candidates.length + added})`} open={added > 0}>
      <FaultLine text={fault} />
      <div className={classes.adding}>
        <Field label="Trade a series of the returns" size="small" className={classes.grow}>
          <Select
            size="small"
            className={classes.control}
            value={chosen}
            onChange={(_, { value }) => setWanted(value)}
          >
            {candidates.length === 0 && <option value="">All are on the list</option>}
            {candidates.map((name) => (
              <option key={name}>{name}</option>
            ))}
          </Select>
        </Field>
        <Button
          size="small"
          disabledFocusable={candidates.length === 0}
          onClick={() => {
            asked()
            void books.addCandidate(chosen)
          }}
        >
          Add to the list
        </Button>
      </div>
    </Disclosure>
  )
}

const isMoved = ({ before, after, typed, fault, candidate }: TradeLine): boolean =>
  after !== before || typed !== null || fault !== null || candidate

/** Those of a long list that are worth a line: what was asked for first, then what pays for it. */
function movedOf(lines: readonly TradeLine[]): readonly TradeLine[] {
  const moved = lines.filter(isMoved)
  const pays = ({ origin }: TradeLine): boolean => origin === 'financing'
  return [...moved.filter((line) => !pays(line)), ...moved.filter(pays)]
}

const holds = (text: string, sought: string): boolean => text.toLowerCase().includes(sought)

/** The list of trades: a rule for all, what pays, and every holding with its weight before and after. */
export function TradeList({
  trades,
  fault,
  asked,
}: {
  trades: TradesState
  /** why a series could not be added or taken off */
  fault: string | undefined
  /** told when a series is to be added */
  asked: () => void
}) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const { lines, financing, financingFault, candidates, notes, proposal } = trades
  const [sought, setSought] = useState('')
  const [whole, setWhole] = useKept('trades whole', false)
  const isLong = lines.length > LONG
  const moved = movedOf(lines)
  const changed = lines.filter(({ before, after }) => before !== after).length
  const plain = sought.trim().toLowerCase()
  const shown =
    plain !== ''
      ? lines.filter(({ key, groups }) => holds(key, plain) || groups.some((label) => holds(label, plain)))
      : isLong && !whole
        ? moved
        : lines
  return (
    <Section title="Trades">
      <RuleField trades={trades} />
      <Payer financing={financing} fault={financingFault} keys={lines.map(({ key }) => key)} />
      {proposal && (
        <p className={classes.small}>
          <span className={classes.proposal}>Proposal: {proposal.title}.</span> {proposal.sentence}
        </p>
      )}
      {notes.map((note) => (
        <p key={note} className={classes.small}>
          {note}
        </p>
      ))}
      {isLong && (
        <div className={classes.finding}>
          <Input
            type="search"
            size="small"
            className={classes.find}
            aria-label="Find a holding or a group"
            placeholder="Find a holding or a group"
            value={sought}
            onChange={(_, { value }) => setSought(value)}
          />
          <Button size="small" onClick={() => setWhole(!whole)}>
            {whole ? 'Show what moves' : `Show all ${lines.length.toLocaleString('en-US')}`}
          </Button>
        </div>
      )}
      <p className={mergeClasses(classes.small, classes.quiet)}>
        {changed === 0
          ? 'Type what a weight changes by, or what it becomes: -0.5%, 4%, weight / 2.'
          : `${changed.toLocaleString('en-US')} of ${countOf(lines.length, 'weight')} changed.`}{' '}
        {plain !== ''
          ? `${countOf(shown.length, 'holding')} found.`
          : shown.length === 0
            ? 'Find a holding first, or show all.'
            : 'The arrow keys go up and down the list.'}
      </p>
      {shown.length > 0 && <Lines lines={shown} all={lines} payer={financing.kind} />}
      <Candidates
        candidates={candidates}
        added={lines.filter(({ candidate }) => candidate).length}
        fault={fault}
        asked={asked}
      />
    </Section>
  )
}

import { Button, makeStyles, mergeClasses, tokens } from '@fluentui/react-components'
import {
  CAUTION,
  type BooksState,
  type Breakdown,
  type Proposal,
  type ShareOf,
  type Target,
  type TradesState,
} from '../sheet'
import { Choice, Entry, PercentEntry, typedNumber, typedPercent, typedPercentText } from './controls'
import { Remark } from './headline'
import { FaultLine, useStepStyles } from './step'
import { useBooks, useKept } from './store'
import { Facts } from './table'

const useStyles = makeStyles({
  found: {
    display: 'grid',
    rowGap: tokens.spacingVerticalS,
    paddingTop: tokens.spacingVerticalM,
    borderTop: `1px solid ${tokens.colorNeutralStroke2}`,
    minWidth: 0,
  },
  title: {
    margin: 0,
    fontSize: tokens.fontSizeBase300,
    lineHeight: tokens.lineHeightBase300,
    fontWeight: tokens.fontWeightSemibold,
    overflowWrap: 'anywhere',
  },
  word: { fontWeight: tokens.fontWeightSemibold },
})

type Kind = Target['kind']

const KINDS: readonly (readonly [Kind, string])[] = [
  ['smallest change', 'Smallest change that meets all limits'],
  ['volatility', 'A volatility of the book'],
  ['share', 'A share of risk of a holding or group'],
  ['risk budgets', 'Equal risk contribution, risk budgets'],
  ['least variance', 'Minimum variance'],
]

/** All that was typed and chosen, whatever is looked for now. */
interface Draft {
  readonly kind: Kind
  readonly volatility: number | null
  readonly of: ShareOf | null
  readonly share: number
  /** 'holding', 'column', or 'group: ' and the heading of a column */
  readonly budgets: string
  readonly lower: number
  readonly upper: number
  readonly turnover: number | null
  /** in the unit of the cells; null: no lots */
  readonly lot: number | null
  readonly net: 'kept' | 'free'
  readonly against: 'hard' | 'soft'
}

const FIRST: Draft = {
  kind: 'smallest change',
  volatility: null,
  of: null,
  share: 0.1,
  budgets: 'holding',
  lower: 0,
  upper: 0.25,
  turnover: null,
  lot: null,
  net: 'kept',
  against: 'hard',
}

const BY_GROUP = 'group: '

/** What the fields ask for, with what the book itself begins them with. */
function targetOf(draft: Draft, volatility: number, of: ShareOf): Target {
  switch (draft.kind) {
    case 'volatility':
      return { kind: 'volatility', volatility }
    case 'share':
      return { kind: 'share', of, share: draft.share }
    case 'risk budgets':
      return {
        kind: 'risk budgets',
        by: draft.budgets.startsWith(BY_GROUP)
          ? { header: draft.budgets.slice(BY_GROUP.length) }
          : draft.budgets === 'column'
            ? 'column'
            : 'holding',
      }
    case 'least variance':
      return { kind: 'least variance', lower: draft.lower, upper: draft.upper }
    case 'smallest change':
      return {
        kind: 'smallest change',
        turnover: draft.turnover,
        lot: draft.lot,
        net: draft.net,
        against: draft.against,
      }
  }
}

const paidBy = (financing: TradesState['financing']): string =>
  financing.kind === 'cash'
    ? 'cash'
    : financing.kind === 'pro rata'
      ? 'the rest of the book, pro rata'
      : financing.key

/** What takes the difference, where the list of trades says it. */
function payerHint(kind: Kind, financing: TradesState['financing']): string | null {
  switch (kind) {
    case 'share':
      return `The difference goes to: ${paidBy(financing)}, as chosen in the list of trades.`
    case 'volatility':
      return financing.kind === 'position'
        ? `The difference goes to: ${financing.key}, as chosen in the list of trades.`
        : 'The whole book grows or shrinks; cash beyond the holdings takes the difference.'
    case 'smallest change':
      return financing.kind === 'position'
        ? `${financing.key} takes the difference, as chosen in the list of trades.`
        : null
    case 'risk budgets':
    case 'least variance':
      return 'The sum of the weights stays as it is.'
  }
}

const keyOf = (of: ShareOf): string =>
  of.kind === 'holding' ? `holding ${of.key}` : `group ${JSON.stringify([of.header, of.label])}`

/** The size that every change is a whole multiple of, as the cells of the holdings count. */
function LotEntry({
  lot,
  unit,
  commit,
}: {
  lot: number | null
  unit: TradesState['preview']['unit']
  commit: (lot: number | null) => void
}) {
  const inWeight = unit === 'weight'
  return (
    <Entry<number | null>
      label={inWeight ? 'In steps of, %' : 'In steps of, amount'}
      shown={lot === null ? '' : inWeight ? typedPercentText(lot) : String(lot)}
      hint="Empty: no lots"
      read={(text) => {
        if (text === '') return { value: null }
        const value = inWeight ? typedPercent(text) : typedNumber(text)
        return value !== null && value > 0
          ? { value }
          : { needed: `${inWeight ? 'A percentage above 0%' : 'An amount above 0'} is needed, or nothing.` }
      }}
      commit={commit}
    />
  )
}

/** The fields of what is looked for. */
function Fields({
  draft,
  change,
  breakdown,
  trades,
  budgetColumn,
  volatility,
  of,
}: {
  draft: Draft
  change: (part: Partial<Draft>) => void
  breakdown: Breakdown
  trades: TradesState
  budgetColumn: string | null
  volatility: number
  of: ShareOf
}) {
  const classes = useStepStyles()
  switch (draft.kind) {
    case 'volatility':
      return (
        <PercentEntry
          label={`Volatility ${breakdown.horizon}, %`}
          value={volatility}
          from={0}
          commit={(value) => change({ volatility: value })}
        />
      )
    case 'share': {
      const holdings = trades.lines.map(({ key }): ShareOf => ({ kind: 'holding', key }))
      const groups = breakdown.byGroup.map(({ header, labels }) => ({
        header,
        all: labels.map((label): ShareOf => ({ kind: 'group', header, label })),
      }))
      const all = [...holdings, ...groups.flatMap((group) => group.all)]
      const named = (one: ShareOf): readonly [string, string] => [
        keyOf(one),
        one.kind === 'holding' ? one.key : one.label,
      ]
      return (
        <div className={classes.pairs}>
          <div className={classes.wide}>
            <Choice<string>
              label="Holding or group"
              value={keyOf(of)}
              choices={[]}
              more={[
                { heading: 'Holdings', choices: holdings.map(named) },
                ...groups.map(({ header, all: members }) => ({
                  heading: header,
                  choices: members.map(named),
                })),
              ]}
              choose={(key) => change({ of: all.find((one) => keyOf(one) === key) ?? null })}
            />
          </div>
          <PercentEntry
            label="Share of risk, %"
            value={draft.share}
            from={-1}
            to={1}
            commit={(share) => change({ share })}
          />
        </div>
      )
    }
    case 'risk budgets':
      return (
        <Choice<string>
          label="Shares of risk"
          value={draft.budgets}
          choices={[
            ['holding', 'Equal for all holdings'],
            ...breakdown.byGroup.map(
              ({ header }) => [`${BY_GROUP}${header}`, `Equal for each ${header}, and within it`] as const,
            ),
            ...(budgetColumn === null ? [] : [['column', `Those of the column ${budgetColumn}`] as const]),
          ]}
          hint={
            budgetColumn === null
              ? 'A column of the holdings headed Risk budget would be offered here too.'
              : undefined
          }
          choose={(budgets) => change({ budgets })}
        />
      )
    case 'least variance':
      return (
        <div className={classes.pairs}>
          <PercentEntry label="Least weight, %" value={draft.lower} commit={(lower) => change({ lower })} />
          <PercentEntry label="Largest weight, %" value={draft.upper} commit={(upper) => change({ upper })} />
        </div>
      )
    case 'smallest change':
      return (
        <div className={classes.pairs}>
          <Choice
            label="Limits to meet"
            value={draft.against}
            choices={[
              ['hard', 'Hard limits'],
              ['soft', 'Soft limits'],
            ]}
            choose={(against) => change({ against })}
          />
          <Choice
            label="Sum of the weights"
            value={draft.net}
            choices={[
              ['kept', 'Stays'],
              ['free', 'May change'],
            ]}
            hint={draft.net === 'free' ? 'Cash takes the difference' : undefined}
            choose={(net) => change({ net })}
          />
          <Entry<number | null>
            label="Most turnover, %"
            shown={draft.turnover === null ? '' : typedPercentText(draft.turnover)}
            hint="One way; empty: no cap"
            read={(text) => {
              if (text === '') return { value: null }
              const value = typedPercent(text)
              return value !== null && value >= 0
                ? { value }
                : { needed: 'A percentage of 0% or more is needed, or nothing.' }
            }}
            commit={(turnover) => change({ turnover })}
          />
          <LotEntry lot={draft.lot} unit={trades.preview.unit} commit={(lot) => change({ lot })} />
        </div>
      )
  }
}

function Found({
  proposal,
  moves,
  outdated,
}: {
  proposal: Proposal
  /** whether any weight of it is in the list */
  moves: boolean
  outdated: string | null
}) {
  const classes = { ...useStepStyles(), ...useStyles() }
  const { title, met, sentence, method, lines } = proposal
  return (
    <section className={classes.found} aria-label="Proposal">
      <h3 className={classes.title}>Proposal: {title}</h3>
      <p className={classes.small} role="status">
        <span className={classes.word}>{met ? '\u2713 Met.' : '\u2717 Not met.'}</span> {sentence}
      </p>
      {outdated !== null && <Remark text={outdated} />}
      {lines.length > 0 && <Facts lines={lines} />}
      <p className={mergeClasses(classes.small, classes.quiet)}>{method}</p>
      {moves && (
        <p className={classes.small}>
          Its weights are in the list of trades below; nothing is written before Apply, and Discard drops
          them.
        </p>
      )}
      <p className={mergeClasses(classes.small, classes.quiet)}>{CAUTION}</p>
    </section>
  )
}

/** Weights that reach something, looked for and put into the list of trades. */
export default function Targets({
  state,
  breakdown,
  trades,
  fault,
  asked,
}: {
  state: BooksState
  breakdown: Breakdown
  trades: TradesState
  fault: string | undefined
  /** told when weights are to be looked for */
  asked: () => void
}) {
  const books = useBooks()
  const classes = useStepStyles()
  const [kept, setKept] = useKept<Draft>('target', FIRST)
  const budgetColumn = state.holdings?.columns.find(({ role }) => role === 'risk budget')?.header ?? null
  const isGroup = (header: string): boolean => breakdown.byGroup.some((group) => group.header === header)
  const draft: Draft = {
    ...kept,
    // a column that is there no more cannot be asked for
    budgets:
      (kept.budgets === 'column' && budgetColumn === null) ||
      (kept.budgets.startsWith(BY_GROUP) && !isGroup(kept.budgets.slice(BY_GROUP.length)))
        ? 'holding'
        : kept.budgets,
  }
  const { lines, financing, proposal, pending } = trades
  const stands =
    draft.of !== null &&
    (draft.of.kind === 'group'
      ? breakdown.byGroup.some(
          ({ header, labels }) =>
            draft.of?.kind === 'group' && header === draft.of.header && labels.includes(draft.of.label),
        )
      : lines.some(({ key }) => draft.of?.kind === 'holding' && key === draft.of.key))
  const share = breakdown.decomposition.share ?? breakdown.decomposition.contribution
  const most = share.reduce((best, value, i) => (value > share[best]! ? i : best), 0)
  const of: ShareOf =
    stands && draft.of !== null ? draft.of : { kind: 'holding', key: lines[most]?.key ?? '' }
  const volatility = draft.volatility ?? Number(breakdown.decomposition.volatility.toFixed(4))
  const hint = payerHint(draft.kind, financing)
  return (
    <>
      <Choice
        label="Look for"
        value={draft.kind}
        choices={KINDS}
        choose={(kind) => setKept({ ...draft, kind })}
      />
      <Fields
        draft={draft}
        change={(part) => setKept({ ...draft, ...part })}
        breakdown={breakdown}
        trades={trades}
        budgetColumn={budgetColumn}
        volatility={volatility}
        of={of}
      />
      {hint !== null && <p className={mergeClasses(classes.small, classes.quiet)}>{hint}</p>}
      <FaultLine text={fault} />
      <div className={classes.buttons}>
        <Button
          size="small"
          disabledFocusable={state.working !== null}
          onClick={() => {
            asked()
            void books.propose(targetOf(draft, volatility, of))
          }}
        >
          Look for weights
        </Button>
      </div>
      {pending && proposal === null && (
        <p className={mergeClasses(classes.small, classes.quiet)}>
          What is found takes the place of what is typed in the list.
        </p>
      )}
      {proposal && (
        <Found
          proposal={proposal}
          moves={lines.some(({ origin }) => origin === 'proposal')}
          outdated={trades.outdated}
        />
      )}
    </>
  )
}

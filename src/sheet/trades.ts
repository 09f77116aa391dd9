import { Fault, financed, firstOrder, turnover } from '../core'
import type { Financing as CoreFinancing, FirstOrder } from '../core'
import type { Area, CellValue, Culture } from './cells'
import { addressOf } from './cells'
import { sharesWithheldOf } from './benchmark'
import { attempt, explain } from './explain'
import type { Expressions, Rule, RuleScope } from './expression'
import { loadExpressions, plainNumber } from './expression'
import type { HoldingsReading } from './holdings'
import type { Limit, LimitState } from './limits'
import { judgeLimits } from './limits'
import { plainName, UNASSIGNED } from './names'
import type { Profile, ProfileBasis } from './profile'
import type { Proposal } from './targets'
import { countOf, listOf, percentText, quote } from './wording'

/** What pays for a trade: cash (nothing else moves), the rest of the book in proportion, or one position by its key. */
export type Financing =
  | { readonly kind: 'cash' }
  | { readonly kind: 'pro rata' }
  | { readonly kind: 'position'; readonly key: string }

/** What a number or an expression typed for a position means. */
export type Entry = 'new weight' | 'change'

/** A sentence about a typed text, and the place in it (from 0) where it applies. */
export interface TextFault {
  readonly sentence: string
  readonly column: number | null
}

/** A holding, or a series that is not held and may be traded. */
export interface Position {
  /** its name; without names its place among the holdings, which stays when rows are inserted above. No two are alike */
  readonly key: string
  readonly name: string
  readonly groups: readonly string[]
  readonly candidate: boolean
  readonly weight: number
  readonly amount: number | null
  readonly limit: number | null
  readonly benchmark: number | null
  readonly budget: number | null
  /** where its weight stands; null for a candidate */
  readonly cell: Area | null
}

export interface TradeLine {
  readonly key: string
  readonly name: string
  readonly groups: readonly string[]
  readonly candidate: boolean
  /** the weight compared from */
  readonly before: number
  /** the weight in the sheet */
  readonly sheet: number
  /** the weight with the trades; that of the sheet where they cannot be worked out */
  readonly after: number
  readonly typed: { readonly entry: Entry; readonly text: string } | null
  readonly fault: TextFault | null
  /** what moved it last */
  readonly origin: 'none' | 'sheet' | 'typed' | 'rule' | 'proposal' | 'financing'
}

/** Two sets of weights of one book, side by side. */
export interface Comparison {
  readonly before: Profile
  readonly after: Profile
  readonly limitsBefore: readonly LimitState[]
  readonly limitsAfter: readonly LimitState[]
  /** what the sensitivities before the trades foretell, scaled as the profiles are; null where there was no risk before */
  readonly firstOrder: FirstOrder | null
  /** one way: the larger of what is bought and what is sold */
  readonly turnover: number
  readonly netChange: number
}

/** One cell that applying the trades would change. */
export interface WriteLine {
  readonly area: Area
  readonly name: string
  readonly from: number
  readonly to: number
  /** the formula that would give way to a number */
  readonly formula: string | null
}

export interface WritePreview {
  readonly lines: readonly WriteLine[]
  /** why nothing can be written, each a sentence */
  readonly refusals: readonly string[]
  /** whether the cells hold weights, or amounts of money */
  readonly unit: 'weight' | 'amount'
}

export interface TradesState {
  /** holdings in their order, then candidates */
  readonly lines: readonly TradeLine[]
  /** its fault may be a remark: a label that no holding has leaves the rule in force */
  readonly rule: { readonly text: string; readonly fault: TextFault | null }
  readonly financing: Financing
  readonly financingFault: string | null
  /** or why there is nothing to compare */
  readonly comparison: Comparison | string
  readonly preview: WritePreview
  readonly proposal: Proposal | null
  /** why what the proposal says of itself may be so no more, or null; it is among the notes as well */
  readonly outdated: string | null
  /** whether anything is typed or proposed that is not in the sheet */
  readonly pending: boolean
  /** what Undo would take back, or null */
  readonly applied: string | null
  /** series of returns that could be added */
  readonly candidates: readonly string[]
  /** what has to be said about the comparison */
  readonly notes: readonly string[]
  /** whether expressions are still being loaded */
  readonly loading: boolean
}

/** A change to the list of trades; what is absent stays. An empty text takes the line away. */
export interface TradeChange {
  readonly line?: { readonly key: string; readonly entry: Entry; readonly text: string }
  readonly rule?: string
  readonly financing?: Financing
}

/** What a list of trades stands on; a new object whenever any of it changes. */
export interface TradeGround {
  readonly holdings: HoldingsReading
  /** whether amounts are divided by their own sum, so that it must not change */
  readonly bySum: boolean
  /** the cell of the capital, where it holds a formula, which may add up the very amounts that are traded */
  readonly capitalFormula: Area | null
  readonly positions: readonly Position[]
  readonly basis: ProfileBasis
  readonly limits: readonly Limit[]
  /** benchmark weights of the positions, where the benchmark is a column of the holdings */
  readonly benchmark: Float64Array | null
  /** what is typed in the cell of a weight, where it is a formula */
  readonly formulaOf: (cell: Area) => string | null
  readonly candidates: readonly string[]
  /** what has to be said about the figures themselves */
  readonly notes: readonly string[]
}

/** Weights found for a target, and what they were found on. */
interface Taken {
  readonly what: Proposal
  readonly ground: TradeGround
  /** less those that the user has typed over */
  readonly weights: Map<string, number>
  /** how many there were */
  readonly count: number
}

interface Typed {
  readonly entry: Entry
  readonly text: string
}

/** A list of trades as it stood at some moment. */
export interface Listed {
  readonly typed: ReadonlyMap<string, Typed>
  readonly rule: string
  readonly proposal: Taken | null
}

/** Changes of a sum of weights below this are rounding. */
const ROUNDING = 1e-9

const NOTHING_DIFFERS = 'No weight differs from those compared from.'

/** Holdings, and after them the candidates, as trades know them. */
export function positionsOf(holdings: HoldingsReading, held: number): readonly Position[] {
  const seen = new Map<string, number>()
  return holdings.holdings.map(({ name, groups, weight, amount, limit, benchmark, budget, cell }, i) => {
    const count = (seen.get(name) ?? 0) + 1
    seen.set(name, count)
    const candidate = i >= held
    const key = !holdings.named ? `holding ${i + 1}` : count === 1 ? name : `${name} (${count})`
    return {
      key,
      name,
      groups,
      candidate,
      weight,
      amount,
      limit,
      benchmark,
      budget,
      cell: candidate ? null : cell,
    }
  })
}

/**
 * The list of trades of one book, before anything is written: what is typed line by line, a rule for all holdings, what a search proposed, and
 * what pays for them. Edits of weights in the sheet since the comparison began are in it too.
 */
export class Trades {
  readonly #culture: Culture
  readonly #onLoaded: () => void
  readonly #typed = new Map<string, Typed>()
  #rule = ''
  #financing: Financing = { kind: 'cash' }
  #proposal: Taken | null = null
  /** how many holdings without names were compared from; null: they have names, or there are none yet */
  #places: number | null = null
  /** the weights compared from, by key; null: none yet */
  #before: ReadonlyMap<string, number> | null = null
  #expressions: Expressions | null = null
  #loading = false
  #loadFault: string | null = null
  #known: { readonly ground: TradeGround; readonly state: TradesState } | null = null
  #profiles: { readonly ground: TradeGround; readonly sheet: Profile; readonly hasShares: boolean } | null =
    null
  #beforeProfile: { readonly ground: TradeGround; readonly weights: Float64Array; profile: Profile } | null =
    null
  applied: string | null = null

  constructor(culture: Culture, onLoaded: () => void) {
    this.#culture = culture
    this.#onLoaded = onLoaded
  }

  edit({ line, rule, financing }: TradeChange): void {
    if (line) {
      this.#proposal?.weights.delete(line.key)
      if (line.text.trim() === '') this.#typed.delete(line.key)
      else this.#typed.set(line.key, { entry: line.entry, text: line.text })
    }
    if (rule !== undefined) {
      this.#rule = rule
      if (rule.trim() !== '') this.#proposal = null
    }
    if (financing) this.#financing = financing
    this.#known = null
  }

  /** Takes a proposal into the list in place of what was typed when it was asked for; one that found nothing leaves that as it is. */
  take(what: Proposal, weights: ReadonlyMap<string, number>, ground: TradeGround, asked: Listed): void {
    if (what.met || weights.size > 0) this.discard(asked)
    this.#proposal = { what, ground, weights: new Map(weights), count: weights.size }
    this.#known = null
  }

  /** What is in the list now, for `discard` to tell it from what is typed later. */
  listed(): Listed {
    return { typed: new Map(this.#typed), rule: this.#rule, proposal: this.#proposal }
  }

  /** Drops everything that is not in the sheet; of a list taken down earlier, what has not been typed over since. */
  discard({ typed, rule, proposal }: Listed = this.listed()): void {
    for (const [key, entry] of typed) if (this.#typed.get(key) === entry) this.#typed.delete(key)
    if (this.#rule === rule) this.#rule = ''
    if (this.#proposal === proposal) this.#proposal = null
    this.#known = null
  }

  /** The same, and the comparison begins with the next figures. */
  restart(): void {
    this.discard()
    this.#financing = { kind: 'cash' }
    this.#before = null
    this.#places = null
  }

  /** Whether the list stands on places among holdings without names, and these are others now. */
  hasLostItsPlaces({ holdings }: TradeGround): boolean {
    return this.#places !== null && (holdings.named || holdings.holdings.length !== this.#places)
  }

  /** Drops what is typed for a position that is not there any more. */
  forget(key: string): void {
    this.#typed.delete(key)
    this.#proposal?.weights.delete(key)
    if (this.#financing.kind === 'position' && this.#financing.key === key) this.#financing = { kind: 'cash' }
    this.#known = null
  }

  /** Begins the comparison with the first figures there are. */
  beginAt(ground: TradeGround): void {
    if (this.#before === null) this.compareFrom(ground)
  }

  /** Begins the comparison anew at the weights in the sheet. */
  compareFrom(ground: TradeGround): void {
    this.#before = new Map(ground.positions.map(({ key, weight }) => [key, weight]))
    this.#places = ground.holdings.named ? null : ground.holdings.holdings.length
    this.#known = null
  }

  /** To be called when something outside the list, such as what can be undone, has changed. */
  touch(): void {
    this.#known = null
  }

  get financing(): Financing {
    return this.#financing
  }

  /** @cost one profile for every change of the list; two where the ground has changed */
  stateOn(ground: TradeGround): TradesState {
    if (this.#known?.ground === ground) return this.#known.state
    const state = this.#work(ground)
    this.#known = { ground, state }
    return state
  }

  #sheetProfile(ground: TradeGround): { readonly sheet: Profile; readonly hasShares: boolean } {
    if (this.#profiles?.ground !== ground) {
      const sheet = ground.basis.profileOf(Float64Array.from(ground.positions, ({ weight }) => weight))
      // where contributions nearly cancel, shares are withheld from rules as they are everywhere
      this.#profiles = { ground, sheet, hasShares: sharesWithheldOf(sheet.decomposition) === null }
    }
    return this.#profiles
  }

  #work(ground: TradeGround): TradesState {
    const { positions } = ground
    const before = Float64Array.from(positions, ({ key }) => this.#before?.get(key) ?? 0)
    const wanted = this.#wanted(ground)
    const paid = wanted.whole ? this.#finance(ground, wanted.changes) : { fault: null, changes: null }
    const after = Float64Array.from(positions, ({ key, weight }, i) => {
      const proposed = this.#proposal?.weights.get(key) ?? weight
      return paid.changes ? proposed + (paid.changes[i] ?? 0) : weight
    })
    const unread = wanted.whole
      ? paid.fault
      : (wanted.ruleFault?.sentence ?? 'A line cannot be read yet; its sentence stands with it.')
    // weights beyond any measure have figures beyond any number
    const compared = unread === null ? attempt(() => this.#compare(ground, before, after)) : null
    const why = compared?.fault ? explain(compared.fault, () => '') : unread
    const preview = this.#preview(ground, after, why)
    const lines = positions.map((position, i): TradeLine => {
      const { key, name, groups, candidate, weight } = position
      const typed = this.#typed.get(key) ?? null
      const moved = (after[i] ?? 0) !== weight
      return {
        key,
        name,
        groups,
        candidate,
        before: before[i] ?? 0,
        sheet: weight,
        after: after[i] ?? 0,
        typed,
        fault: wanted.faults.get(key) ?? null,
        origin: typed
          ? 'typed'
          : wanted.ruled.has(key)
            ? 'rule'
            : this.#proposal?.weights.has(key) && moved
              ? 'proposal'
              : moved
                ? 'financing'
                : weight !== before[i]
                  ? 'sheet'
                  : 'none',
      }
    })
    const outdated = this.#outdated(ground)
    return {
      lines,
      rule: { text: this.#rule, fault: wanted.ruleFault },
      financing: this.#financing,
      financingFault: paid.fault,
      comparison: why ?? compared?.value ?? NOTHING_DIFFERS,
      preview,
      proposal: this.#proposal?.what ?? null,
      outdated: outdated[0] ?? null,
      pending: this.#typed.size > 0 || this.#rule.trim() !== '' || this.#proposal !== null,
      applied: this.applied,
      candidates: ground.candidates,
      notes: [
        ...ground.notes,
        ...ofCapital(ground, preview, after),
        ...this.#gone(ground),
        ...this.#unused(ground),
        ...outdated,
      ],
      loading: this.#loading,
    }
  }

  /** Changes wished for by rule and by line, before anything is financed; 0 where a position is left alone. */
  #wanted(ground: TradeGround): {
    changes: Float64Array
    faults: ReadonlyMap<string, TextFault>
    ruled: ReadonlySet<string>
    ruleFault: TextFault | null
    whole: boolean
  } {
    const { positions } = ground
    const changes = new Float64Array(positions.length)
    const faults = new Map<string, TextFault>()
    const ruled = new Set<string>()
    let ruleFault: TextFault | null = null
    let whole = true

    const ruleText = this.#rule.trim() === '' ? null : this.#rule
    const bare = ruleText === null ? null : this.#bareNumber(ruleText)
    const rule = ruleText === null || bare ? null : this.#readRule(ruleText)
    if (rule === 'loading') whole = false
    else if (bare ?? rule?.fault) {
      ruleFault = bare ?? rule?.fault ?? null
      whole = false
    } else if (rule) {
      ruleFault = strangeLabel(rule.rule, positions)
      positions.forEach((position, i) => {
        if (position.candidate || position.key === this.#payer || this.#typed.has(position.key)) return
        const { value, fault } = attempt(() => rule.rule.evaluate(this.#scope(ground, i)))
        if (fault) {
          faults.set(position.key, textFault(fault))
          whole = false
        } else if (value !== position.weight) {
          changes[i] = value - position.weight
          ruled.add(position.key)
        }
      })
    }

    positions.forEach((position, i) => {
      const typed = this.#typed.get(position.key)
      if (!typed) return
      const value = this.#valueOf(typed, ground, i)
      if (typeof value === 'number') changes[i] = typed.entry === 'change' ? value : value - position.weight
      else {
        whole = false
        if (value !== 'loading') faults.set(position.key, value)
      }
    })
    return { changes, faults, ruled, ruleFault, whole }
  }

  /** The number a line says, the fault in it, or that expressions are not there yet. */
  #valueOf({ text }: Typed, ground: TradeGround, i: number): number | TextFault | 'loading' {
    const plain = plainNumber(text, this.#culture)
    if (plain) return this.#bareNumber(text) ?? plain.value
    const read = this.#readRule(text)
    if (read === 'loading') return read
    if (read.fault) return read.fault
    const { value, fault } = attempt(() => read.rule.evaluate(this.#scope(ground, i)))
    return fault ? textFault(fault) : value
  }

  /** In a cell formatted as a percentage 5 is 5%, in others it is 500%: nobody but the user knows which is meant. */
  #bareNumber(text: string): TextFault | null {
    const plain = plainNumber(text, this.#culture)
    return plain && !plain.percent && Math.abs(plain.value) >= 1
      ? {
          sentence: `Found ${text.trim()}: write ${text.trim()}% for that many parts in a hundred of capital, or ${percentText(plain.value, 0)} if that is meant.`,
          column: 0,
        }
      : null
  }

  /** The position that pays, which a rule for all leaves to that. */
  get #payer(): string | null {
    return this.#financing.kind === 'position' ? this.#financing.key : null
  }

  #readRule(text: string): { rule: Rule; fault?: undefined } | { fault: TextFault } | 'loading' {
    if (this.#loadFault !== null) return { fault: { sentence: this.#loadFault, column: null } }
    const expressions = this.#expressions
    if (!expressions) {
      this.#load()
      return 'loading'
    }
    const { value, fault } = attempt(() => expressions.read(text, this.#culture))
    return fault ? { fault: textFault(fault) } : { rule: value }
  }

  #load(): void {
    if (this.#loading) return
    this.#loading = true
    const settled = (): void => {
      this.#loading = false
      this.#known = null
      this.#onLoaded()
    }
    loadExpressions().then(
      (expressions) => {
        this.#expressions = expressions
        settled()
      },
      () => {
        this.#loadFault =
          'The part that reads expressions could not be loaded; numbers and percentages can be typed.'
        settled()
      },
    )
  }

  #scope(ground: TradeGround, i: number): RuleScope {
    const { sheet, hasShares } = this.#sheetProfile(ground)
    const { decomposition: d } = sheet
    const position = ground.positions[i]
    return {
      weight: position?.weight ?? 0,
      amount: position?.amount ?? null,
      risk_share: hasShares ? (d.share?.[i] ?? null) : null,
      contribution: d.contribution[i] ?? null,
      marginal: d.marginal?.[i] ?? null,
      volatility: ground.basis.volatilities[i] ?? 0,
      beta: d.beta?.[i] ?? null,
      limit: position?.limit ?? null,
      benchmark: position?.benchmark ?? null,
      group: position?.groups[0] ?? null,
      holding: position?.name ?? '',
    }
  }

  #finance(
    ground: TradeGround,
    changes: Float64Array,
  ): { changes: Float64Array; fault: null } | { changes: null; fault: string } {
    const { positions } = ground
    const weights = Float64Array.from(
      positions,
      ({ key, weight }) => this.#proposal?.weights.get(key) ?? weight,
    )
    // a weight that is typed is meant, even where it is the one in the sheet
    const kept = new Set([...positions.keys()].filter((i) => this.#typed.has(positions[i]?.key ?? '')))
    const payer = this.#payer
    if (payer !== null && this.#typed.has(payer))
      return {
        changes: null,
        fault: `${quote(payer)} is to pay for the trades and has a weight or a change of its own: take that away, or choose what else pays.`,
      }
    const { value, fault } = attempt(() =>
      financed(weights, changes, financingOf(positions, this.#financing), kept),
    )
    return fault
      ? { changes: null, fault: explain(fault, () => '') }
      : { changes: value.changes, fault: null }
  }

  #compare(ground: TradeGround, before: Float64Array, after: Float64Array): Comparison | string {
    if (after.every((weight, i) => weight === before[i])) return NOTHING_DIFFERS
    const { basis, limits } = ground
    const known = this.#beforeProfile
    const same = known?.ground === ground && known.weights.every((weight, i) => weight === before[i])
    const first = same ? known.profile : basis.profileOf(before)
    if (!same) this.#beforeProfile = { ground, weights: before, profile: first }
    const second = basis.profileOf(after)
    return {
      before: first,
      after: second,
      limitsBefore: judgeLimits(limits, first, null),
      limitsAfter: judgeLimits(limits, second, null),
      firstOrder: firstOrder(first.decomposition, second.decomposition),
      turnover: turnover(after.map((weight, i) => weight - (before[i] ?? 0))),
      netChange: second.net - first.net,
    }
  }

  #preview(ground: TradeGround, after: Float64Array, why: string | null): WritePreview {
    const { positions, holdings, bySum } = ground
    const unit = holdings.capital === null ? 'weight' : 'amount'
    const capital = holdings.capital ?? 1
    const refusals: string[] = why === null ? [] : [why]
    const lines = positions.flatMap(({ name, weight, cell }, i): WriteLine[] => {
      const [from, to] = [digitsOf(weight * capital), digitsOf((after[i] ?? 0) * capital)]
      if (to === from) return []
      if (cell === null) {
        refusals.push(
          `${quote(name)} has no row in ${addressOf(holdings.area)}: insert one with its name and a weight of 0 there first.`,
        )
        return []
      }
      return [
        {
          area: cell,
          name,
          from,
          to,
          formula: ground.formulaOf(cell),
        },
      ]
    })
    const net = netChangeOf(positions, after)
    if (bySum && lines.length > 0 && Math.abs(net) > ROUNDING)
      refusals.push(
        `Amounts are divided by their own sum, which these trades would change by ${percentText(net, 2)}, and every weight with it: point at the cell of the capital, or let the book pay for the trades.`,
      )
    return { lines, refusals, unit }
  }

  /** What is in the list for positions that are not there any more, and what a rule leaves alone. */
  #unused({ positions }: TradeGround): readonly string[] {
    const here = new Set(positions.map(({ key }) => key))
    const lost = [...this.#typed.keys(), ...(this.#proposal?.weights.keys() ?? [])].filter(
      (key) => !here.has(key),
    )
    const payer = this.#payer
    return [
      ...(lost.length === 0
        ? []
        : [
            `${listOf(lost.map(quote))} ${lost.length === 1 ? 'is' : 'are'} not in the holdings any more: what the list has for ${lost.length === 1 ? 'it' : 'them'} does not count.`,
          ]),
      ...(this.#rule.trim() === '' || payer === null || !here.has(payer)
        ? []
        : [`The rule leaves ${quote(payer)} alone, which pays for the trades.`]),
    ]
  }

  /** Whether what is said of a proposal still goes for what is in the list. */
  #outdated(ground: TradeGround): readonly string[] {
    if (!this.#proposal) return []
    const { ground: then, weights, count } = this.#proposal
    const changed = [
      ...(sameList(then.positions, ground.positions, (a, b) => a.key === b.key && a.weight === b.weight)
        ? []
        : ['the holdings or their weights']),
      ...(then.basis.model === ground.basis.model && then.basis.periods === ground.basis.periods
        ? []
        : ['the estimate of risk']),
      ...(sameList(then.limits, ground.limits, (a, b) => limitKey(a) === limitKey(b)) ? [] : ['limits']),
      ...(this.#typed.size === 0 && weights.size === count ? [] : ['lines of the list']),
    ]
    return changed.length === 0
      ? []
      : [
          `The proposal was found before ${listOf(changed, changed.length)} changed: what it says of itself goes for then, the figures here for now.`,
        ]
  }

  /** Holdings compared from that are not in the book any more. */
  #gone({ positions }: TradeGround): readonly string[] {
    const here = new Set(positions.map(({ key }) => key))
    const gone = [...(this.#before ?? [])].flatMap(([key, weight]) =>
      here.has(key) || weight === 0 ? [] : [`${quote(key)} (${percentText(weight, 2)})`],
    )
    return gone.length === 0
      ? []
      : [
          `${listOf(gone)} ${gone.length === 1 ? 'was' : 'were'} held when the comparison began and ${gone.length === 1 ? 'is' : 'are'} not in the holdings now: the figures before are those without.`,
        ]
  }
}

const sameList = <T>(a: readonly T[], b: readonly T[], same: (one: T, other: T) => boolean): boolean =>
  a === b || (a.length === b.length && a.every((one, k) => same(one, b[k]!)))

const limitKey = ({ scope, header, name, measure, soft, hard, members }: Limit): string =>
  JSON.stringify([scope, header, name, measure, soft, hard, members && [...members]])

/** A label in a rule that no holding has: a slip of the pen would match nothing and say nothing. The rule counts all the same. */
function strangeLabel({ labels }: Rule, positions: readonly Position[]): TextFault | null {
  const known = new Set(positions.map(({ groups }) => plainName(groups[0] ?? '') || plainName(UNASSIGNED)))
  const strange = labels.find(({ label }) => !known.has(plainName(label)))
  return strange
    ? { sentence: `No holding is in a group ${quote(strange.label)}.`, column: strange.column }
    : null
}

/**
 * The financing in terms of positions.
 *
 * @throws Fault "missing" where the position that was to pay is not there any more
 */
export function financingOf(positions: readonly Position[], financing: Financing): CoreFinancing {
  if (financing.kind !== 'position') return financing
  const position = positions.findIndex(({ key }) => key === financing.key)
  if (position >= 0) return { kind: 'position', position }
  throw new Fault(
    'missing',
    `${quote(financing.key)} was to pay for the trades and is not there any more`,
    'choose what pays for them',
    { argument: 'trades' },
  )
}

const textFault = (fault: Fault): TextFault => ({
  sentence: explain(fault, () => ''),
  column: fault.code === 'expression' ? (fault.where.column ?? null) : null,
})

const netChangeOf = (positions: readonly Position[], after: Float64Array): number =>
  positions.reduce((sum, { weight }, i) => sum + (after[i] ?? 0) - weight, 0)

/** A capital that is computed may change with the amounts it divides, and the weights would be others than those shown. */
function ofCapital(
  { capitalFormula, positions }: TradeGround,
  { lines, unit }: WritePreview,
  after: Float64Array,
): readonly string[] {
  const net = netChangeOf(positions, after)
  return capitalFormula === null || unit !== 'amount' || lines.length === 0 || Math.abs(net) <= ROUNDING
    ? []
    : [
        `The capital in ${addressOf(capitalFormula)} is a formula: if it adds up these amounts, writing them changes it by ${percentText(net, 2)}, and every weight is then another than shown here.`,
      ]
}

/** As many digits as a cell shows and keeps. */
const digitsOf = (value: number): number => Number(value.toPrecision(15))

/** What was written to cells, so that it can be taken back. */
export interface Applied {
  readonly key: string
  /** as it was typed before: a formula where there was one */
  readonly was: CellValue
  readonly now: number
}

/** What Undo would do, as a sentence. */
export const appliedText = (count: number): string =>
  `${countOf(count, 'weight')} written to the sheet by Apply; Undo puts back what stood there.`

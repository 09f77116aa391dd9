import { courseOf, Fault, financed } from '../core'
import type { ChangeLimit, ChangeProblem, Financing as CoreFinancing, RiskModel } from '../core'
import type { Calculator, Work } from './calculator'
import { sharesWithheldOf } from './benchmark'
import type { Limit } from './limits'
import { judgeLimits, LIMIT_MEASURES, limitOn } from './limits'
import type { Profile } from './profile'
import type { Financing, TradeGround } from './trades'
import { financingOf } from './trades'
import type { Standing } from './trading'
import { countOf, listOf, numberText, percentText, quote } from './wording'

/** What weights are looked for. Figures are scaled as the book's are. */
export type Target =
  /** the whole book larger or smaller until its volatility is this */
  | { readonly kind: 'volatility'; readonly volatility: number }
  /** a holding or a group smaller until its share of risk is this */
  | { readonly kind: 'share'; readonly of: ShareOf; readonly share: number }
  /** shares of risk as a column of the holdings has them; or alike: of holdings, or of the groups of a column and within each of its holdings */
  | { readonly kind: 'risk budgets'; readonly by: 'column' | 'holding' | { readonly header: string } }
  | { readonly kind: 'least variance'; readonly lower: number; readonly upper: number }
  /** all limits met with the smallest sum of changes */
  | {
      readonly kind: 'smallest change'
      /** the most turnover, one way; null: without a cap */
      readonly turnover: number | null
      /** whether the sum of the weights stays, or cash takes the difference */
      readonly net: 'kept' | 'free'
      readonly against: 'hard' | 'soft'
      /** changes are whole multiples of this, in the unit of the cells (weight or amount); null: no lots */
      readonly lot: number | null
    }

export type ShareOf =
  | { readonly kind: 'holding'; readonly key: string }
  | { readonly kind: 'group'; readonly header: string; readonly label: string }

/** What a search found: weights to look at, never a thing to do. */
export interface Proposal {
  readonly title: string
  /** whether the weights reach what was asked for */
  readonly met: boolean
  readonly sentence: string
  /** how they were found */
  readonly method: string
  /** label, figure and what it means */
  readonly lines: readonly (readonly [label: string, figure: string, meaning: string])[]
}

export interface ProposedWeights {
  readonly proposal: Proposal
  /** by key, where they are not those of the sheet */
  readonly weights: ReadonlyMap<string, number>
}

/** Decimals of a percentage by which a figure can be seen to be the one asked for. */
const SHARE_DIGITS = 4

/**
 * Looks for the weights of a target.
 *
 * @param financing of the list of trades: what takes the difference where a target leaves one
 * @throws Fault "out-of-range" | "missing" for a target that makes no sense for this book; those of the solvers; "cancelled"
 */
export async function proposalFor(
  target: Target,
  ground: TradeGround,
  standing: Standing,
  financing: Financing,
  calculator: Calculator,
  work: Work,
): Promise<ProposedWeights> {
  const search = new Search(ground, standing, financing)
  switch (target.kind) {
    case 'volatility':
      return search.volatility(target.volatility)
    case 'share':
      return search.share(target.of, target.share)
    case 'risk budgets':
      return search.riskBudgets(target.by, calculator, work)
    case 'least variance':
      return search.leastVariance(target, calculator, work)
    case 'smallest change':
      return search.smallestChange(target, calculator, work)
  }
}

class Search {
  readonly #ground: TradeGround
  readonly #standing: Standing
  readonly #financing: Financing
  readonly #model: RiskModel
  readonly #weights: Float64Array
  readonly #profile: Profile
  /** from a figure per period to the scale of the book */
  readonly #scale: number

  constructor(ground: TradeGround, standing: Standing, financing: Financing) {
    this.#ground = ground
    this.#standing = standing
    this.#financing = financing
    this.#model = ground.basis.model
    this.#weights = Float64Array.from(ground.positions, ({ weight }) => weight)
    this.#profile = ground.basis.profileOf(this.#weights)
    this.#scale = Math.sqrt(ground.basis.periods)
  }

  // ---- along one line of weights, in closed form

  volatility(wanted: number): ProposedWeights {
    if (!(wanted > 0))
      throw outOfRange(`a volatility of ${percentText(wanted, 2)}`, 'a volatility above 0% is needed')
    const { positions } = this.#ground
    const payer = this.#payer()
    const direction = this.#weights.map((weight, i) => (i === payer ? 0 : weight))
    if (payer !== null) direction[payer] = -direction.reduce((sum, weight) => sum + weight, 0)
    const course = courseOf(this.#model, this.#weights, direction)
    const { at } = course.volatilityReach(wanted / this.#scale)
    const t = at.filter((root) => root > -1).sort((a, b) => Math.abs(a) - Math.abs(b))[0]
    const paidBy =
      payer === null
        ? 'cash beyond the holdings takes the difference'
        : `${quote(positions[payer]?.name ?? '')} takes the difference`
    const title = `Volatility of ${percentText(wanted, 2)}`
    const method = `Every ${payer === null ? 'position' : 'other position'} larger or smaller in one proportion, in closed form; ${paidBy}.`
    if (t === undefined)
      return this.#none(
        title,
        `No size of the book has a volatility of ${percentText(wanted, 2)} while ${paidBy}.`,
        method,
      )
    const weights = course.weightsAt(t)
    return this.#found(
      title,
      `Every ${payer === null ? 'position' : 'other position'} times ${numberText(1 + t, 4)}; ${paidBy}.`,
      method,
      weights,
      [
        [
          'Volatility',
          percentText(this.#ground.basis.profileOf(weights).decomposition.volatility, SHARE_DIGITS),
          `${percentText(wanted, SHARE_DIGITS)} was asked for.`,
        ],
      ],
    )
  }

  share(of: ShareOf, wanted: number): ProposedWeights {
    const { members, name } = this.#membersOf(of)
    const now = this.#shareOf(this.#profile, members)
    const withheld = sharesWithheldOf(this.#profile.decomposition)
    if (now === null || withheld !== null)
      throw outOfRange(
        now === null ? 'a book without risk' : 'contributions that nearly cancel',
        'a book whose shares of risk say something is needed',
      )
    const title = `Share of risk of ${name} at ${percentText(wanted, 2)}`
    const method =
      'The position smaller in one proportion until its share is met: the ratio of two quadratics in the size of the trade, solved in closed form.'
    if (now <= wanted)
      return this.#none(
        title,
        `The share of risk of ${name} is ${percentText(now, 2)} already.`,
        method,
        true,
      )
    const changes = new Float64Array(this.#weights.length)
    for (const i of members) changes[i] = -(this.#weights[i] ?? 0)
    const { changes: direction } = financed(this.#weights, changes, this.#coreFinancing())
    const course = courseOf(this.#model, this.#weights, direction)
    const { at } = course.sharesReach(members, wanted)
    const t = at.filter((root) => root > 0 && root <= 1)[0]
    if (t === undefined)
      return this.#none(
        title,
        `No smaller size of ${name} brings its share of risk to ${percentText(wanted, 2)} with this financing.`,
        method,
      )
    const weights = course.weightsAt(t)
    const after = this.#ground.basis.profileOf(weights)
    return this.#found(
      title,
      `${name} smaller by ${percentText(t, 2)} of itself; ${this.#paidBy()}.`,
      method,
      weights,
      [
        [
          'Share of risk',
          percentText(this.#shareOf(after, members) ?? NaN, SHARE_DIGITS),
          `${percentText(wanted, SHARE_DIGITS)} was asked for, ${percentText(now, 2)} it is now.`,
        ],
        [
          'Volatility',
          percentText(after.decomposition.volatility, 2),
          `${percentText(this.#profile.decomposition.volatility, 2)} now.`,
        ],
      ],
    )
  }

  // ---- by a solver

  async riskBudgets(
    by: 'column' | 'holding' | { readonly header: string },
    calculator: Calculator,
    work: Work,
  ): Promise<ProposedWeights> {
    const moving = this.#moving()
    const total = moving.reduce((sum, i) => sum + this.#weights[i]!, 0)
    if (!(total > 0))
      throw outOfRange(
        `weights that add up to ${percentText(total, 2)}`,
        'a sum above 0% is needed for long-only weights',
      )
    const { title, meaning, budgets } =
      by === 'column'
        ? this.#budgetsOfColumn()
        : this.#equalBudgets(by === 'holding' ? null : by.header, moving)
    const result = await calculator.run('risk budgets', { recipe: this.#standing.book.recipe, budgets }, work)
    const method = 'The convex form of Spinu (2013), minimised by Newton’s method; long-only.'
    const { residual, converged, stopped, iterations } = result
    const weights = this.#weights.slice()
    for (const i of moving) weights[i] = (result.weights[i] ?? 0) * total
    return this.#found(
      title,
      `Long-only weights of the ${countOf(moving.length, 'holding')} that move whose shares of risk are ${meaning}; their sum, ${percentText(total, 2)}, stays.`,
      method,
      weights,
      [
        this.#volatilityLine(weights),
        [
          'Largest miss of a budget',
          residual.toExponential(1),
          converged
            ? `Converged after ${countOf(iterations, 'step')}.`
            : `Not converged: ${stopped === 'riskless-mix' ? 'a long-only mix of these holdings has no risk in these dates, and budgets have no meaning beside it' : stopped === 'rounding' ? 'rounding left nothing to gain' : 'the bound on the work was reached'}.`,
        ],
      ],
      converged,
    )
  }

  #equalBudgets(header: string | null, moving: readonly number[]) {
    const group = header === null ? null : this.#profile.groups.find((other) => other.header === header)
    if (group === undefined) throw outOfRange(`no group column ${quote(header)}`, 'choose another column')
    // one part for each holding, or one for each group that is shared by its members
    const counts = new Map<number, number>()
    for (const i of moving) {
      const part = group?.groupOf[i] ?? i
      counts.set(part, (counts.get(part) ?? 0) + 1)
    }
    const budgets = new Float64Array(this.#weights.length)
    for (const i of moving) budgets[i] = 1 / counts.size / (counts.get(group?.groupOf[i] ?? i) ?? 1)
    return {
      title: group ? `Equal risk contribution by ${group.header}` : 'Equal risk contribution',
      meaning: group ? `equal for each label of ${quote(group.header)}, and within it` : 'equal',
      budgets,
    }
  }

  #budgetsOfColumn() {
    const { positions, holdings } = this.#ground
    const column = holdings.columns.find(({ role }) => role === 'risk budget')
    if (!column)
      throw new Fault(
        'missing',
        'found no column of risk budgets',
        'give a column of the holdings that role',
        {
          argument: 'trades',
        },
      )
    const unfit = positions.find(
      ({ budget }, i) =>
        (budget ?? 0) < 0 || ((budget ?? 0) > 0 && (this.#ground.basis.volatilities[i] ?? 0) === 0),
    )
    if (unfit)
      throw outOfRange(
        `a risk budget of ${percentText(unfit.budget ?? 0, 2)} for ${quote(unfit.name)}${(unfit.budget ?? 0) > 0 ? ', which never moves' : ''}`,
        (unfit.budget ?? 0) > 0
          ? 'a budget of 0% or a blank is needed for it'
          : 'one of 0% or more is needed',
      )
    const blank = positions.filter(({ budget }) => budget === null).length
    const budgets = Float64Array.from(positions, ({ budget }) => budget ?? 0)
    const sum = budgets.reduce((all, budget) => all + budget, 0)
    if (Math.abs(sum - 1) > BUDGET_ROUNDING)
      throw outOfRange(
        `risk budgets in ${quote(column.header)} that add up to ${percentText(sum, 4)}`,
        'a sum of 100% is needed',
      )
    return {
      title: `Risk budgets of ${quote(column.header)}`,
      meaning: `those of ${quote(column.header)}${blank > 0 ? ` (${countOf(blank, 'holding')} without one ${blank === 1 ? 'counts' : 'count'} as 0)` : ''}`,
      budgets,
    }
  }

  async leastVariance(
    { lower, upper }: { readonly lower: number; readonly upper: number },
    calculator: Calculator,
    work: Work,
  ): Promise<ProposedWeights> {
    if (!(lower <= upper))
      throw outOfRange(
        `weights from ${percentText(lower, 1)} to ${percentText(upper, 1)}`,
        'a lower bound that is not above the upper one is needed',
      )
    const moving = this.#moving()
    const isMoving = new Set(moving)
    const bounded = (value: number): Float64Array =>
      this.#weights.map((weight, i) => (isMoving.has(i) ? value : weight))
    const total = moving.reduce((sum, i) => sum + this.#weights[i]!, 0)
    const title = 'Minimum variance'
    const method = `Primal active-set method on the covariance of the model; each weight from ${percentText(lower, 1)} to ${percentText(upper, 1)}, those that never move as they are.`
    const result = await calculator.run(
      'least variance',
      {
        recipe: this.#standing.book.recipe,
        bounds: {
          lower: bounded(lower),
          upper: bounded(upper),
          sum: this.#weights.reduce((sum, weight) => sum + weight, 0),
        },
      },
      work,
    )
    if (!result.feasible)
      return this.#none(
        title,
        `No weights within these bounds add up to ${percentText(total, 2)}: ${countOf(moving.length, 'holding')} reach ${percentText(lower * moving.length, 1)} to ${percentText(upper * moving.length, 1)}.`,
        method,
      )
    const { weights, residual, converged, iterations } = result
    return this.#found(
      title,
      `Weights of the ${countOf(moving.length, 'holding')} that move with the lowest volatility there is; their sum, ${percentText(total, 2)}, stays.`,
      method,
      weights,
      [
        this.#volatilityLine(weights),
        [
          'Conditions of a minimum',
          residual.toExponential(1),
          `${converged ? 'Met' : 'Not met to the digits wanted: the search ended before'}, after ${countOf(iterations, 'step')}; the largest departure, in units of a correlation.`,
        ],
      ],
      converged,
    )
  }

  async smallestChange(
    target: Target & { readonly kind: 'smallest change' },
    calculator: Calculator,
    work: Work,
  ): Promise<ProposedWeights> {
    const { positions, limits } = this.#ground
    if (limits.length === 0)
      throw new Fault(
        'missing',
        'found no limits',
        'select a table of limits, or give the holdings a limit column',
        {
          argument: 'trades',
        },
      )
    if (target.turnover !== null && !(target.turnover >= 0))
      throw outOfRange(`a turnover of ${percentText(target.turnover, 2)}`, 'one of 0% or more is needed')
    if (target.lot !== null && !(target.lot > 0))
      throw outOfRange(`a lot of ${numberText(target.lot, 4)}`, 'a size above 0 is needed')
    const title = 'Smallest change that meets all limits'
    const most = (limit: Limit): number =>
      (target.against === 'soft' ? (limit.soft ?? limit.hard) : (limit.hard ?? limit.soft)) ?? Infinity
    // what is not held stays so, but for a series that was added: it is there to be bought
    const lower = this.#weights.map((weight) => (weight < 0 ? -Infinity : 0))
    const upper = this.#weights.map((weight, i) => (weight > 0 || positions[i]?.candidate ? Infinity : 0))
    const sought: { readonly limit: Limit; readonly as: ChangeLimit }[] = []
    const left: Limit[] = []
    for (const limit of limits) {
      const [member] = limit.members ?? []
      if (limit.measure === 'weight' && limit.scope === 'holding' && member !== undefined) {
        lower[member] = Math.max(lower[member]!, -most(limit))
        upper[member] = Math.min(upper[member]!, most(limit))
      } else {
        const as = this.#asChangeLimit(limit, most(limit))
        if (as) sought.push({ limit, as })
        else left.push(limit)
      }
    }
    const payer = this.#payer()
    const problem: ChangeProblem = {
      weights: this.#weights,
      limits: sought.map(({ as }) => as),
      financing:
        payer !== null
          ? { kind: 'position', position: payer }
          : { kind: target.net === 'kept' ? 'book' : 'cash' },
      lower,
      upper,
      ...(this.#ground.benchmark ? { benchmark: this.#ground.benchmark } : {}),
      ...(target.turnover === null ? {} : { turnover: target.turnover }),
    }
    const { recipe } = this.#standing.book
    const result = await calculator.run('smallest change', { recipe, problem }, work)
    const lot = target.lot === null ? null : target.lot / (this.#ground.holdings.capital ?? 1)
    const inLots =
      lot === null
        ? null
        : await calculator.run(
            'round to lots',
            { recipe, problem, weights: result.weights, lots: this.#weights.map(() => lot) },
            work,
          )
    const { weights, change, turnover } = inLots ?? result
    const after = this.#ground.basis.profileOf(weights)
    const states = judgeLimits(
      limits.map((limit) => ({ ...limit, soft: null, hard: most(limit) })),
      after,
      null,
    )
    const over = states.filter(({ status }) => status === 'breach')
    const unmeasured = states.filter(({ status }) => status === 'not measured')
    const moved = weights.reduce((count, weight, i) => count + (weight === this.#weights[i] ? 0 : 1), 0)
    const met = result.status === 'met' && over.length === 0 && (inLots?.holds ?? true)
    const paidBy =
      payer !== null
        ? `${quote(positions[payer]?.name ?? '')} takes the difference`
        : target.net === 'kept'
          ? 'the sum of the weights stays'
          : 'cash beyond the holdings takes the difference'
    const toCash = payer === null && target.net === 'free' ? 0 : (inLots?.toCash ?? 0)
    const inCash =
      Math.abs(toCash) > LEAST_CASH
        ? `, but for ${percentText(Math.abs(toCash), 2)} that whole lots ${toCash > 0 ? 'leave to' : 'take from'} cash`
        : ''
    const ends = {
      met:
        inLots && !inLots.holds
          ? 'In whole lots some limit is over: its line says by how much. Smaller lots, or any size, meet them all.'
          : over.length > 0
            ? 'Limits that are not part of the search are still over.'
            : result.note,
      'not found': result.proven
        ? `No weights that meet all limits were found, and there are none. ${result.note}`
        : result.note,
      stopped: `The search ended before it was sure. ${result.note}`,
    } as const
    return this.#found(
      title,
      met
        ? moved === 0
          ? `All limits${unmeasured.length > 0 ? ' that are measured' : ''} hold at the weights in the sheet.`
          : `${countOf(moved, 'weight')} of ${positions.length} change, by ${percentText(change, 2)} in all (turnover ${percentText(turnover, 2)} one way); ${paidBy}${inCash}.`
        : ends[result.status],
      `${result.method} ${target.against === 'soft' ? 'Soft' : 'Hard'} limits, where there are any; long stays long, short stays short, and of what is not held only added series are bought; ${paidBy}${inCash}.`,
      weights,
      [
        this.#volatilityLine(weights),
        [
          'Least change there can be',
          result.leastPossible === Infinity
            ? 'none'
            : result.leastPossible < NO_BOUND
              ? 'not known'
              : percentText(result.leastPossible, 2),
          result.proven && met
            ? 'Proven: no smaller change meets the limits.'
            : 'Limits on shares of risk are not convex, so that a smaller change elsewhere is not ruled out.',
        ],
        ...(inLots
          ? [
              [
                'Rounded to lots',
                percentText(change - result.change, 3),
                `What whole lots add to the sum of changes; the largest difference from the weight asked for is ${percentText(Math.abs(inLots.largest), 3)}${inLots.position >= 0 ? `, of ${quote(positions[inLots.position]?.name ?? '')}` : ''}.`,
              ] as const,
            ]
          : []),
        ...states
          .filter(({ status, used }) => status === 'breach' || (used ?? 0) > 1 - AT_LIMIT)
          .map(({ limit, figure, most: limitOf, status }): readonly [string, string, string] => [
            `${limitOn(limit)}: ${LIMIT_MEASURES[limit.measure].label.toLowerCase()}`,
            figure === null ? 'not measured' : percentText(figure, SHARE_DIGITS),
            `${status === 'breach' ? 'Over' : 'At'} the limit of ${percentText(limitOf, 2)}.`,
          ]),
        ...unmeasured.map(({ limit, why }): readonly [string, string, string] => [
          `${limitOn(limit)}: ${LIMIT_MEASURES[limit.measure].label.toLowerCase()}`,
          'not measured',
          `Whether it holds is not known. ${why ?? ''}`,
        ]),
        ...(left.length === 0
          ? []
          : [
              [
                'Not part of the search',
                countOf(left.length, 'limit'),
                `${listOf(left.map((limit) => `${limitOn(limit)}: ${LIMIT_MEASURES[limit.measure].label.toLowerCase()}`))}: judged afterwards.`,
              ] as const,
            ]),
      ],
      met,
    )
  }

  /** A limit as the search takes it, per period; null where it takes none of that kind. */
  #asChangeLimit({ measure, members, scope }: Limit, most: number): ChangeLimit | null {
    const perPeriod = most / this.#scale
    switch (measure) {
      case 'weight':
        return scope === 'group' ? { measure: 'weight', members, most } : null
      case 'share of risk':
        return { measure: 'share', members, most }
      case 'contribution to risk':
        return { measure: 'contribution', members, most: perPeriod }
      case 'stand-alone risk':
        return { measure: 'stand-alone', members, most: perPeriod }
      case 'volatility':
        return { measure: 'volatility', members: null, most: perPeriod }
      case 'tracking error':
        return this.#ground.benchmark ? { measure: 'tracking error', members: null, most: perPeriod } : null
      case 'value at risk':
      case 'expected shortfall': {
        // under these methods a tail is a multiple of the volatility, whatever the weights
        const { method } = this.#standing.settings.tails
        const tails =
          method.kind === 'normal' || (method.kind === 'student' && method.degrees !== null)
            ? this.#profile.tails()
            : null
        const figure = measure === 'value at risk' ? tails?.valueAtRisk : tails?.shortfall
        return figure
          ? {
              measure: 'volatility',
              members: null,
              most: (most / figure) * (this.#profile.decomposition.volatility / this.#scale),
            }
          : null
      }
    }
  }

  // ---- what the searches share

  /** Positions that have risk; those without are left as they are. */
  #moving(): readonly number[] {
    const moving = [...this.#weights.keys()].filter((i) => (this.#ground.basis.volatilities[i] ?? 0) > 0)
    if (moving.length === 0) throw outOfRange('no holding that moves', 'at least one is needed')
    return moving
  }

  #coreFinancing(): CoreFinancing {
    return financingOf(this.#ground.positions, this.#financing)
  }

  /** The position that takes the difference, or null where cash or the rest of the book does. */
  #payer(): number | null {
    const financing = this.#coreFinancing()
    return financing.kind === 'position' ? financing.position : null
  }

  #paidBy(): string {
    const { positions } = this.#ground
    const payer = this.#payer()
    if (payer !== null) return `${quote(positions[payer]?.name ?? '')} takes the difference`
    return this.#financing.kind === 'pro rata'
      ? 'the rest of the book takes the difference in proportion to its weights'
      : 'cash beyond the holdings takes the difference'
  }

  #membersOf(of: ShareOf): { members: readonly number[]; name: string } {
    const { positions } = this.#ground
    if (of.kind === 'holding') {
      const i = positions.findIndex(({ key }) => key === of.key)
      if (i < 0) throw outOfRange(`no holding ${quote(of.key)}`, 'choose a holding of the book')
      return { members: [i], name: quote(of.key) }
    }
    const group = this.#profile.groups.find(({ header }) => header === of.header)
    const g = group?.labels.indexOf(of.label) ?? -1
    if (!group || g < 0) throw outOfRange(`no group ${quote(of.label)}`, 'choose a group of the book')
    return {
      members: [...group.groupOf.keys()].filter((i) => group.groupOf[i] === g),
      name: quote(of.label),
    }
  }

  #shareOf({ decomposition: { share } }: Profile, members: readonly number[]): number | null {
    return share && members.reduce((sum, i) => sum + (share[i] ?? 0), 0)
  }

  #volatilityLine(weights: Float64Array): readonly [string, string, string] {
    const volatility = this.#ground.basis.profileOf(weights).decomposition.volatility
    return [
      'Volatility',
      percentText(volatility, 2),
      `${percentText(this.#profile.decomposition.volatility, 2)} at the weights in the sheet.`,
    ]
  }

  #found(
    title: string,
    sentence: string,
    method: string,
    weights: Float64Array,
    lines: Proposal['lines'],
    met = true,
  ): ProposedWeights {
    const changed = new Map<string, number>()
    this.#ground.positions.forEach(({ key }, i) => {
      const weight = weights[i] ?? 0
      if (weight !== this.#weights[i]) changed.set(key, weight)
    })
    return { proposal: { title, met, sentence, method, lines }, weights: changed }
  }

  #none(title: string, sentence: string, method: string, met = false): ProposedWeights {
    return { proposal: { title, met, sentence, method, lines: [] }, weights: new Map() }
  }
}

/** What whole lots leave to cash is told from here on; below it is rounding. */
const LEAST_CASH = 1e-9

/** A sum of typed budgets this near to 1 is 1. */
const BUDGET_ROUNDING = 1e-9

/** A bound from below that is told as none: it would show as 0.00%. */
const NO_BOUND = 5e-5

/** A limit used to within this part of it is told as one that binds. */
const AT_LIMIT = 1e-6

const outOfRange = (found: string, needed: string): Fault =>
  new Fault('out-of-range', found, needed, { argument: 'trades' })

import {
  backtest,
  bootstrap,
  completedMoments,
  conditionOf,
  estimateModel,
  factorModel,
  Fault,
  jarqueBera,
  leastVariance,
  mardia,
  matrixModel,
  pairwiseCovariance,
  partOf,
  repairCovariance,
  returnsModel,
  riskBudgetWeights,
  roundToLots,
  shrinkageOf,
  smallestChange,
} from '../core'
import type {
  Backtest,
  BacktestSettings,
  BlockNormality,
  BootstrapChoice,
  BootstrapResult,
  BudgetWeights,
  ChangeProblem,
  ChangeResult,
  Condition,
  CovarianceRepair,
  Estimator,
  HistoryGroup,
  LeastVariance,
  LotsResult,
  RiskModel,
  SeriesNormality,
  Shrinkage,
  WeightBounds,
  Weighting,
} from '../core'
import type { FactsInput, SeriesFacts } from './checks'
import { seriesFacts } from './checks'
import type { GapRule, RepairRule } from './settings'

/** A long action under way: where it tells its progress and hears that it is not wanted any more. */
export interface Work {
  readonly signal: AbortSignal
  /** @param share 0 to 1, or null while there is nothing to measure it by */
  progress(what: string, share: number | null): void
}

/** Returns of dates, row-major, T x n; NaN where there is a gap, for the jobs that allow one. */
interface Returns {
  readonly returns: Float64Array
  readonly dates: number
  readonly size: number
}

/** A risk model as plain data, so that it can be made again where a long computation runs. */
export type ModelRecipe =
  | (Returns & {
      readonly kind: 'estimated'
      readonly estimator: Estimator
      readonly shrinkage: Shrinkage | null
    })
  | (Returns & { readonly kind: 'factors'; readonly factors: Float64Array; readonly count: number })
  | { readonly kind: 'matrix'; readonly matrix: Float64Array; readonly size: number }

function modelFrom(recipe: ModelRecipe): RiskModel {
  switch (recipe.kind) {
    case 'estimated':
      return estimateModel(
        recipe.returns,
        recipe.dates,
        recipe.size,
        recipe.estimator,
        recipe.shrinkage ?? undefined,
      )
    case 'factors':
      return factorModel(recipe.returns, recipe.dates, recipe.size, recipe.factors, recipe.count)
    case 'matrix':
      return matrixModel(recipe.matrix, recipe.size)
  }
}

/** What a book's model needs before it can be asked about weights. */
export interface SetUpInput extends Returns {
  readonly rule: GapRule
  readonly repair: RepairRule
  /** null: a model that is set up elsewhere */
  readonly estimator: Estimator | null
  /** without what is only told beside the figures */
  readonly bare: boolean
  /** the returns of the dates common to all, where `returns` has gaps; else null: the same */
  readonly common: Float64Array | null
}

export interface SetUp {
  readonly shrinkage: Shrinkage | null
  /** the covariance outright, under a rule that gives one */
  readonly matrix: Float64Array | null
  readonly pairs: {
    readonly overlap: { readonly i: number; readonly j: number; readonly dates: number } | null
    readonly repair: Omit<CovarianceRepair, 'matrix'> | null
  } | null
  /** series that start together, and how many longer ones each was completed from; null under another rule */
  readonly completed: readonly HistoryGroup[] | null
  readonly condition: Condition | null
  /** of each series and of all together (null where that would take long), on the dates common to all; null where there are too few */
  readonly normality: {
    readonly series: readonly SeriesNormality[]
    readonly block: BlockNormality | null
  } | null
}

/** The heavy computations: what goes in and what comes out is plain data, as both may cross to a worker and back. */
const JOBS = {
  *'set up'(input: SetUpInput): Generator<number, SetUp> {
    const { returns, dates, size, estimator, rule } = input
    let shrinkage: Shrinkage | null = null
    let matrix: Float64Array | null = null
    let pairs: SetUp['pairs'] = null
    let completed: SetUp['completed'] = null
    if (rule === 'own overlap') {
      const { matrix: raw, smallestOverlap } = yield* partOf(pairwiseCovariance(returns, dates, size), 0, 0.1)
      const { matrix: mended, ...repair } = yield* partOf(repairCovariance(raw, size, input.repair), 0.1, 0.6)
      matrix = mended
      pairs = { overlap: smallestOverlap, repair }
    } else if (rule === 'completed') {
      const moments = yield* partOf(completedMoments(returns, dates, size), 0, 0.6)
      matrix = moments.matrix
      completed = moments.groups
    } else if (estimator?.kind === 'shrinkage')
      shrinkage = yield* partOf(
        shrinkageOf(returnsModel(returns, dates, size, { kind: 'population' }), estimator.target),
        0,
        0.5,
      )
    if (input.bare) return { shrinkage, matrix, pairs, completed, condition: null, normality: null }
    yield 0.6
    const model =
      matrix !== null
        ? matrixModel(matrix, size)
        : estimator && estimateModel(returns, dates, size, estimator, shrinkage ?? undefined)
    const condition = model && (yield* partOf(conditionOf(model), 0.6, 0.8))
    return {
      shrinkage,
      matrix,
      pairs,
      completed,
      condition,
      normality: yield* partOf(normalityOf(input.common ?? returns, size), 0.8, 1),
    }
  },

  *'series facts'(input: FactsInput): Generator<number, SeriesFacts> {
    return yield* seriesFacts(input)
  },

  *bootstrap({
    returns,
    dates,
    size,
    weighting,
    weights,
    choice,
  }: Returns & {
    readonly weighting: Weighting
    readonly weights: Float64Array
    readonly choice: BootstrapChoice
  }): Generator<number, BootstrapResult> {
    return yield* bootstrap(returnsModel(returns, dates, size, weighting), weights, choice)
  },

  *'back-test'({
    returns,
    dates,
    size,
    weights,
    choice,
  }: Returns & {
    readonly weights: Float64Array
    readonly choice: BacktestSettings
  }): Generator<number, Backtest> {
    return yield* backtest(returns, dates, size, weights, choice)
  },

  *'risk budgets'({
    recipe,
    budgets,
  }: {
    readonly recipe: ModelRecipe
    readonly budgets: Float64Array
  }): Generator<number, BudgetWeights> {
    return yield* riskBudgetWeights(modelFrom(recipe), budgets)
  },

  *'least variance'({
    recipe,
    bounds,
  }: {
    readonly recipe: ModelRecipe
    readonly bounds: WeightBounds
  }): Generator<number, LeastVariance> {
    return yield* leastVariance(modelFrom(recipe), bounds)
  },

  *'smallest change'({
    recipe,
    problem,
  }: {
    readonly recipe: ModelRecipe
    readonly problem: ChangeProblem
  }): Generator<number, ChangeResult> {
    return yield* smallestChange(modelFrom(recipe), problem)
  },

  *'round to lots'({
    recipe,
    problem,
    weights,
    lots,
  }: {
    readonly recipe: ModelRecipe
    readonly problem: ChangeProblem
    readonly weights: Float64Array
    readonly lots: Float64Array
  }): Generator<number, LotsResult> {
    return yield* roundToLots(modelFrom(recipe), problem, weights, lots)
  },
}

/** Products beyond which the test of all series together is left out: seconds in which nobody sees any figure. */
const MOST_PRODUCTS = 5e8

/** Dates below which tests of normality say nothing. Our own convention. */
const FEWEST_DATES = 20

function* normalityOf(returns: Float64Array, size: number): Generator<number, SetUp['normality']> {
  const dates = returns.length / size
  if (dates < FEWEST_DATES) return null
  const series: SeriesNormality[] = []
  for (let i = 0; i < size; i++) {
    series.push(jarqueBera(Float64Array.from({ length: dates }, (_, t) => returns[t * size + i]!)))
    if (i % 50 === 49) yield (0.5 * i) / size
  }
  const isLarge = dates * size * (dates + size) > MOST_PRODUCTS
  return {
    series,
    block: isLarge ? null : yield* partOf(mardia(returnsModel(returns, dates, size)), 0.5, 1),
  }
}

type Jobs = typeof JOBS
export type JobKind = keyof Jobs
export type JobInput<K extends JobKind> = Parameters<Jobs[K]>[0]
export type JobResult<K extends JobKind> = ReturnType<Jobs[K]> extends Generator<number, infer R> ? R : never

const WORDS: { readonly [K in JobKind]: string } = {
  'set up': 'Setting up the risk model',
  'series facts': 'Looking over the returns',
  bootstrap: 'Running the bootstrap',
  'back-test': 'Going through time',
  'risk budgets': 'Looking for weights of these risk budgets',
  'least variance': 'Looking for the least variance',
  'smallest change': 'Looking for the smallest change',
  'round to lots': 'Rounding to lots',
}

/** Where long computations run. `entry` wires a worker; without one they run here in slices. */
export interface Calculator {
  /** @throws Fault those of the computation; "cancelled" when the signal says so */
  run<K extends JobKind>(kind: K, input: JobInput<K>, work: Work): Promise<JobResult<K>>
}

/** Starts a computation; each step tells the share done. For whoever drives it: a worker, or the calculator below. */
export const startJob = (kind: JobKind, input: unknown): Generator<number, unknown> =>
  // what crosses to a worker loses its type on the way; kind and input left together
  (JOBS[kind] as (input: unknown) => Generator<number, unknown>)(input)

export const jobWords = (kind: JobKind): string => WORDS[kind]

export const cancelledFault = (): Fault => new Fault('cancelled', 'cancelled by the user', 'start it again')

/** A slice of work on this thread, in milliseconds: short enough for a screen that goes on answering. */
const SLICE_MS = 16

/** Runs computations on this thread, giving way between slices. */
export const steppingCalculator: Calculator = {
  async run(kind, input, work) {
    const steps = startJob(kind, input)
    for (let began = performance.now(); ;) {
      if (work.signal.aborted) throw cancelledFault()
      const step = steps.next()
      if (step.done) return step.value as JobResult<typeof kind>
      if (performance.now() - began < SLICE_MS) continue
      work.progress(jobWords(kind), step.value)
      await new Promise((resume) => setTimeout(resume))
      began = performance.now()
    }
  },
}

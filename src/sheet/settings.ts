import { MOST_LAGS } from '../core'
import type { ActiveConvention, Estimator, TailMethod } from '../core'
import type { Json } from './workbook'

/** What a column of the holdings block holds. */
export const ROLES = [
  'name',
  'weight',
  'amount',
  'exposure',
  'group',
  'currency',
  'benchmark weight',
  'limit',
  'expected return',
  'risk budget',
  'ignore',
] as const
export type Role = (typeof ROLES)[number]

/** Which dates of the returns count. */
export type LookBack =
  | { readonly kind: 'all' }
  | { readonly kind: 'last'; readonly dates: number }
  | { readonly kind: 'since'; readonly date: number }

/** What the covariance is estimated by; 'factors' needs the book's block of factor returns. */
export type EstimatorChoice = Estimator | { readonly kind: 'factors' }

/** What is done about dates on which some holding has no return. */
export const GAP_RULES = ['common dates', 'own overlap', 'completed'] as const
export type GapRule = (typeof GAP_RULES)[number]

/** How a matrix of pairs that does not hold together is mended. */
export const REPAIRS = ['nearest', 'shrunk'] as const
export type RepairRule = (typeof REPAIRS)[number]

/** What the book is measured against; 'column': the benchmark weights of the holdings block, where it has any. */
export type BenchmarkChoice =
  { readonly kind: 'column' } | { readonly kind: 'none' } | { readonly kind: 'series'; readonly name: string }

/**
 * The currency all figures are in, and what the returns of foreign holdings stand in: the base currency, or each its own ('local'), from
 * which they are brought to the base currency first.
 */
export interface CurrencyChoice {
  readonly base: string
  readonly returnsIn: 'base' | 'local'
}

export interface TailChoice {
  readonly method: TailMethod
  /** above 0.5, below 1 */
  readonly confidence: number
  /** the horizon; more than 1 only where the method scales */
  readonly periods: number
}

/** Everything a user chooses about one book; saved with the link. null means: take what the block itself suggests. */
export interface Settings {
  readonly estimator: EstimatorChoice
  readonly gaps: GapRule
  readonly repair: RepairRule
  readonly lookBack: LookBack
  readonly periodsPerYear: number | null
  readonly content: 'returns' | 'prices' | 'covariance' | null
  readonly returnKind: 'simple' | 'log'
  readonly orientation: 'dates down' | 'dates across' | null
  /** what amounts are divided by; null: their sum, while none is negative */
  readonly capital: number | null
  /** holdings marked riskless by the user: they need no column of returns */
  readonly riskless: readonly string[]
  /** roles the user has changed, by the column's header */
  readonly roles: { readonly [header: string]: Role }
  readonly benchmark: BenchmarkChoice
  readonly convention: ActiveConvention
  /** null: risk is not split by currency, and returns are taken as they stand */
  readonly currency: CurrencyChoice | null
  readonly tails: TailChoice
  /** group columns one within the other, by their headers, outermost first; empty: each column by itself */
  readonly nesting: readonly string[]
}

export const DEFAULT_SETTINGS: Settings = {
  estimator: { kind: 'sample' },
  gaps: 'common dates',
  repair: 'nearest',
  lookBack: { kind: 'all' },
  periodsPerYear: null,
  content: null,
  returnKind: 'simple',
  orientation: null,
  capital: null,
  riskless: [],
  roles: {},
  benchmark: { kind: 'column' },
  convention: 'own returns',
  currency: null,
  tails: { method: { kind: 'historical' }, confidence: 0.95, periods: 1 },
  nesting: [],
}

type Tree = { readonly [key: string]: Json }

const treeOf = (json: Json | undefined): Tree =>
  typeof json === 'object' && json !== null && !Array.isArray(json) ? (json as Tree) : {}

const oneOf = <T extends string>(value: Json | undefined, choices: readonly T[]): T | null =>
  choices.find((choice) => choice === value) ?? null

const positive = (value: Json | undefined): number | null =>
  typeof value === 'number' && Number.isFinite(value) && value > 0 ? value : null

/**
 * Settings as they come back from a workbook, which anyone may have edited: each entry that does not read as what it should be falls
 * back to its default and is named in the second result.
 */
export function settingsFromJson(json: Json | undefined): { settings: Settings; unread: readonly string[] } {
  const saved = treeOf(json)
  const unread: string[] = []
  const read = <T>(key: keyof Settings, value: T | null): T | null => {
    if (value === null && saved[key] !== undefined && saved[key] !== null) unread.push(key)
    return value
  }
  const lookBack = treeOf(saved.lookBack)
  const dates = positive(lookBack.dates)
  const date = positive(lookBack.date)
  const roles: [string, Role][] = []
  for (const [header, role] of Object.entries(treeOf(saved.roles))) {
    const known = oneOf(role, ROLES)
    if (known === null) unread.push(`role of ${header}`)
    else roles.push([header, known])
  }
  const settings: Settings = {
    estimator: read('estimator', estimatorFrom(saved.estimator)) ?? DEFAULT_SETTINGS.estimator,
    gaps: read('gaps', oneOf(saved.gaps, GAP_RULES)) ?? DEFAULT_SETTINGS.gaps,
    repair: read('repair', oneOf(saved.repair, REPAIRS)) ?? DEFAULT_SETTINGS.repair,
    lookBack:
      read<LookBack>(
        'lookBack',
        lookBack.kind === 'all'
          ? { kind: 'all' }
          : lookBack.kind === 'last' && dates !== null
            ? { kind: 'last', dates }
            : lookBack.kind === 'since' && date !== null
              ? { kind: 'since', date }
              : null,
      ) ?? DEFAULT_SETTINGS.lookBack,
    periodsPerYear: read('periodsPerYear', positive(saved.periodsPerYear)),
    content: read('content', oneOf(saved.content, ['returns', 'prices', 'covariance'])),
    returnKind: read('returnKind', oneOf(saved.returnKind, ['simple', 'log'])) ?? 'simple',
    orientation: read('orientation', oneOf(saved.orientation, ['dates down', 'dates across'])),
    capital: read('capital', positive(saved.capital)),
    riskless: read('riskless', textsFrom(saved.riskless)) ?? DEFAULT_SETTINGS.riskless,
    // entry by entry: assigning to a heading such as "__proto__" would lose it
    roles: Object.fromEntries(roles),
    benchmark: read('benchmark', benchmarkFrom(saved.benchmark)) ?? DEFAULT_SETTINGS.benchmark,
    convention:
      read('convention', oneOf(saved.convention, ['own returns', 'benchmark-relative returns'])) ??
      DEFAULT_SETTINGS.convention,
    currency: read('currency', currencyFrom(saved.currency)),
    tails: read('tails', tailsFrom(saved.tails)) ?? DEFAULT_SETTINGS.tails,
    nesting: read('nesting', textsFrom(saved.nesting)) ?? DEFAULT_SETTINGS.nesting,
  }
  return { settings, unread }
}

const textsFrom = (json: Json | undefined): readonly string[] | null =>
  Array.isArray(json) ? json.filter((text): text is string => typeof text === 'string') : null

function estimatorFrom(json: Json | undefined): EstimatorChoice | null {
  const { kind, decay, target, lags } = treeOf(json)
  switch (kind) {
    case 'sample':
    case 'factors':
      return { kind }
    case 'exponential': {
      const factor = positive(decay)
      return factor !== null && factor < 1 ? { kind, decay: factor } : null
    }
    case 'shrinkage': {
      const known = oneOf(target, ['identity', 'correlation', 'oas'])
      return known && { kind, target: known }
    }
    case 'lagged': {
      const count = positive(lags)
      return count !== null && Number.isInteger(count) && count <= MOST_LAGS ? { kind, lags: count } : null
    }
    default:
      return null
  }
}

function benchmarkFrom(json: Json | undefined): BenchmarkChoice | null {
  const { kind, name } = treeOf(json)
  if (kind === 'column' || kind === 'none') return { kind }
  return kind === 'series' && typeof name === 'string' ? { kind, name } : null
}

function currencyFrom(json: Json | undefined): CurrencyChoice | null {
  const saved = treeOf(json)
  const base = typeof saved.base === 'string' ? saved.base.trim() : ''
  const returnsIn = oneOf(saved.returnsIn, ['base', 'local'])
  return base !== '' && returnsIn !== null ? { base, returnsIn } : null
}

function tailsFrom(json: Json | undefined): TailChoice | null {
  const saved = treeOf(json)
  const method = treeOf(saved.method)
  const degrees = positive(method.degrees)
  const plain = oneOf(method.kind, ['normal', 'historical', 'cornish-fisher'])
  const known: TailMethod | null =
    plain !== null
      ? { kind: plain }
      : method.kind === 'student' && (method.degrees === null || (degrees !== null && degrees > 2))
        ? { kind: 'student', degrees }
        : null
  const confidence = positive(saved.confidence)
  const periods = positive(saved.periods)
  return known && confidence !== null && confidence > 0.5 && confidence < 1 && periods !== null
    ? { method: known, confidence, periods }
    : null
}

export const settingsToJson = (settings: Settings): Json => ({
  ...settings,
  estimator: { ...settings.estimator },
  lookBack: { ...settings.lookBack },
  benchmark: { ...settings.benchmark },
  currency: settings.currency && { ...settings.currency },
  tails: { ...settings.tails, method: { ...settings.tails.method } },
})

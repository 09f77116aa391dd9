import type { Weighting } from '../core'
import type { Json } from './workbook'

/** What a column of the holdings block holds. */
export const ROLES = [
  'name',
  'weight',
  'amount',
  'exposure',
  'group',
  'benchmark weight',
  'limit',
  'expected return',
  'ignore',
] as const
export type Role = (typeof ROLES)[number]

/** Which dates of the returns count. */
export type LookBack =
  | { readonly kind: 'all' }
  | { readonly kind: 'last'; readonly dates: number }
  | { readonly kind: 'since'; readonly date: number }

/** Everything a user chooses about one book; saved with the link. null means: take what the block itself suggests. */
export interface Settings {
  readonly estimator: Weighting
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
}

export const DEFAULT_SETTINGS: Settings = {
  estimator: { kind: 'sample' },
  lookBack: { kind: 'all' },
  periodsPerYear: null,
  content: null,
  returnKind: 'simple',
  orientation: null,
  capital: null,
  riskless: [],
  roles: {},
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
  const estimator = treeOf(saved.estimator)
  const lookBack = treeOf(saved.lookBack)
  const decay = positive(estimator.decay)
  const dates = positive(lookBack.dates)
  const date = positive(lookBack.date)
  const roles: [string, Role][] = []
  for (const [header, role] of Object.entries(treeOf(saved.roles))) {
    const known = oneOf(role, ROLES)
    if (known === null) unread.push(`role of ${header}`)
    else roles.push([header, known])
  }
  const settings: Settings = {
    estimator:
      read<Weighting>(
        'estimator',
        estimator.kind === 'sample'
          ? { kind: 'sample' }
          : estimator.kind === 'exponential' && decay !== null && decay < 1
            ? { kind: 'exponential', decay }
            : null,
      ) ?? DEFAULT_SETTINGS.estimator,
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
    riskless:
      read('riskless', Array.isArray(saved.riskless) ? saved.riskless : null)?.filter(
        (name): name is string => typeof name === 'string',
      ) ?? DEFAULT_SETTINGS.riskless,
    // entry by entry: assigning to a heading such as "__proto__" would lose it
    roles: Object.fromEntries(roles),
  }
  return { settings, unread }
}

export const settingsToJson = (settings: Settings): Json => ({
  ...settings,
  estimator: { ...settings.estimator },
  lookBack: { ...settings.lookBack },
})

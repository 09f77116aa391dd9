import type { Snapshot, SnapshotHead } from './snapshot'

/** What of a change of risk comes from which cause, in units of volatility; scaled as the results are. */
export interface ChangeParts {
  readonly positions: number
  readonly volatilities: number
  readonly correlations: number
  /** positions once more, by what moved them; null where the returns between the dates do not tell */
  readonly drift: number | null
  readonly trades: number | null
}

/** One holding or group of a comparison. Contributions to risk before and after; the parts add up to their difference. */
export interface ChangeLine extends ChangeParts {
  readonly label: string
  /** held on both dates, or on one of them */
  readonly presence: 'both' | 'new' | 'gone'
  readonly weightFrom: number
  readonly weightTo: number
  /** of one unit; null for a group */
  readonly volatilityFrom: number | null
  readonly volatilityTo: number | null
  readonly contributionFrom: number
  readonly contributionTo: number
  /** of the change of settings, which comes before the other parts; 0 where none changed */
  readonly settings: number
}

/** What changed between two results. */
export interface RiskChange {
  readonly from: SnapshotHead
  /** "now" where it is not kept */
  readonly to: SnapshotHead & { readonly isNow: boolean }
  readonly horizon: Snapshot['horizon']
  readonly change: number
  /** what the settings alone did, and which changed; null where none did */
  readonly settings: {
    /** in units of volatility; null where neither side's data allow it to be told apart: then nothing is split */
    readonly effect: number | null
    readonly changed: readonly { readonly label: string; readonly from: string; readonly to: string }[]
    readonly sentence: string
  } | null
  /** or why the change is not split */
  readonly total: ChangeParts | string
  readonly holdings: readonly ChangeLine[]
  readonly groups: readonly { readonly header: string; readonly lines: readonly ChangeLine[] }[]
  /** of settings and parts, and what it differs from the change by */
  readonly sum: number
  readonly difference: number
  /** what has to be said: what was taken from the other date, why drift is not told, what has no date */
  readonly notes: readonly string[]
}

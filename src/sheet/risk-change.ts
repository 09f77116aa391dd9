import { joinStates, splitChange } from '../core'
import type { RiskChangeSplit, RiskState } from '../core'
import { groupsOf, plainName } from './names'
import type { Settings } from './settings'
import type { Snapshot, SnapshotHead } from './snapshot'
import { headOf } from './snapshot'
import { dateText, listOf, numberText, quote } from './wording'

/** What of a change of risk comes from which cause, in units of volatility; scaled as the results are. */
export interface ChangeParts {
  readonly positions: number
  readonly volatilities: number
  readonly correlations: number
  /** positions once more, by what moved them; null where the returns between the dates do not tell */
  readonly drift: number | null
  readonly trades: number | null
}

/**
 * One holding or group of a comparison. Contributions to risk on either side; settings, positions, volatilities and correlations add up to their
 * difference. Where the change is not split these are NaN, but for settings that are known.
 */
export interface ChangeLine extends ChangeParts {
  readonly label: string
  /** held on both dates, or on one of them */
  readonly presence: 'both' | 'new' | 'gone'
  readonly weightFrom: number
  readonly weightTo: number
  /** of one unit; null for a group, and where it is not held */
  readonly volatilityFrom: number | null
  readonly volatilityTo: number | null
  readonly contributionFrom: number
  readonly contributionTo: number
  /** of the change of settings, which comes before the other parts; 0 where none changed, NaN where it is not known */
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
  /** as printed with either result */
  readonly settingLines: { readonly from: Snapshot['settingLines']; readonly to: Snapshot['settingLines'] }
  /** of settings and parts, and what it differs from the change by; NaN where the change is not split */
  readonly sum: number
  readonly difference: number
  /** what has to be said: what was taken from the other date, why drift is not told, what has no date */
  readonly notes: readonly string[]
}

/** Where a comparison finds what the results themselves do not hold. */
export interface ChangeSources {
  /** the result from its own data under other settings, or its own, and with correlations; or the sentence why not */
  remake(of: Snapshot, under: Settings): Promise<Snapshot | string>
  /** what one unit of each holding has become from one data date to the other, 1 where nothing moved; or the sentence why not */
  growth(names: readonly string[], fromDate: number, toDate: number): Float64Array | string
}

/**
 * What changed between two results: settings first, then positions, volatilities and correlations by `splitChange`, in total, by holding and by group.
 *
 * Changed settings are told apart by making one side again under those of the other: the one compared from, or else the one compared to. Another
 * scaling alone needs no data. Where neither can be made again, where a mix of both has no covariance, or where correlations are not to be had, nothing is
 * split, and it is said why.
 *
 * @param from usually the older one
 * @returns    holdings in the order of `to`, those that are gone after them
 * @throws     what the sources throw
 * @cost       of the sources, up to three models; O(n^2) for the split, O(n^3) with holdings that are new or gone
 */
export async function riskChangeOf(
  from: Snapshot,
  to: Snapshot & { readonly isNow?: boolean },
  sources: ChangeSources,
): Promise<RiskChange> {
  const notes: string[] = []
  if (from.inputsHash === to.inputsHash) notes.push('Both results rest on the same inputs.')
  const same = await underSameSettings(from, to, sources)
  const places = placesOf(from, to)
  const split =
    typeof same.sides === 'string' ? same.sides : await splitOf(same.sides, places, sources, notes)
  const isSplit = typeof split !== 'string'
  const lines = linesOf(from, to, places, same, isSplit ? split : null)
  const parts = isSplit ? totalOf(split) : null
  const change = to.volatility - from.volatility
  const sum = parts
    ? (same.settings?.effect ?? 0) + parts.positions + parts.volatilities + parts.correlations
    : NaN
  const grouping = groupingOf(from, to, places, lines)
  return {
    from: headOf(from),
    to: { ...headOf(to), isNow: to.isNow === true },
    horizon: to.horizon,
    change,
    settings: same.settings,
    total: parts ?? String(split),
    holdings: lines,
    groups: grouping.groups,
    settingLines: { from: from.settingLines, to: to.settingLines },
    sum,
    difference: sum - change,
    notes: [...notes, ...grouping.notes],
  }
}

// ---- settings

type Changed = NonNullable<RiskChange['settings']>['changed']

interface SameSettings {
  /** both results under one set of settings, scaled as `to` is; or why they cannot be brought to one */
  readonly sides: readonly [from: Snapshot, to: Snapshot] | string
  readonly settings: RiskChange['settings']
}

async function underSameSettings(
  from: Snapshot,
  to: Snapshot,
  sources: ChangeSources,
): Promise<SameSettings> {
  const changed = changedSettings(from, to)
  if (changed.length === 0) return { sides: [from, to], settings: null }
  const scaled = scaledAs(from, to)
  const told = (sides: readonly [Snapshot, Snapshot], sentence: string): SameSettings => ({
    sides,
    settings: {
      effect: sides[0].volatility - from.volatility + (to.volatility - sides[1].volatility),
      changed,
      sentence,
    },
  })
  if (changed.every(({ label }) => label === SCALING))
    return told([scaled, to], 'The result compared from is scaled as the other one is; that comes first.')
  const again = await sources.remake(from, settingsFor(from, to))
  if (typeof again !== 'string')
    return told(
      [scaledAs(again, to), to],
      'The result compared from is made again from its own data under the settings of the other one: what that alone does comes before everything else.',
    )
  const back = await sources.remake(to, settingsFor(to, from))
  if (typeof back !== 'string')
    return told(
      [scaled, scaledAs(back, to)],
      `The result compared to is made again from its own data under the settings of the other one, and what that alone does is taken out first. The other way round it cannot be done. ${again}`,
    )
  return {
    sides: `The settings differ, and neither result can be made again under those of the other, so that what they do cannot be told from the rest. Compared from: ${again} Compared to: ${back}`,
    settings: { effect: null, changed, sentence: 'What they do cannot be told from the rest.' },
  }
}

const SCALING = 'Scaling'

/** The settings of another result for the holdings of this one: what only this one holds keeps its own marks. */
function settingsFor(of: Snapshot, like: Snapshot): Settings {
  const known = new Set(like.names.map(plainName))
  const own = of.settings.riskless.filter((name) => !known.has(plainName(name)))
  return { ...like.settings, riskless: [...like.settings.riskless, ...own] }
}

/** A result scaled to the periods of another. */
function scaledAs(snapshot: Snapshot, { periodsPerYear, horizon }: Snapshot): Snapshot {
  if (snapshot.periodsPerYear === periodsPerYear) return snapshot
  const factor = Math.sqrt(periodsPerYear / snapshot.periodsPerYear)
  return {
    ...snapshot,
    volatility: snapshot.volatility * factor,
    volatilities: snapshot.volatilities.map((volatility) => volatility * factor),
    contribution: snapshot.contribution.map((part) => part * factor),
    periodsPerYear,
    horizon,
  }
}

/** Settings that the figures depend on and that differ, as they are printed. Another last date under the same look-back is no setting. */
function changedSettings(from: Snapshot, to: Snapshot): Changed {
  const isMatrix = [from, to].map(({ dates }) => dates === null)
  const changed: { label: string; from: string; to: string }[] = []
  const compare = (label: string, key: (of: Snapshot) => unknown, words?: (of: Snapshot) => string): void => {
    if (JSON.stringify(key(from)) === JSON.stringify(key(to))) return
    const text = words ?? ((of: Snapshot) => lineOf(of, label))
    const [was, is] = [text(from), text(to)]
    // a choice that has no part in either result, such as an estimator beside another rule for gaps
    if (was !== is) changed.push({ label, from: was, to: is })
  }
  if (isMatrix[0] !== isMatrix[1])
    compare(
      'Data',
      ({ dates }) => dates === null,
      ({ dates }) => (dates ? 'Returns' : 'A covariance matrix as given'),
    )
  else if (!isMatrix[0]) {
    const [was, is] = [from.settings.content, to.settings.content]
    if (was !== null && is !== null) compare('Data', ({ settings }) => settings.content, contentText)
    compare('Kind of returns', ({ settings }) => settings.returnKind, kindText)
    compare('Estimator', ({ settings }) => settings.estimator)
    compare('Rule for gaps', ({ settings }) => settings.gaps)
    if ([from, to].every(({ settings }) => settings.gaps === 'own overlap'))
      compare('Repair of pairs', ({ settings }) => settings.repair, repairText)
    compare('Look-back', ({ settings }) => settings.lookBack)
  }
  const both = new Set(to.names.map(plainName))
  const shared = new Set(from.names.map(plainName).filter((name) => both.has(name)))
  const marked = ({ settings }: Snapshot): readonly string[] =>
    settings.riskless.filter((name) => shared.has(plainName(name)))
  compare(
    'Riskless',
    (of) => marked(of).map(plainName).sort(),
    (of) => (marked(of).length === 0 ? 'None' : marked(of).join(', ')),
  )
  compare(
    'Base currency',
    ({ settings: { currency } }) => currency && [plainName(currency.base), currency.returnsIn],
  )
  compare(SCALING, ({ periodsPerYear, horizon }) => [periodsPerYear, horizon])
  return changed
}

const lineOf = ({ settingLines }: Snapshot, label: string): string =>
  settingLines.find(([name]) => name === label)?.[1] ?? 'None chosen'

const contentText = ({ settings }: Snapshot): string => (settings.content === 'prices' ? 'Prices' : 'Returns')

const kindText = ({ settings }: Snapshot): string =>
  settings.returnKind === 'log' ? 'Log returns' : 'Simple returns'

const repairText = ({ settings }: Snapshot): string =>
  settings.repair === 'nearest' ? 'The nearest correlation matrix' : 'All correlations made smaller alike'

// ---- holdings of both

/** Where each holding stands in either result, -1 where it does not: those of `to` in their order, then those that are gone. */
interface Places {
  readonly from: Int32Array
  readonly to: Int32Array
}

function placesOf(from: Snapshot, to: Snapshot): Places {
  const [was, is] = [keysOf(from.names), keysOf(to.names)]
  const before = new Map(was.map((key, i) => [key, i]))
  const still = new Set(is)
  const gone = [...was.keys()].filter((i) => !still.has(was[i]!))
  return {
    from: Int32Array.from([...is.map((key) => before.get(key) ?? -1), ...gone]),
    to: Int32Array.from([...is.keys(), ...gone.map(() => -1)]),
  }
}

/** Names that differ in case and spacing alone are one; of several holdings with one name the first is the first. */
function keysOf(names: readonly string[]): readonly string[] {
  const counts = new Map<string, number>()
  return names.map((name) => {
    const plain = plainName(name)
    const count = (counts.get(plain) ?? 0) + 1
    counts.set(plain, count)
    return `${count} ${plain}`
  })
}

const nameAt = (from: Snapshot, to: Snapshot, places: Places, i: number): string =>
  to.names[places.to[i]!] ?? from.names[places.from[i]!] ?? ''

// ---- the split

/** Parts by holding; or why there are none. What has to be said beside them goes to the notes. */
async function splitOf(
  sides: readonly [Snapshot, Snapshot],
  places: Places,
  sources: ChangeSources,
  notes: string[],
): Promise<RiskChangeSplit | string> {
  const [before, after] = sides
  const states: RiskState[] = []
  for (const side of sides) {
    const correlations = await correlationsOf(side, sources)
    if (typeof correlations === 'string')
      return `The correlations of the result compared ${side === before ? 'from' : 'to'} were not kept, as its holdings are many. ${correlations}`
    states.push({ weights: side.weights, volatilities: side.volatilities, correlations })
  }
  const joined = joinStates(states[0]!, states[1]!, places.from, places.to)
  const name = (i: number): string => quote(nameAt(before, after, places, i))
  if (joined.unknown)
    return `The correlation between ${name(joined.unknown.i)} and ${name(joined.unknown.j)} is in neither result, and a mix of the two would need it.`
  const least = joined.smallest.from ?? joined.smallest.to
  if (least !== null)
    return `A holding that is held on one side alone takes its correlations there from the other side, and with them those of the result compared ${joined.smallest.from === null ? 'to' : 'from'} fit together no more: a portfolio of these holdings could have a variance below 0 (least eigenvalue of the correlations ${numberText(least, 4)}).`
  notes.push(...takenNotes(before, after, places))
  const drifted = driftedWeights(before, after, sources)
  if (typeof drifted === 'string') {
    notes.push(`Positions are not parted into drift and trades. ${drifted}`)
    return splitChange(joined.from, joined.to)
  }
  notes.push(
    `Drift of weights: what returns after ${dateText(before.dataDate ?? NaN)} up to ${dateText(after.dataDate ?? NaN)} made of the weights compared from, nothing traded. Weights are taken as shares of capital; what they leave to 100% counts as cash that earns nothing.`,
  )
  return splitChange(
    joined.from,
    joined.to,
    Float64Array.from(places.from, (place) => drifted[place] ?? 0),
  )
}

async function correlationsOf(side: Snapshot, sources: ChangeSources): Promise<Float64Array | string> {
  if (side.correlations) return side.correlations
  const again = await sources.remake(side, side.settings)
  if (typeof again === 'string') return again
  return again.correlations ?? 'They are not to be had from its data either.'
}

/** What the sides lack and take from each other. */
function takenNotes(before: Snapshot, after: Snapshot, places: Places): readonly string[] {
  const all = [...places.to.keys()]
  const names = (which: readonly number[]): string =>
    listOf(which.map((i) => quote(nameAt(before, after, places, i))))
  const added = all.filter((i) => places.from[i]! < 0)
  const gone = all.filter((i) => places.to[i]! < 0)
  const still = (a: Snapshot, at: Int32Array, b: Snapshot, bt: Int32Array): readonly number[] =>
    all.filter((i) => a.volatilities[at[i]!] === 0 && (b.volatilities[bt[i]!] ?? 0) > 0)
  const taken = (
    which: readonly number[],
    head: string,
    side: string,
    otherSide: string,
  ): readonly string[] =>
    which.length === 0
      ? []
      : [
          `${head}: ${names(which)}. ${which.length === 1 ? 'Its volatility' : 'Their volatilities'} and correlations on the side compared ${side} are taken from the side compared ${otherSide}.`,
        ]
  const risklessFrom = still(before, places.from, after, places.to)
  const risklessTo = still(after, places.to, before, places.from)
  const unmoved = (which: readonly number[], side: string, otherSide: string): readonly string[] =>
    which.length === 0
      ? []
      : [
          `${names(which)} ${which.length === 1 ? 'does' : 'do'} not move on the side compared ${side}: correlations are taken from the side compared ${otherSide}.`,
        ]
  return [
    ...taken(added, 'New', 'from', 'to'),
    ...taken(gone, 'Gone', 'to', 'from'),
    ...unmoved(risklessFrom, 'from', 'to'),
    ...unmoved(risklessTo, 'to', 'from'),
  ]
}

/**
 * The weights of a result after returns between the two data dates, nothing traded:
 *
 *   w_i g_i / (1 + sum of w_j (g_j - 1)),   g the growth of one unit; of riskless holdings and of cash 1
 *
 * @returns in the order of `before`; or the sentence why not
 */
function driftedWeights(
  { names, weights, volatilities, dataDate }: Snapshot,
  after: Snapshot,
  sources: ChangeSources,
): Float64Array | string {
  const until = after.dataDate
  if (dataDate === null || until === null)
    return `The data of the result compared ${dataDate === null ? 'from' : 'to'} have no dates.`
  if (until === dataDate)
    return `Both results rest on data to ${dateText(until)}: prices had no time to move.`
  if (until < dataDate)
    return `The result compared to rests on older data (to ${dateText(until)}) than the one compared from (to ${dateText(dataDate)}).`
  const moving = [...names.keys()].filter((i) => weights[i] !== 0 && (volatilities[i] ?? 0) > 0)
  const asked = sources.growth(
    moving.map((i) => names[i] ?? ''),
    dataDate,
    until,
  )
  if (typeof asked === 'string') return asked
  const growth = new Float64Array(names.length).fill(1)
  moving.forEach((i, k) => {
    growth[i] = asked[k] ?? NaN
  })
  const capital = weights.reduce((sum, weight, i) => sum + weight * (growth[i]! - 1), 1)
  if (!(capital > 0))
    return 'The returns between the two dates would have taken all of the capital, which leaves nothing that weights are shares of.'
  return weights.map((weight, i) => (weight * growth[i]!) / capital)
}

const sumOf = (values: Float64Array): number => values.reduce((sum, value) => sum + value, 0)

const totalOf = (split: RiskChangeSplit): ChangeParts => ({
  positions: sumOf(split.positions),
  volatilities: sumOf(split.volatilities),
  correlations: sumOf(split.correlations),
  drift: split.drift && sumOf(split.drift),
  trades: split.trades && sumOf(split.trades),
})

// ---- lines

function linesOf(
  from: Snapshot,
  to: Snapshot,
  places: Places,
  { sides, settings }: SameSettings,
  split: RiskChangeSplit | null,
): readonly ChangeLine[] {
  const [before, after] = typeof sides === 'string' ? [from, to] : sides
  return Array.from(places.to, (is, i): ChangeLine => {
    const was = places.from[i]!
    const at = (values: Float64Array, place: number): number => (place < 0 ? 0 : values[place]!)
    const effect =
      at(before.contribution, was) -
      at(from.contribution, was) +
      (at(to.contribution, is) - at(after.contribution, is))
    return {
      label: nameAt(from, to, places, i),
      presence: was < 0 ? 'new' : is < 0 ? 'gone' : 'both',
      weightFrom: at(from.weights, was),
      weightTo: at(to.weights, is),
      volatilityFrom: was < 0 ? null : from.volatilities[was]!,
      volatilityTo: is < 0 ? null : to.volatilities[is]!,
      contributionFrom: at(from.contribution, was),
      contributionTo: at(to.contribution, is),
      settings: settings?.effect === null ? NaN : effect,
      positions: split?.positions[i] ?? NaN,
      volatilities: split?.volatilities[i] ?? NaN,
      correlations: split?.correlations[i] ?? NaN,
      drift: split?.drift?.[i] ?? null,
      trades: split?.trades?.[i] ?? null,
    }
  })
}

/** Lines by each group column that both results have: a holding is in the group it is in now, or was in last, on both sides. */
function groupingOf(
  from: Snapshot,
  to: Snapshot,
  places: Places,
  lines: readonly ChangeLine[],
): { readonly groups: RiskChange['groups']; readonly notes: readonly string[] } {
  const notes: string[] = []
  const plainHeaders = [from, to].map(({ groupHeaders }) => groupHeaders.map(plainName))
  const lone = [
    ...to.groupHeaders.filter((header) => !plainHeaders[0]!.includes(plainName(header))),
    ...from.groupHeaders.filter((header) => !plainHeaders[1]!.includes(plainName(header))),
  ]
  if (lone.length > 0)
    notes.push(`Not told by ${listOf(lone.map(quote))}: one of the two results has no such column.`)
  const groups = to.groupHeaders.flatMap((header, column) => {
    const place = plainHeaders[0]!.indexOf(plainName(header))
    if (place < 0) return []
    const was = Array.from(places.from, (k) => (k < 0 ? null : (from.groups[k]?.[place] ?? '')))
    const is = Array.from(places.to, (k) => (k < 0 ? null : (to.groups[k]?.[column] ?? '')))
    const moved = lines.filter((_, i) => {
      const [earlier, later] = [was[i] ?? null, is[i] ?? null]
      return earlier !== null && later !== null && plainName(earlier) !== plainName(later)
    })
    if (moved.length > 0)
      notes.push(
        `${header}: ${listOf(moved.map(({ label }) => quote(label)))} ${moved.length === 1 ? 'has' : 'have'} another label than before, and ${moved.length === 1 ? 'counts' : 'count'} under the later one on both sides.`,
      )
    const { groupOf, labels } = groupsOf(lines.map((_, i) => is[i] ?? was[i]))
    return [
      {
        header,
        lines: labels.map((label, group) =>
          sumOfLines(
            label,
            lines.filter((_, i) => groupOf[i] === group),
          ),
        ),
      },
    ]
  })
  return { groups, notes }
}

function sumOfLines(label: string, lines: readonly ChangeLine[]): ChangeLine {
  const sum = (of: (line: ChangeLine) => number): number => lines.reduce((total, line) => total + of(line), 0)
  const known = (of: (line: ChangeLine) => number | null): number | null =>
    lines.some((line) => of(line) === null) ? null : sum((line) => of(line) ?? 0)
  const all = (presence: ChangeLine['presence']): boolean => lines.every((line) => line.presence === presence)
  return {
    label,
    presence: all('new') ? 'new' : all('gone') ? 'gone' : 'both',
    weightFrom: sum(({ weightFrom }) => weightFrom),
    weightTo: sum(({ weightTo }) => weightTo),
    volatilityFrom: null,
    volatilityTo: null,
    contributionFrom: sum(({ contributionFrom }) => contributionFrom),
    contributionTo: sum(({ contributionTo }) => contributionTo),
    settings: sum(({ settings }) => settings),
    positions: sum(({ positions }) => positions),
    volatilities: sum(({ volatilities }) => volatilities),
    correlations: sum(({ correlations }) => correlations),
    drift: known(({ drift }) => drift),
    trades: known(({ trades }) => trades),
  }
}

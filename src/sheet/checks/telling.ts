import type { Area } from '../cells'
import { addressOf } from '../cells'
import type { Finding } from '../findings'
import { byGravity } from '../findings'
import { countOf } from '../wording'
import type { Correction } from './corrections'
import type { Evidence, Held } from './evidence'
import { wholeSeries } from './evidence'

/** In the order in which they are told where they weigh alike. */
const KINDS = [
  'prices among returns',
  'percents',
  'constant',
  'short history',
  'ends early',
  'gaps',
  'mixed frequency',
  'missed split',
  'outlier',
  'stale prices',
  'serial correlation',
  'closing times',
  'few dates',
  'starts late',
  'dates',
  'rules on history',
] as const
export type CheckKind = (typeof KINDS)[number]

/** A fault suspected in the data. The sentence says where and what; the area is the first of `areas`. */
export interface Check extends Finding {
  readonly kind: CheckKind
  /** what it does to the figures */
  readonly effect: string
  /** what can be done, in the sheet or with a choice */
  readonly remedy: string
  readonly corrections: readonly Correction[]
  /** all cells concerned, and the holdings or series they belong to */
  readonly areas: readonly Area[]
  readonly names: readonly string[]
}

/** What a look at the data finds. Series that it explains need no second word, and are not open to the looks that follow. */
export interface Found {
  readonly checks: readonly Check[]
  readonly explains?: readonly Held[]
}

/** Looks for one fault; `open` are the held series that nothing graver explains yet. */
export type Look = (evidence: Evidence, open: readonly Held[]) => Found

export interface Advice {
  readonly effect: string
  readonly remedy: string
  readonly corrections?: readonly Correction[]
}

/** What is seen at some cells. The text is the sentence without the address that it begins with. */
interface Sight {
  /** nothing here stops: what cannot be read has stopped the reading already */
  readonly weight: 'warns' | 'notes'
  readonly text: string
  readonly areas: readonly Area[]
}

/** One suspicion about one series, before those of a kind are told together. */
export interface Suspicion extends Sight {
  readonly held: Held
}

/** A suspicion about all the returns of a series. */
export const suspect = (evidence: Evidence, held: Held, text: string): Suspicion => ({
  held,
  weight: 'warns',
  text,
  areas: wholeSeries(evidence, held),
})

/** More of a kind than this are told in one line. */
const MOST_ONE_BY_ONE = 2

/** The suspicions that are told in one line. */
export type Told<S extends Suspicion = Suspicion> = readonly [S, ...S[]]

/** Few suspicions of a kind are told one by one; of many the first is told and the others are counted. */
export function told<S extends Suspicion>(
  kind: CheckKind,
  suspicions: readonly S[],
  advise: (about: Told<S>) => Advice,
  [one, many]: readonly [one: string, many: string] = ['series', 'series'],
): readonly Check[] {
  const [first, ...others] = suspicions
  if (!first) return []
  const lines: readonly Told<S>[] =
    suspicions.length > MOST_ONE_BY_ONE ? [[first, ...others]] : suspicions.map((suspicion) => [suspicion])
  return lines.map((line) => {
    const more = line.length - 1
    const alike = more > 0 ? ` ${countOf(more, `more ${one}`, `more ${many}`)} like it.` : ''
    return lineOf({
      kind,
      weight: line.some(({ weight }) => weight === 'warns') ? 'warns' : 'notes',
      text: line[0].text + alike,
      areas: line.flatMap(({ areas }) => areas),
      names: [...new Set(line.map(({ held }) => held.name))],
      ...advise(line),
    })
  })
}

/** A line about the block, or about several series; `at` is where the sentence points, the first area unless it is said. */
export function lineOf({
  kind,
  weight,
  text,
  areas,
  at = areas[0],
  names = [],
  effect,
  remedy,
  corrections = [],
}: Sight &
  Advice & { readonly kind: CheckKind; readonly at?: Area; readonly names?: readonly string[] }): Check {
  return {
    kind,
    weight,
    sentence: at ? `${addressOf(at)}: ${text}` : text,
    area: areas[0] ?? null,
    areas,
    names,
    effect,
    remedy,
    corrections,
  }
}

/** The gravest first; where they weigh alike in the order of their kinds. */
export function inOrder(checks: readonly Check[]): readonly Check[] {
  const order = ({ kind }: Check): number => KINDS.indexOf(kind)
  return byGravity([...checks].sort((a, b) => order(a) - order(b))) as readonly Check[]
}

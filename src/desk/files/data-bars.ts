/**
 * Data bars, between the file's vocabulary and the stand-in's. Other conditional formats are left out, and so are borders of
 * bars; the library leaves out a direction that is set to the right, which is where bars go in sheets that read that way.
 */
import type { ConditionalFormattingRule, DataBarRuleType } from '@cj-tech-master/excelts/browser'
import type { DataBar } from '../office'
import { textOf, type Parts } from './archive'

type End = NonNullable<DataBarRuleType['cfvo']>[number]

const KINDS = {
  Number: 'num',
  Percent: 'percent',
  Percentile: 'percentile',
  Formula: 'formula',
  LowestValue: 'min',
  HighestValue: 'max',
} as const

const DIRECTIONS = { Context: 'context', LeftToRight: 'leftToRight', RightToLeft: 'rightToLeft' } as const

const keyOf = <Key extends string, Value>(table: Record<Key, Value>, value: unknown): Key | undefined =>
  (Object.keys(table) as Key[]).find((key) => table[key] === value)

export function fileRule(
  { lower, upper, fill, gradient, direction }: DataBar,
  priority: number,
): DataBarRuleType {
  const end = ({ type, formula }: DataBar['lower'], automatic: 'autoMin' | 'autoMax'): End => {
    const kind = type in KINDS ? KINDS[type as keyof typeof KINDS] : automatic
    const number = Number(formula)
    return {
      type: kind,
      ...(formula !== undefined && { value: kind === 'formula' ? formula : number }),
    } as End
  }
  return {
    type: 'dataBar',
    priority,
    cfvo: [end(lower, 'autoMin'), end(upper, 'autoMax')],
    color: { argb: `FF${fill.replace('#', '').toUpperCase()}` },
    gradient,
    direction: DIRECTIONS[direction as keyof typeof DIRECTIONS],
  }
}

/** How bars look beyond what the first edition of the format could say, by the id that a rule has for it. */
export type BarLooks = ReadonlyMap<string, Pick<DataBar, 'gradient' | 'direction'>>

/** The library reads the rules without these. */
export function barLooksIn(parts: Parts): BarLooks {
  const looks = new Map<string, Pick<DataBar, 'gradient' | 'direction'>>()
  for (const path of Object.keys(parts)) {
    if (!/^xl\/worksheets\/[^/]+\.xml$/.test(path)) continue
    for (const [, rule = '', bar = ''] of textOf(parts, path)?.matchAll(
      /<x14:cfRule\b([^>]*)>\s*<x14:dataBar\b([^>]*)>/g,
    ) ?? []) {
      const id = /\bid="([^"]*)"/.exec(rule)?.[1]
      if (id === undefined) continue
      looks.set(id, {
        gradient: !/\bgradient="(?:0|false)"/.test(bar),
        direction: keyOf(DIRECTIONS, /\bdirection="([^"]*)"/.exec(bar)?.[1]) ?? 'Context',
      })
    }
  }
  return looks
}

/** A bar as the file has it; null for another kind of format. */
export function gridBar(
  rule: ConditionalFormattingRule & { readonly x14Id?: string },
  id: string,
  looks: BarLooks,
): DataBar | null {
  if (rule.type !== 'dataBar' || rule.cfvo?.length !== 2 || !rule.color?.argb) return null
  const [lower, upper] = rule.cfvo.map((end): DataBar['lower'] => {
    const type = keyOf(KINDS, end.type) ?? 'Automatic'
    return { type, ...(end.value !== undefined && { formula: String(end.value) }) }
  })
  return (
    (lower &&
      upper && {
        id,
        lower,
        upper,
        fill: `#${rule.color.argb.slice(-6).toUpperCase()}`,
        border: '',
        ...(looks.get(rule.x14Id ?? '') ?? { gradient: true, direction: 'Context' }),
      }) ??
    null
  )
}

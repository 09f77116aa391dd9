import type { Area, Block, CellValue, Culture } from '../cells'
import { addressOf, cellOf, isBlank } from '../cells'
import type { Finding } from '../findings'
import { byGravity } from '../findings'
import type { HoldingsReading } from '../holdings'
import { readNumber } from '../holdings'
import { groupsOf, plainName } from '../names'
import { countOf, listOf, numberText, percentText, quote } from '../wording'
import type { Limit, LimitMeasure, LimitScope } from './limit'
import { LIMIT_MEASURES, limitText } from './limit'

/** A table of limits, as read. Rows that do not read give no limit, and a finding that stops says so. */
export interface LimitsReading {
  readonly area: Area
  readonly limits: readonly Limit[]
  readonly summary: string
  readonly findings: readonly Finding[]
}

/** How a measure may be spelt, hyphens, case, spaces and what stands in brackets aside. */
const SPELLINGS: { readonly [M in LimitMeasure]: readonly string[] } = {
  weight: ['weight', 'weights', 'net weight', 'absolute weight'],
  'share of risk': [
    'share of risk',
    'risk share',
    'share of volatility',
    'percent contribution to risk',
    'percent contribution',
    'percent of risk',
  ],
  'contribution to risk': [
    'contribution to risk',
    'contribution',
    'risk contribution',
    'contribution to volatility',
  ],
  'stand-alone risk': [
    'stand alone risk',
    'standalone risk',
    'stand alone',
    'standalone',
    'stand alone volatility',
  ],
  volatility: ['volatility', 'total volatility', 'portfolio volatility', 'total risk', 'standard deviation'],
  'tracking error': ['tracking error', 'ex ante tracking error', 'active risk'],
  'value at risk': ['value at risk', 'var'],
  'expected shortfall': ['expected shortfall', 'shortfall'],
}

const MEASURES = Object.keys(LIMIT_MEASURES) as readonly LimitMeasure[]

/** Measures that go with a scope, as a list to choose from. */
const measuresFor = (scope: LimitScope): string =>
  MEASURES.filter((measure) => isMeasureOf(measure, scope)).join(', ')

const isMeasureOf = (measure: LimitMeasure, scope: LimitScope): boolean =>
  (LIMIT_MEASURES[measure].scopes as readonly LimitScope[]).includes(scope)

/** The measure of a text, or null; what is said beyond its name, such as a confidence, is not read and makes it none. */
function measureOf(typed: string): LimitMeasure | null {
  const text = plainName(
    typed
      .replace(/\([^)\d]*\)/g, ' ')
      .replace(/[-\u2010-\u2015]/g, ' ')
      .replace(/^\s*%/, 'percent '),
  )
  return MEASURES.find((measure) => SPELLINGS[measure].includes(text)) ?? null
}

/** The measure that the heading of a column of limits names: "Limit on share of risk", "Maximum weight", "Soft limit on contribution". */
function measureOfHeading(heading: string): {
  readonly measure: LimitMeasure | null
  readonly soft: boolean
} {
  const text = plainName(heading.replace(/\([^)]*\)/g, ' ')).replace(/\s*%$/, '')
  const soft = /^soft\b/.test(text)
  const named = text
    .replace(/^(?:soft|hard)\s+/, '')
    .replace(/^(?:limit|maximum|max\.?|ceiling|cap)\s*(?:(?:on|for|of)\s+)?(?:the\s+)?/, '')
    .replace(/\s*\b(?:limit|maximum|max\.?|ceiling|cap)$/, '')
  return { measure: measureOf(named), soft }
}

type Part = 'scope' | 'name' | 'measure' | 'soft' | 'hard'

/** Headings are matched in this order, so that "Warning level" is no scope and "Limit on" no limit. */
const HEADINGS: readonly (readonly [Part, RegExp])[] = [
  ['soft', /\b(soft|warning|early)\b/i],
  ['scope', /\b(scope|level|limit on|applies to)\b/i],
  ['measure', /\b(measure|figure)\b/i],
  ['name', /\b(name|label|holding|position|group)\b/i],
  ['hard', /\b(hard|limit|maximum|max|ceiling|cap)\b/i],
]

/** So far down headings are looked for. */
const MOST_ROWS_ABOVE = 10

/** A limit beyond this is asked about: 15 is 1,500%. Our own convention. */
const LARGE = 3

const TOTAL = new Set(['total', 'book', 'portfolio', 'whole book', 'the book', 'the whole book'])
const HOLDING = new Set(['holding', 'position', 'holdings', 'positions'])
const GROUP = new Set(['group', 'groups'])

/**
 * Reads a table of limits: a selected block with a row of headings, in any order and under titles where there are some.
 *
 *   scope     total | holding | group | the heading of a group column
 *   name      the holding, or the label of the group; blank for the total
 *   measure   for a holding or a group: weight, share of risk, contribution to risk, stand-alone risk
 *             for the total: volatility, tracking error, value at risk, expected shortfall
 *   soft, hard   fractions or percentages, as numbers or as text; either may be blank
 *
 * A weight is compared without its sign, that of a group as the net of its holdings. Value at risk and expected shortfall are those
 * of the confidence and the horizon the book is set to.
 *
 * @param holdings  that names and labels are looked up in
 * @returns         limits in sheet order; every cell that does not read is a finding with its address, and its row gives no limit
 * @cost            O(rows x columns)
 */
export function readLimits(block: Block, holdings: HoldingsReading, culture: Culture): LimitsReading {
  const { area, values } = block
  const findings: Finding[] = []
  const limits: Limit[] = []
  const done = (): LimitsReading => ({
    area,
    limits,
    summary: summaryOf(limits),
    findings: byGravity(findings),
  })

  const headerRow = values.findIndex(
    (row, k) => k < MOST_ROWS_ABOVE && partsOf(row).has('measure') && partsOf(row).size > 1,
  )
  if (headerRow < 0) {
    findings.push({
      weight: 'stops',
      sentence: `${addressOf(area)}: found no headings of a table of limits; scope, name, measure, soft and hard are needed in one row.`,
      area,
    })
    return done()
  }
  const headings = values[headerRow] ?? []
  const parts = partsOf(headings)
  for (const [column, heading] of headings.entries()) {
    if (isBlank(heading) || [...parts.values()].includes(column)) continue
    const part = partOf(heading)
    findings.push(
      part === null
        ? {
            weight: 'notes',
            sentence: `${quote(heading)} is no part of a limit: its column is left out.`,
            area: cellOf(area, headerRow, column),
          }
        : {
            weight: 'stops',
            sentence: `${addressOf(cellOf(area, headerRow, column))}: found ${quote(heading)} beside ${quote(headings[parts.get(part) ?? 0])}; one column for the ${WORDS[part]} is needed.`,
            area: cellOf(area, headerRow, column),
          },
    )
  }
  const missing = [
    parts.has('scope') ? [] : ['the scope'],
    parts.has('soft') || parts.has('hard') ? [] : ['the hard limit'],
  ].flat()
  if (missing.length > 0) {
    const heads = { ...cellOf(area, headerRow, 0), columns: area.columns }
    findings.push({
      weight: 'stops',
      sentence: `${addressOf(heads)}: found no heading for ${listOf(missing)}; scope, measure and a hard or a soft limit are needed.`,
      area: heads,
    })
    return done()
  }

  const blank: string[] = []
  const textNumbers: string[] = []
  for (let row = headerRow + 1; row < values.length; row++) {
    const cell = (part: Part): CellValue => values[row]?.[parts.get(part) ?? -1] ?? ''
    if ([...parts.keys()].every((part) => isBlank(cell(part)))) continue
    const place = (part: Part): Area => cellOf(area, row, parts.get(part) ?? 0)
    const faults: Finding[] = []
    const stop = (part: Part, sentence: string): null => {
      faults.push({ weight: 'stops', sentence: `${addressOf(place(part))}: ${sentence}`, area: place(part) })
      return null
    }
    const text = (part: Part): string => String(cell(part)).trim()
    const on = standingOn(text('scope'), text('name'), holdings, stop)
    const measure = measureFor(text('measure'), on?.scope ?? null, stop)
    const number = (part: 'soft' | 'hard'): number | null => {
      const read = readNumber(cell(part), culture)
      if (read.fault) return stop(part, `${read.fault}; a ${WORDS[part]} is needed, or a blank.`)
      if (read.value !== null && measure !== null) {
        const fault = faultOf(read.value, measure)
        if (fault !== null) return stop(part, fault)
      }
      if (read.fromText) textNumbers.push(addressOf(place(part)))
      return read.value
    }
    const soft = number('soft')
    const hard = number('hard')
    if (faults.length === 0 && soft !== null && hard !== null && soft > hard)
      stop(
        'soft',
        `found a soft limit of ${percentText(soft, 2)} above the hard one of ${percentText(hard, 2)}; one at or below it is needed.`,
      )
    findings.push(...faults)
    if (faults.length > 0 || on === null || measure === null) continue
    if (soft === null && hard === null) {
      blank.push(String(area.row + row + 1))
      continue
    }
    limits.push({ ...on, measure, soft, hard, cell: place(hard === null ? 'soft' : 'hard') })
  }
  if (blank.length > 0)
    findings.push({
      weight: 'notes',
      sentence: `${blank.length === 1 ? 'Row' : 'Rows'} ${listOf(blank)} ${blank.length === 1 ? 'has' : 'have'} neither a soft nor a hard limit and ${blank.length === 1 ? 'is' : 'are'} left out.`,
      area: null,
    })
  if (textNumbers.length > 0)
    findings.push({
      weight: 'notes',
      sentence: `${countOf(textNumbers.length, 'limit')} typed as text read as numbers (${listOf(textNumbers, 2)}).`,
      area: null,
    })
  if (limits.length === 0 && findings.every(({ weight }) => weight !== 'stops'))
    findings.push({
      weight: 'warns',
      sentence: `${addressOf(area)}: found no limits below the headings.`,
      area,
    })
  findings.push(...largeLimits(limits), ...doubledLimits(limits))
  return done()
}

const WORDS: { readonly [P in Part]: string } = {
  scope: 'scope',
  name: 'name',
  measure: 'measure',
  soft: 'soft limit',
  hard: 'hard limit',
}

const partOf = (heading: CellValue): Part | null =>
  typeof heading === 'string' ? (HEADINGS.find(([, sign]) => sign.test(heading))?.[0] ?? null) : null

/** The column of each part, the first that names it. */
function partsOf(row: readonly CellValue[]): ReadonlyMap<Part, number> {
  const parts = new Map<Part, number>()
  row.forEach((heading, column) => {
    const part = partOf(heading)
    if (part !== null && !parts.has(part)) parts.set(part, column)
  })
  return parts
}

type Stop = (part: Part, sentence: string) => null
type Standing = Pick<Limit, 'scope' | 'header' | 'name' | 'members'>

/** What a row's scope and name mean in this book. */
function standingOn(scope: string, name: string, holdings: HoldingsReading, stop: Stop): Standing | null {
  const { groupHeaders } = holdings
  const plain = plainName(scope)
  const column = groupHeaders.findIndex((header) => plainName(header) === plain)
  if (column >= 0) return inColumn(column, name, holdings, stop)
  if (HOLDING.has(plain)) return oneHolding(name, holdings, stop)
  if (TOTAL.has(plain))
    return name === '' || TOTAL.has(plainName(name))
      ? { scope: 'total', header: null, name: '', members: null }
      : stop(
          'name',
          `found ${quote(name)} beside the scope ${quote(scope)}; a blank is needed, or another scope.`,
        )
  if (GROUP.has(plain)) {
    const columns = groupHeaders.flatMap((_, k) => (labelIn(k, name, holdings) ? [k] : []))
    const [first] = columns
    if (columns.length > 1)
      return stop(
        'scope',
        `found ${quote(scope)}, and ${quote(name)} is a label of ${listOf(columns.map((k) => quote(groupHeaders[k])))}; the heading of one of them is needed as the scope.`,
      )
    if (first !== undefined) return inColumn(first, name, holdings, stop)
    return groupHeaders.length === 0
      ? stop(
          'scope',
          `found ${quote(scope)}, but the holdings have no group column; total or holding is needed.`,
        )
      : unknownName(
          name,
          groupHeaders.flatMap((_, k) => labelsOf(k, holdings)),
          `a label of ${listOf(groupHeaders.map(quote), groupHeaders.length)}`,
          stop,
        )
  }
  const choices = ['total', 'holding', ...groupHeaders.map(quote)]
  return stop(
    'scope',
    `found ${scope === '' ? 'a blank' : quote(scope)}; ${choices.slice(0, -1).join(', ')} or ${choices.at(-1) ?? ''} is needed.`,
  )
}

function oneHolding(name: string, { holdings, area }: HoldingsReading, stop: Stop): Standing | null {
  const exact = holdings.findIndex((holding) => holding.name === name)
  const alike = holdings.flatMap((holding, i) => (plainName(holding.name) === plainName(name) ? [i] : []))
  if (exact < 0 && alike.length > 1)
    return stop(
      'name',
      `${quote(name)} is like ${countOf(alike.length, 'holding')} in ${addressOf(area)}; one is needed: spell it as it stands there.`,
    )
  const i = exact < 0 ? alike[0] : exact
  if (i === undefined)
    return unknownName(
      name,
      holdings.map((holding) => holding.name),
      `the name of a holding in ${addressOf(area)}`,
      stop,
    )
  return { scope: 'holding', header: null, name: holdings[i]?.name ?? name, members: Int32Array.of(i) }
}

const grouping = (column: number, { holdings }: HoldingsReading): ReturnType<typeof groupsOf> =>
  groupsOf(holdings.map(({ groups }) => groups[column]))

const labelsOf = (column: number, holdings: HoldingsReading): readonly string[] =>
  grouping(column, holdings).labels

const labelIn = (column: number, name: string, holdings: HoldingsReading): boolean =>
  labelsOf(column, holdings).some((label) => plainName(label) === plainName(name))

function inColumn(column: number, name: string, holdings: HoldingsReading, stop: Stop): Standing | null {
  const header = holdings.groupHeaders[column] ?? ''
  const { groupOf, labels } = grouping(column, holdings)
  const g = labels.findIndex((label) => plainName(label) === plainName(name))
  if (g < 0) return unknownName(name, labels, `a label of ${quote(header)}`, stop)
  const members = [...groupOf.keys()].filter((i) => groupOf[i] === g)
  return { scope: 'group', header, name: labels[g] ?? name, members: Int32Array.from(members) }
}

function unknownName(name: string, known: readonly string[], needed: string, stop: Stop): null {
  if (name === '') return stop('name', `found a blank; ${needed} is needed.`)
  const alike = nearest(name, known)
  return stop(
    'name',
    `found ${quote(name)}; ${needed} is needed${alike === null ? '' : `: ${quote(alike)} is spelt nearly like it`}.`,
  )
}

/** The name that needs the fewest changes of letters, where these are few beside its length. */
function nearest(name: string, known: readonly string[]): string | null {
  const typed = plainName(name)
  let best: string | null = null
  let least = Math.max(1, Math.floor(typed.length / 4)) + 1
  for (const other of known) {
    const changes = changesBetween(typed, plainName(other))
    if (changes < least) [best, least] = [other, changes]
  }
  return best
}

/** Letters to put in, take out or replace to make one word of another (Levenshtein 1966; from memory). */
function changesBetween(a: string, b: string): number {
  let before = Array.from({ length: b.length + 1 }, (_, j) => j)
  for (let i = 1; i <= a.length; i++) {
    const now = [i]
    for (let j = 1; j <= b.length; j++)
      now[j] = Math.min(before[j]! + 1, now[j - 1]! + 1, before[j - 1]! + (a[i - 1] === b[j - 1] ? 0 : 1))
    before = now
  }
  return before[b.length]!
}

function measureFor(typed: string, scope: LimitScope | null, stop: Stop): LimitMeasure | null {
  const measure = measureOf(typed)
  const needed = scope === null ? MEASURES.join(', ') : measuresFor(scope)
  if (measure === null)
    return stop(
      'measure',
      /\d/.test(typed)
        ? `found ${quote(typed)}; one of these is needed, without figures beside it: ${needed}. Large losses are measured at the book’s own confidence and horizon.`
        : `found ${typed === '' ? 'a blank' : quote(typed)}; one of these is needed: ${needed}.`,
    )
  return scope === null || isMeasureOf(measure, scope)
    ? measure
    : stop(
        'measure',
        `found ${quote(typed)} for ${scope === 'total' ? 'the total' : `one ${scope}`}; one of these is needed: ${needed}.`,
      )
}

/** Figures that cannot be below 0 can keep no limit that is. */
const faultOf = (limit: number, measure: LimitMeasure): string | null =>
  limit < 0 && measure !== 'share of risk' && measure !== 'contribution to risk'
    ? `found ${percentText(limit, 2)}; a limit on ${measure} of 0 or more is needed.`
    : null

function largeLimits(limits: readonly Limit[]): readonly Finding[] {
  const large = limits.filter(({ soft, hard }) => Math.max(soft ?? 0, hard ?? 0) > LARGE)
  const [first] = large
  if (!first?.cell) return []
  const value = Math.max(first.soft ?? 0, first.hard ?? 0)
  const others = large.length > 1 ? ` ${large.length - 1} more like it.` : ''
  return [
    {
      weight: 'warns',
      sentence: `${addressOf(first.cell)}: a limit of ${numberText(value, 2)} is ${percentText(value, 0)}: does it stand in percent points? It is used as it stands.${others}`,
      area: first.cell,
    },
  ]
}

const keyOf = ({ scope, header, name, measure }: Limit): string =>
  JSON.stringify([scope, header, plainName(name), measure])

/** Several limits on one figure: all of them are judged, and it is said. */
function doubledLimits(limits: readonly Limit[], earlier: readonly Limit[] = []): readonly Finding[] {
  const first = new Map(earlier.map((limit) => [keyOf(limit), limit]))
  return limits.flatMap((limit): readonly Finding[] => {
    const other = first.get(keyOf(limit))
    if (!other) {
      first.set(keyOf(limit), limit)
      return []
    }
    const where = (cell: Area | null): string => (cell ? addressOf(cell) : 'the holdings')
    return [
      {
        weight: 'warns',
        sentence: `${where(limit.cell)}: a second limit on the ${limitText(limit)} (first in ${where(other.cell)}): both are judged.`,
        area: limit.cell,
      },
    ]
  })
}

function summaryOf(limits: readonly Limit[]): string {
  const count = (scope: LimitScope): number => limits.filter((limit) => limit.scope === scope).length
  const [total, holding, group] = [count('total'), count('holding'), count('group')]
  const parts = [
    total > 0 ? `${total} on the total` : '',
    holding > 0 ? `${holding} on holdings` : '',
    group > 0 ? `${group} on groups` : '',
  ].filter((part) => part !== '')
  return parts.length === 0 ? 'no limits' : `${countOf(limits.length, 'limit')}: ${listOf(parts)}`
}

/**
 * The limits in a column of the holdings, whose heading says the measure: "Limit on share of risk", "Maximum weight", "Contribution limit". A heading
 * that says none, such as "Limit", is asked about and its column judged by nothing.
 *
 * @returns limits in sheet order; blank cells are no limit
 */
export function columnLimits(reading: HoldingsReading): {
  readonly limits: readonly Limit[]
  readonly findings: readonly Finding[]
} {
  const column = reading.columns.findIndex(({ role }) => role === 'limit')
  const { limitHeader, holdings, area } = reading
  if (limitHeader === null || column < 0 || holdings.every(({ limit }) => limit === null))
    return { limits: [], findings: [] }
  const { measure, soft } = measureOfHeading(limitHeader)
  if (measure === null || !isMeasureOf(measure, 'holding'))
    return {
      limits: [],
      findings: [
        {
          weight: 'warns',
          sentence: `${quote(limitHeader)} of the holdings ${measure === null ? 'says no measure' : `speaks of ${measure}, which one holding has no limit on`}, so nothing is judged by it; a heading with one of these is needed: ${measuresFor('holding')} (such as “Limit on share of risk”).`,
          area: { ...area, column: area.column + column, columns: 1 },
        },
      ],
    }
  const findings: Finding[] = []
  const limits = holdings.flatMap(({ name, limit, cell }, i): readonly Limit[] => {
    if (limit === null) return []
    const place = { ...cell, column: area.column + column }
    const fault = faultOf(limit, measure)
    if (fault !== null) {
      findings.push({ weight: 'stops', sentence: `${addressOf(place)}: ${fault}`, area: place })
      return []
    }
    return [
      {
        scope: 'holding',
        header: null,
        name,
        measure,
        soft: soft ? limit : null,
        hard: soft ? null : limit,
        cell: place,
        members: Int32Array.of(i),
      },
    ]
  })
  return { limits, findings: [...findings, ...largeLimits(limits)] }
}

/** All limits of a book: those of its table, then those of the column of its holdings. */
export function limitsOf(
  holdings: HoldingsReading,
  table: LimitsReading | null,
): { readonly limits: readonly Limit[]; readonly findings: readonly Finding[] } {
  const column = columnLimits(holdings)
  const own = table?.limits ?? []
  return {
    limits: [...own, ...column.limits],
    findings: [...(table?.findings ?? []), ...column.findings, ...doubledLimits(column.limits, own)],
  }
}

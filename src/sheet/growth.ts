import type { Area, CellValue, Culture } from './cells'
import { addressOf, isBlank, overlap, sameArea } from './cells'
import type { HoldingsReading } from './holdings'
import { readHoldings } from './holdings'
import type { LimitsReading } from './limits'
import { readLimits } from './limits'
import { dateInCell } from './numbers'
import type { ReturnsReading } from './returns'
import type { Settings } from './settings'
import type { Seen, Workbook } from './workbook'
import { countOf, dateText, listOf, quote } from './wording'

/** Rows or columns that have appeared at the edge of a linked block and would belong to it. */
export interface Growth {
  readonly part: 'holdings' | 'returns' | 'limits'
  /** the block with them */
  readonly wider: Area
  readonly sentence: string
}

interface Known {
  readonly holdings: HoldingsReading | null
  readonly returns: ReturnsReading | null
  readonly limits: LimitsReading | null
  readonly settings: Settings
  readonly culture: Culture
}

/**
 * Finds what was appended to the linked blocks: holdings below, newer dates and further series beside the returns, limits below. A total, a note or
 * one of our own tables there is none.
 *
 * @param seen  where the blocks lie, with the filled region around them
 * @param isAnswered tells which wider areas the user has been asked about already
 * @cost  nothing while no region reaches beyond its block; else a request or two for the edge alone
 */
export async function growthBeside(
  workbook: Workbook,
  seen: {
    readonly holdings: Seen
    readonly returns: Seen
    readonly limits: Seen | null
    readonly table: Area | null
  },
  known: Known,
  isAnswered: (wider: Area) => boolean,
): Promise<readonly Growth[]> {
  const own = [seen.holdings.area, seen.returns.area, seen.limits?.area ?? null, seen.table].filter(
    (area) => area !== null,
  )
  const reach = ({ area, region }: Seen, sideways: boolean): Area | null => {
    if (!region) return null
    const wider = {
      ...area,
      rows: Math.max(area.rows, region.row + region.rows - area.row),
      columns: sideways ? Math.max(area.columns, region.column + region.columns - area.column) : area.columns,
    }
    if (sameArea(wider, area) || isAnswered(wider)) return null
    return own.some((other) => !sameArea(other, area) && overlap(other, wider)) ? null : wider
  }
  const found: Growth[] = []
  const moreHoldings = reach(seen.holdings, false)
  if (moreHoldings) {
    const reading = readHoldings(
      await workbook.read(moreHoldings, { shape: true }),
      known.settings,
      known.culture,
    )
    const more = reading.holdings.slice(known.holdings?.holdings.length ?? 0)
    if (more.length > 0 && reading.findings.every(({ weight }) => weight !== 'stops'))
      found.push({
        part: 'holdings',
        wider: moreHoldings,
        sentence: `${countOf(more.length, 'further holding')} found below ${addressOf(seen.holdings.area)}: ${listOf(more.map(({ name }) => quote(name)))}.`,
      })
  }
  const moreReturns = reach(seen.returns, true)
  const what =
    moreReturns && known.returns
      ? await moreOf(workbook, seen.returns.area, moreReturns, known.returns, known.culture)
      : null
  if (moreReturns && what)
    found.push({
      part: 'returns',
      wider: moreReturns,
      sentence: `${what} found beside ${addressOf(seen.returns.area)}.`,
    })
  const moreLimits = seen.limits && reach(seen.limits, false)
  if (moreLimits && seen.limits && known.holdings && known.limits) {
    const block = await workbook.read(moreLimits, { shape: true })
    const reading = readLimits(block, known.holdings, known.culture)
    const more = reading.limits.length - known.limits.limits.length
    // a remark below the table is no limit, and neither is a row that does not read
    if (more > 0 && reading.findings.length <= known.limits.findings.length)
      found.push({
        part: 'limits',
        wider: moreLimits,
        sentence: `${countOf(more, 'further limit')} found below ${addressOf(seen.limits.area)}.`,
      })
  }
  return found
}

/** Says what a wider returns block would add; null when what stands there is neither dates nor named series. */
async function moreOf(
  workbook: Workbook,
  area: Area,
  wider: Area,
  { orientation, dates }: ReturnsReading,
  culture: Culture,
): Promise<string | null> {
  const below = { ...wider, row: area.row + area.rows, rows: wider.rows - area.rows, columns: 1 }
  const right = {
    ...wider,
    column: area.column + area.columns,
    columns: wider.columns - area.columns,
    rows: 1,
  }
  const [dateCells, nameCells] = orientation === 'dates across' ? [right, below] : [below, right]
  const valuesOf = async (part: Area): Promise<readonly CellValue[]> =>
    part.rows > 0 && part.columns > 0 ? (await workbook.read(part)).values.flat() : []
  const found: string[] = []
  const days = dates ? (await valuesOf(dateCells)).map((value) => dateInCell(value, culture)) : []
  if (days.includes(null)) return null
  if (days.length > 0) {
    const newest = dates?.at(-1) ?? -Infinity
    const kind = days.every((day) => day !== null && day > newest) ? 'newer date' : 'further date'
    const last = days.reduce((latest: number, day) => Math.max(latest, day ?? 0), 0)
    found.push(`${countOf(days.length, kind)} to ${dateText(last)}`)
  }
  const names = await valuesOf(nameCells)
  if (names.some((value) => typeof value !== 'string' || isBlank(value))) return null
  if (names.length > 0)
    found.push(`${countOf(names.length, 'further series', 'further series')} (${listOf(names.map(quote))})`)
  return found.length > 0 ? listOf(found) : null
}

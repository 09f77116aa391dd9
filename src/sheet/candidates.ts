import type { Blocks } from './book-model'
import type { Holding } from './holdings'
import { matchHoldings } from './matching'
import { plainName } from './names'
import type { Settings } from './settings'

/** Series of returns that no holding goes with; none where the blocks match by place. */
export function unheldSeries({ holdings, returns, match }: Blocks): readonly string[] {
  if (!returns.names || !holdings.named) return []
  const held = new Set(match.seriesOf)
  return returns.names.filter((_, series) => !held.has(series))
}

/**
 * The blocks of a book with series that are not held as further positions at weight 0, after the holdings. A series of that name that is held by
 * now adds nothing.
 */
export function withCandidates(blocks: Blocks, names: readonly string[], settings: Settings): Blocks {
  const { holdings, returns } = blocks
  const unheld = new Map(unheldSeries(blocks).map((name) => [plainName(name), name]))
  const added = names.flatMap((name): Holding[] => {
    const series = unheld.get(plainName(name))
    if (series === undefined) return []
    return [
      {
        name: series,
        weight: 0,
        amount: null,
        groups: holdings.groupHeaders.map(() => ''),
        currency: '',
        benchmark: null,
        limit: null,
        expected: null,
        budget: null,
        cell: returns.seriesCell(returns.names?.indexOf(series) ?? 0),
      },
    ]
  })
  if (added.length === 0) return blocks
  const wide = { ...holdings, holdings: [...holdings.holdings, ...added] }
  return {
    ...blocks,
    holdings: wide,
    match: matchHoldings(wide, returns, settings.riskless, settings.currency),
  }
}

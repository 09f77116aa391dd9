import type { Blocks } from '../book-model'
import type { Settings } from '../settings'
import { fewDates, rulesOnHistory } from './amount'
import { paceOfDates } from './dates'
import { evidenceOf, isQuiet } from './evidence'
import { farReturns } from './far-returns'
import { gaps, histories } from './histories'
import type { SeriesFacts } from './series-facts'
import { constantSeries, stalePrices } from './stillness'
import type { Check, Look } from './telling'
import { inOrder } from './telling'
import { closingTimes, serialCorrelation } from './time-correlation'
import { percents, pricesAmongReturns } from './units'

export type { Correction } from './corrections'
export { factsInput, seriesFacts } from './series-facts'
export type { FactsInput, SeriesFacts } from './series-facts'
export type { Check, CheckKind } from './telling'

/** A series without risk to speak of is not asked how it moves. */
const quietSeries: Look = (evidence) => ({
  checks: [],
  explains: evidence.held.filter((held) => isQuiet(evidence, held)),
})

/** The graver before what it would explain. */
const LOOKS: readonly Look[] = [
  pricesAmongReturns,
  percents,
  constantSeries,
  histories,
  gaps,
  paceOfDates,
  farReturns,
  quietSeries,
  stalePrices,
  serialCorrelation,
  closingTimes,
  fewDates,
  rulesOnHistory,
]

/**
 * Looks for faults in the data of a book. Nothing is changed by it: what can be mended comes with its corrections, and the user chooses.
 * Only series that are held, the benchmark or a currency of the holdings are told of; many findings of one kind are one line.
 *
 * @param facts of the same returns and look-back
 * @returns     the gravest first; none for a covariance matrix
 * @cost        O(T n)
 */
export function checksOf(blocks: Blocks, settings: Settings, facts: SeriesFacts): readonly Check[] {
  if (blocks.returns.content === 'covariance') return []
  const evidence = evidenceOf(blocks, settings, facts)
  if (evidence.held.length === 0 || evidence.inView < 2) return []
  const checks: Check[] = []
  const explained = new Set<number>()
  for (const look of LOOKS) {
    const found = look(
      evidence,
      evidence.held.filter(({ series }) => !explained.has(series)),
    )
    checks.push(...found.checks)
    for (const { series } of found.explains ?? []) explained.add(series)
  }
  return inOrder(checks)
}

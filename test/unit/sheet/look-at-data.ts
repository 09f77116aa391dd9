import type { Block, ReturnsReading, Settings } from '../../../src/sheet'
import { DEFAULT_SETTINGS, matchHoldings, PLAIN_CULTURE, readHoldings, readReturns } from '../../../src/sheet'
import { addressOf } from '../../../src/sheet'
import { checksOf, type Check } from '../../../src/sheet/checks'
import { factsInput, seriesFacts, type FactsInput, type SeriesFacts } from '../../../src/sheet/checks'

export function factsOf(input: FactsInput): SeriesFacts {
  const steps = seriesFacts(input)
  for (;;) {
    const step = steps.next()
    if (step.done) return step.value
  }
}

/** Reads both blocks as a book does and looks for faults in the data. */
export function lookAt(
  holdingsBlock: Block,
  returnsBlock: Block,
  chosen: Partial<Settings> = {},
): { checks: readonly Check[]; returns: ReturnsReading; settings: Settings } {
  const settings = { ...DEFAULT_SETTINGS, ...chosen }
  const returns = readReturns(returnsBlock, settings, PLAIN_CULTURE)
  const holdings = readHoldings(holdingsBlock, settings, PLAIN_CULTURE)
  const match = matchHoldings(holdings, returns, settings.riskless)
  const input = factsInput(returns, settings)
  const checks = input ? checksOf({ match, holdings, returns, factors: null }, settings, factsOf(input)) : []
  return { checks, returns, settings }
}

/** A check as a test compares it: its kind and its cells. */
export const placesOf = ({ kind, areas }: Check): readonly [string, readonly string[]] => [
  kind,
  areas.map(addressOf),
]

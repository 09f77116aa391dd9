/** Results to be kept, of books made up for the tests. */
import type { Blocks, CellValue, Settings } from '../../../src/sheet'
import { breakDown, DEFAULT_SETTINGS, matchHoldings, readHoldings, readReturns } from '../../../src/sheet'
import { snapshotOf } from '../../../src/sheet/snapshot'
import { blockOf, ENGLISH, modelFor } from './blocks-of-cells'

export const FRIDAY = 46353

/**
 * Weekly returns between -2% and 2%, newest on a Friday, from a linear congruential generator (constants of Numerical Recipes, from memory).
 * The newest rows are the same however many weeks there are.
 */
export function weekly(names: readonly string[], weeks: number, last = FRIDAY): CellValue[][] {
  let state = 12345
  const next = (): number => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0
    return (state / 2 ** 32 - 0.5) / 25
  }
  const rows = Array.from({ length: weeks }, (_, t) => [last - 7 * t, ...names.map(next)]).reverse()
  return [['Week ending', ...names], ...rows]
}

/** Blocks as a book reads them. */
export function blocksOf(
  holdings: readonly (readonly CellValue[])[],
  returns: readonly (readonly CellValue[])[],
  settings: Settings = DEFAULT_SETTINGS,
): Blocks {
  const held = readHoldings(blockOf(holdings), settings, ENGLISH)
  const read = readReturns(blockOf(returns, 'Returns'), settings, ENGLISH)
  const match = matchHoldings(held, read, settings.riskless, settings.currency)
  return { holdings: held, returns: read, match, factors: null }
}

/** The result of blocks as a book computes it. */
export async function resultOf(
  blocks: Blocks,
  {
    settings = DEFAULT_SETTINGS,
    id = '1',
    title = 'Harbour book',
    note = '',
    keptOn = FRIDAY + 2,
    extent = 'kept' as 'kept' | 'whole',
  } = {},
) {
  const book = await modelFor(blocks, settings)
  const breakdown = breakDown(blocks, book, settings)
  return snapshotOf({ id, title, note, keptOn, blocks, book, settings, breakdown }, extent)
}

export const NAMES = ['Northern shares', '=Southern shares', 'Harbour bonds', 'Deposit']

export const HOLDINGS: CellValue[][] = [
  ['Holding', 'Class', 'Weight'],
  ['Northern shares', 'Shares', 0.5],
  ['=Southern shares', '', 0.3],
  ['Harbour bonds', '007', -0.2],
  ['Deposit', 'Cash', 0.4],
]

export const SETTINGS: Settings = { ...DEFAULT_SETTINGS, riskless: ['Deposit'] }

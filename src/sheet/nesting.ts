import { groupDecomposition } from '../core'
import type { Decomposition, RiskModel } from '../core'
import type { Holding } from './holdings'
import { groupsOf, plainName } from './names'

/** One group in a nesting of group columns; its children split it by the next column. */
export interface NestedGroup {
  readonly label: string
  /** the column it comes from */
  readonly header: string
  readonly weight: number
  /** the volatility of its positions held alone */
  readonly standAlone: number
  readonly contribution: number
  readonly share: number | null
  readonly children: readonly NestedGroup[]
  /** its positions, where it is innermost; empty further out */
  readonly positions: readonly number[]
}

/**
 * Adds positions up by group columns one within the other, outermost first. A level's groups add up to their parent, the outermost to
 * the whole.
 *
 * @param headers  all group columns of the holdings
 * @param nesting  some of them, in the order wanted; any others are left out
 * @cost           one pass of the model for each group of each level
 */
export function nestedGroups(
  model: RiskModel,
  d: Decomposition,
  holdings: readonly Holding[],
  headers: readonly string[],
  nesting: readonly string[],
): readonly NestedGroup[] {
  const columns = nesting.map((header) => headers.indexOf(header)).filter((column) => column >= 0)
  // positions outside the branch are in one group more, which nobody looks at
  const split = (members: readonly number[], depth: number): readonly NestedGroup[] => {
    const column = columns[depth]
    if (column === undefined) return []
    const { groupOf: own, labels } = groupsOf(members.map((i) => holdings[i]?.groups[column]))
    const groupOf = new Int32Array(d.weights.length).fill(labels.length)
    members.forEach((i, k) => (groupOf[i] = own[k]!))
    const parts = groupDecomposition(model, d, groupOf, labels.length + 1)
    return labels.map((label, g) => {
      const positions = members.filter((i) => groupOf[i] === g)
      return {
        label,
        header: headers[column] ?? '',
        weight: parts.weight[g]!,
        standAlone: parts.standAlone[g]!,
        contribution: parts.contribution[g]!,
        share: parts.share ? parts.share[g]! : null,
        children: split(positions, depth + 1),
        positions: depth === columns.length - 1 ? positions : [],
      }
    })
  }
  return columns.length < 2 ? [] : split([...d.weights.keys()], 0)
}

/** The nesting with a column put in or taken out; a column put in comes innermost. */
export const withColumn = (nesting: readonly string[], header: string, within: boolean): readonly string[] =>
  within
    ? [...nesting.filter((other) => plainName(other) !== plainName(header)), header]
    : nesting.filter((other) => plainName(other) !== plainName(header))

import { Fault } from '../core'
import type { Area } from './cells'
import { explain } from './explain'

/**
 * Something found while reading. 'stops' has to be mended before figures can be computed, 'warns' changes what the figures mean,
 * 'notes' is good to know. The area is where to look.
 */
export interface Finding {
  readonly weight: 'stops' | 'warns' | 'notes'
  readonly sentence: string
  readonly area: Area | null
}

const ORDER = { stops: 0, warns: 1, notes: 2 } as const

/** The gravest first, otherwise as found. */
export const byGravity = (findings: readonly Finding[]): readonly Finding[] =>
  [...findings].sort((a, b) => ORDER[a.weight] - ORDER[b.weight])

/**
 * Many findings of one kind are one line: the first is told, the rest counted.
 * @param sentences of one kind, the first in reading order
 */
export function firstAndCount(found: readonly Finding[], noun: string): readonly Finding[] {
  const first = found[0]
  if (!first || found.length < 3) return found
  return [{ ...first, sentence: `${first.sentence} ${found.length - 1} more ${noun} like it.` }]
}

/** A Fault whose place in the sheet is known. */
export class PlacedFault extends Fault {
  constructor(
    readonly finding: Finding,
    argument: string,
  ) {
    super('shape', finding.sentence, '', { argument })
  }
}

/** The sentence for a fault as the pane says it: beside the field concerned, so without the name of that field. */
export const sentenceOf = (fault: Fault): string =>
  fault instanceof PlacedFault ? fault.finding.sentence : explain(fault, () => '')

export const areaOf = (fault: Fault): Area | null =>
  fault instanceof PlacedFault ? fault.finding.area : null

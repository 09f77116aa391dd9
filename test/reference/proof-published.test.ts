/**
 * The proof held against figures that others have computed or printed: not ours alone, but the cells that a workbook's formulas come to agree
 * with them. Source and status of each stand in proof-books.ts and in data/README.md; tolerance as there.
 */
import { absoluteGap, relativeGap } from '../closeness'
import { column, expectAgreement, figure, type ProofReading } from '../proof-reading'
import { proofsOf } from '../proofs'
import { computedBooks, publishedBooks } from './proof-books'

jest.setTimeout(300_000)

const references = [...computedBooks(), ...publishedBooks()]

const proofs = proofsOf(references.map(({ book }) => book))

/** Where each figure stands in the sheet: the holdings come first, their groups after them. */
const PLACES: Record<string, (proof: ProofReading) => number | number[]> = {
  volatility: (proof) => figure(proof, /^Volatility (a year|per period)$/),
  standAlone: (proof) => column(proof, 'Stand-alone risk'),
  marginal: (proof) => column(proof, 'Marginal contribution to risk'),
  contribution: (proof) => column(proof, 'Contribution to risk'),
  share: (proof) => column(proof, 'Share of risk'),
  beta: (proof) => column(proof, 'Beta to portfolio'),
  groupContribution: (proof) => column(proof, 'Contribution to risk', 1),
  groupShare: (proof) => column(proof, 'Share of risk', 1),
  groupStandAlone: (proof) => column(proof, 'Stand-alone risk', 1),
  trackingError: (proof) => figure(proof, /^Tracking error/),
  trackingErrorParts: (proof) => column(proof, 'Contribution to tracking error'),
  valueAtRisk: (proof) => figure(proof, /^Value at risk$/),
  shortfall: (proof) => figure(proof, /^Expected shortfall$/),
  shortfallParts: (proof) => column(proof, 'Part of shortfall'),
}

/** Parts under a normal distribution are in proportion to the contributions, and stand in the sheet as those and the total. */
const partsOf = (proof: ProofReading, name: string): number | number[] => {
  if (name !== 'shortfallParts' || proof.pairs.some(({ head }) => head === 'Part of shortfall'))
    return PLACES[name]!(proof)
  const [total, volatility] = [PLACES['shortfall']!(proof), PLACES['volatility']!(proof)] as [number, number]
  return column(proof, 'Contribution to risk').map((part) => (part * total) / volatility)
}

describe.each(references.map((one) => [one.book.name, one.source, one] as const))(
  'The proof of “%s” (%s)',
  (_name, _source, { book, expected, tolerance }) => {
    proofs.inBoth('comes to their figures in', book, (proof) => {
      expectAgreement(proof, 1e-10)
      expect(Object.keys(expected).length).toBeGreaterThan(0)
      for (const [figure, theirs] of Object.entries(expected)) {
        const found = partsOf(proof, figure)
        const [gap, allowed] =
          typeof tolerance === 'number'
            ? [relativeGap(found, theirs as number[]), tolerance]
            : [absoluteGap(found, theirs as number[]), tolerance[figure] ?? NaN]
        if (!(gap <= allowed))
          throw new Error(`${figure}: ${String(found)} against ${String(theirs)}, ${gap} apart of ${allowed}`)
      }
    })
  },
)

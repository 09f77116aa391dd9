/**
 * That the proof can fail: figures of ours that are wrong are marked, in both engines, and so are figures that the book has left behind. And
 * that it holds at the sizes it is meant for. The errors are planted; the true figures are those of the formulas.
 */
import type { Breakdown } from '../../src/sheet/breakdown'
import { proofTable, type ProofInput } from '../../src/sheet/proof'
import type { EstimatorChoice, Settings } from '../../src/sheet/settings'
import type { Table } from '../../src/sheet/table'
import { itInCalc } from '../calc'
import { DIFFERS, expectAgreement, readProof, type ProofReading } from '../proof-reading'
import { proofsOf } from '../proofs'
import {
  computed,
  cornerOf,
  workedOut,
  workedOutByCalc,
  type BookCells,
  type Shown,
  type Workout,
} from '../recalculation'
import { awkwardBooks, largeBook } from './proof-books'

jest.setTimeout(300_000)

const tolerance = 1e-10

const named = (name: string): BookCells => {
  const book = awkwardBooks().find((one) => one.name === name)
  if (!book) throw new Error(`no book ${name}`)
  return book
}
const differing = ({ results }: ProofReading): string[] =>
  results.filter(({ said }) => said === DIFFERS).map(({ label }) => label)

/** The same figures with one number changed. */
const nudged = (values: Float64Array, at: number, by: number): Float64Array =>
  values.map((value, k) => (k === at ? value + by : value))

describe('An error planted in our figures', () => {
  const GROUPS = named('Groups')
  const under = (book: BookCells, more: Partial<Settings>): BookCells => ({
    ...book,
    settings: { ...book.settings, ...more },
  })
  const plant = async (
    book: BookCells,
    wrong: (right: Breakdown) => Breakdown | Promise<Breakdown>,
  ): Promise<ProofInput> => {
    const input = await computed(book)
    return { ...input, breakdown: await wrong(input.breakdown) }
  }
  const split = (right: Breakdown, change: Partial<Breakdown['decomposition']>): Breakdown => ({
    ...right,
    decomposition: { ...right.decomposition, ...change },
  })

  /** Each: what is wrong, the book, how it comes to be wrong, and lines that must say so. */
  const faults: readonly (readonly [
    string,
    BookCells,
    (right: Breakdown) => Breakdown | Promise<Breakdown>,
    RegExp,
  ])[] = [
    [
      'a wrong weight',
      GROUPS,
      (b) => split(b, { weights: nudged(b.decomposition.weights, 1, 1e-4) }),
      /^Beech$/,
    ],
    [
      'two columns of returns taken for each other',
      GROUPS,
      async () =>
        (
          await computed({
            ...GROUPS,
            returns: GROUPS.returns.map((row, r) =>
              r === 0 ? row : [row[0]!, row[2]!, row[1]!, ...row.slice(3)],
            ),
          })
        ).breakdown,
      /^(Alder|Beech|Volatility)/,
    ],
    [
      'a date left out',
      GROUPS,
      async () =>
        (await computed({ ...GROUPS, returns: GROUPS.returns.filter((_, r) => r !== 40) })).breakdown,
      /^Volatility/,
    ],
    [
      'the divisor T in place of T - 1',
      GROUPS,
      (b) => split(b, { volatility: b.decomposition.volatility * Math.sqrt(89 / 90) }),
      /^Volatility/,
    ],
    [
      'another decay factor',
      under(GROUPS, { estimator: { kind: 'exponential', decay: 0.94 } }),
      async () =>
        (await computed(under(GROUPS, { estimator: { kind: 'exponential', decay: 0.97 } }))).breakdown,
      /^Volatility/,
    ],
    [
      'the weights of dates the wrong way round',
      under(GROUPS, { estimator: { kind: 'exponential', decay: 0.94 } }),
      async () =>
        (
          await computed({
            ...under(GROUPS, { estimator: { kind: 'exponential', decay: 0.94 } }),
            returns: GROUPS.returns.map((row, r) =>
              r === 0 ? row : [row[0]!, ...(GROUPS.returns[91 - r] ?? []).slice(1)],
            ),
          })
        ).breakdown,
      /^Volatility/,
    ],
    [
      'a contribution off by two parts in 1e10 of the whole',
      GROUPS,
      (b) =>
        split(b, {
          contribution: nudged(
            b.decomposition.contribution,
            2,
            2e-10 * b.decomposition.standAlone.reduce((a, x) => a + x, 0),
          ),
        }),
      /^Cedar$/,
    ],
    [
      'a group that misses a member',
      GROUPS,
      (b) => ({
        ...b,
        byGroup: b.byGroup.map((section, k) =>
          k === 1
            ? { ...section, parts: { ...section.parts, weight: nudged(section.parts.weight, 0, -0.2) } }
            : section,
        ),
      }),
      /^North, "far"$/,
    ],
    [
      'a value at risk one date further in',
      GROUPS,
      async (b) => ({
        ...b,
        tails: (
          await computed(
            under(GROUPS, { tails: { method: { kind: 'historical' }, confidence: 0.94, periods: 1 } }),
          )
        ).breakdown.tails,
      }),
      /^Value at risk$/,
    ],
    ['a figure that is no number', GROUPS, (b) => split(b, { volatility: NaN }), /^Volatility/],
  ]
  const cases = faults.map(([what, book, wrong, lines], k) => ({
    what,
    book: { ...book, name: `Fault ${k}`, data: 'Faults' },
    wrong,
    lines,
    // a fault of the returns must be seen against the true ones
    returns: book.returns,
  }))
  /** Right but for rounding. */
  const sound = { ...GROUPS, name: 'Sound', data: 'Faults' }

  const planted = new Map(cases.map(({ book, wrong }) => [book.name, wrong]))
  const proofs = proofsOf([...cases.map(({ book }) => book), sound], (book) =>
    plant(
      book,
      planted.get(book.name) ??
        ((b) => split(b, { contribution: b.decomposition.contribution.map((c) => c * (1 + 1e-14)) })),
    ),
  )

  describe.each(cases.map((one) => [one.what, one] as const))('(%s)', (_, { book, lines }) => {
    proofs.inBoth('is marked by', book, (proof) => {
      const found = differing(proof)
      expect(found).toContainEqual(expect.stringMatching(lines))
      expect(proof.headline).toEqual({
        sentence: 'Some lines differ by more than the tolerance',
        agree: proof.results.length - found.length,
        differ: found.length,
      })
    })
  })

  it('is told from rounding in the last digits', () => {
    expectAgreement(proofs.reading(sound), tolerance)
  })
})

describe('A cell of the returns that changes', () => {
  const book = named('Gaps')
  const [row, column, value] = [20, 3, 0.0345]
  const changed: BookCells = {
    ...book,
    returns: book.returns.map((line, r) => line.map((old, c) => (r === row && c === column ? value : old))),
  }
  let desk: Workout
  let table: Table
  beforeAll(async () => {
    table = proofTable(await computed(book), cornerOf(book))
    desk = await workedOut([{ book, table }])
  })
  afterAll(() => {
    desk.dispose()
  })

  /** What the sheet must show: the figures of the changed book, each marked as different from ours. */
  const moves = async (shown: Shown): Promise<void> => {
    const proof = readProof(table, shown)
    expect(proof.headline.sentence).toBe('Some lines differ by more than the tolerance')
    expect(differing(proof)).toContainEqual(expect.stringMatching(/^Volatility/))
    expect(differing(proof)).toContain('Cedar')
    // the labels and places are those of a proof of the changed book, which agrees with its own figures
    const { breakdown } = await computed(changed)
    const volatility = proof.pairs.find(({ label }) => /^Volatility (a year|per period)$/.test(label))
    expect(Number(volatility?.recomputed)).toBeCloseTo(breakdown.decomposition.volatility, 13)
    expect(Number(volatility?.ours)).not.toBeCloseTo(breakdown.decomposition.volatility, 6)
  }

  it('moves the proof, which marks our figures as different, and back again', async () => {
    expectAgreement(readProof(table, desk.shown(book)), tolerance)
    const before = Number(book.returns[row]?.[column])
    await desk.change(book, 'returns', row, column, value)
    await moves(desk.shown(book))
    await desk.change(book, 'returns', row, column, before)
    expectAgreement(readProof(table, desk.shown(book)), tolerance)
  })

  itInCalc('moves the proof in LibreOffice Calc too', async () => {
    await desk.change(book, 'returns', row, column, value)
    await moves((await workedOutByCalc(await desk.saved()))(book))
  })

  it('that becomes blank is seen, whatever it does to the figures', async () => {
    await desk.change(book, 'returns', row, column, '')
    expect(differing(readProof(table, desk.shown(book)))).toContain('Numbers in the cells of the returns')
  })
})

// from some hundred rows on LibreOffice Calc works out columns as a whole and in several threads, which is another engine again
describe('Books of 150 holdings', () => {
  const estimators: readonly (readonly [string, EstimatorChoice])[] = [
    ['decay', { kind: 'exponential', decay: 0.97 }],
    ['identity', { kind: 'shrinkage', target: 'identity' }],
    ['correlation', { kind: 'shrinkage', target: 'correlation' }],
    ['oas', { kind: 'shrinkage', target: 'oas' }],
    ['lagged', { kind: 'lagged', lags: 2 }],
  ]
  const books = estimators.map(([name, estimator]): BookCells => {
    const book = largeBook(150, 160)
    // what groups and benchmarks need is tried elsewhere
    const holdings = book.holdings.map((row) => [row[0] ?? '', row[2] ?? ''])
    return { ...book, holdings, name: `150 ${name}`, data: '150', settings: { estimator } }
  })
  const proofs = proofsOf(books)

  describe.each(books.map((book) => [book.name, book] as const))('(%s)', (_, book) => {
    proofs.inBoth('agree in every line, worked out by', book, (proof) => {
      expectAgreement(proof, tolerance)
    })
  })
})

describe('A book of 500 holdings and 1260 dates', () => {
  const book = largeBook(500, 1260)
  proofsOf([book]).inBoth('agrees in every line, worked out by', book, (proof) => {
    expectAgreement(proof, tolerance)
  })
})

/** Scenarios over blocks of cells: every block here is typed for its test, and what is expected of it follows by hand unless said otherwise. */
import type { CellValue, Scenario, Settings, Table } from '../../../src/sheet'
import {
  breakDown,
  CAUTION,
  DEFAULT_SETTINGS,
  matchHoldings,
  readHoldings,
  readReturns,
} from '../../../src/sheet'
import {
  stressInputs,
  stressOf,
  worstStretch,
  type StressCase,
  type StressComparison,
  type StressInputs,
} from '../../../src/sheet/stress'
import { stressTable } from '../../../src/sheet/stress-table'
import { relativeGap } from '../../closeness'
import { readJson } from '../../reference/data'
import { blockOf, ENGLISH, modelFor } from './blocks-of-cells'

const HOLDINGS: CellValue[][] = [
  ['Holding', 'Weight', 'Sector'],
  ['Meadow', 0.5, 'Grass'],
  ['Orchard', 0.5, 'Trees'],
]
/** Volatilities 20% and 30%, correlation 1/6. */
const MATRIX: CellValue[][] = [
  ['Meadow', 'Orchard'],
  [0.04, 0.01],
  [0.01, 0.09],
]
/** 1 Jan 2024 and the four days after it. */
const DAYS = [45292, 45293, 45294, 45295, 45296]
const RETURNS: CellValue[][] = [
  ['Date', 'Meadow', 'Orchard'],
  [DAYS[0]!, 0.02, 0.01],
  [DAYS[1]!, -0.1, 0.04],
  [DAYS[2]!, -0.06, -0.02],
  [DAYS[3]!, 0.05, -0.01],
  [DAYS[4]!, 0.03, 0.02],
]
const EVEN = Float64Array.of(0.5, 0.5)

async function bookOf(
  returnsRows: CellValue[][],
  change: Partial<Settings> = {},
  rows: CellValue[][] = HOLDINGS,
  factors: CellValue[][] | null = null,
) {
  const settings = { ...DEFAULT_SETTINGS, ...change }
  const holdings = readHoldings(blockOf(rows), settings, ENGLISH)
  const returns = readReturns(blockOf(returnsRows, 'Returns'), settings, ENGLISH)
  const blocks = {
    holdings,
    returns,
    match: matchHoldings(holdings, returns, settings.riskless),
    factors: factors && readReturns(blockOf(factors, 'Factors'), settings, ENGLISH),
  }
  const book = await modelFor(blocks, settings)
  return { inputs: stressInputs(blocks, book, settings), breakdown: breakDown(blocks, book, settings), book }
}

const inputsOf = async (...given: Parameters<typeof bookOf>): Promise<StressInputs> =>
  (await bookOf(...given)).inputs

function compared(
  inputs: StressInputs,
  scenarios: readonly Scenario[],
  before = EVEN,
  after: Float64Array | null = null,
): StressComparison {
  const made = stressOf(inputs, scenarios, before, after)
  if (typeof made === 'string') throw new Error(made)
  return made
}

/** The one scenario's case. */
const only = (...given: Parameters<typeof compared>): StressCase => compared(...given).cases[1]!

function figuresOf({ figures }: StressCase) {
  if (typeof figures === 'string') throw new Error(figures)
  return figures
}

/** The sentence in place of figures. */
const refusal = (one: StressCase): string =>
  typeof one.figures === 'string' ? one.figures : 'it has figures'

const span = (from: number, to: number): Scenario => ({ kind: 'stretch', by: 'dates', from, to })

describe('covariances that are bent', () => {
  test('the book as it is estimated comes first, scaled as its breakdown is', async () => {
    const { inputs, breakdown } = await bookOf(RETURNS)
    const [base] = compared(inputs, []).cases
    const { volatility } = figuresOf(base!).before
    expect(base!.name).toBe('As estimated')
    expect(breakdown.horizon).toBe('a year')
    expect(volatility!.total).toBe(breakdown.decomposition.volatility)
    expect(volatility!.parts).toEqual(breakdown.decomposition.contribution)
    expect(volatility!.byGroup[0]).toEqual(breakdown.byGroup[0]!.parts.contribution)
  })

  test('volatilities of one group alone are scaled by a label, however it is spelt', async () => {
    const factor = { header: 'sector', factors: [['  GRASS', 2]] } as const
    const one = only(await inputsOf(MATRIX), [{ kind: 'volatilities', factor }])
    const { total, byGroup } = figuresOf(one).before.volatility!
    // (0.5 x 0.4)^2 + 2 (0.5 x 0.4)(0.5 x 0.3)/6 + (0.5 x 0.3)^2
    expect(total).toBeCloseTo(Math.sqrt(0.0725), 14)
    // the first group's part: (0.04 + 0.005) / s
    expect(byGroup[0]![0]).toBeCloseTo(0.045 / Math.sqrt(0.0725), 14)
    expect(one.name).toBe('Volatilities by sector:   GRASS × 2')
  })

  test('with every correlation 1 the volatility is the sum of stand-alone risks, and each contribution its own', async () => {
    const { volatility } = figuresOf(
      only(await inputsOf(MATRIX), [{ kind: 'correlations', theta: 1 }]),
    ).before
    expect(volatility!.total).toBeCloseTo(0.25, 14)
    expect(relativeGap(volatility!.parts, [0.1, 0.15])).toBeLessThanOrEqual(1e-14)
  })

  test('both at once are the one within the other', async () => {
    const one = only(await inputsOf(MATRIX), [{ kind: 'both', factor: 3, theta: 1 }])
    expect(figuresOf(one).before.volatility!.total).toBeCloseTo(0.75, 14)
    expect(one.name).toBe('Volatilities × 3, correlations moved 100% toward 1')
  })

  test.each<[string, Partial<Settings>, CellValue[][] | null]>([
    ['shrinkage', { estimator: { kind: 'shrinkage', target: 'correlation' } }, null],
    ['exponential weighting', { estimator: { kind: 'exponential', decay: 0.9 } }, null],
    ['lagged terms', { estimator: { kind: 'lagged', lags: 1 } }, null],
    [
      'a factor model',
      { estimator: { kind: 'factors' } },
      [['Date', 'Common'], ...DAYS.map((day, k) => [day, [0.01, -0.02, -0.03, 0.01, 0.02][k]!])],
    ],
  ])('%s keeps its own volatilities when correlations move to 1', async (_, change, factors) => {
    const { inputs, book } = await bookOf(RETURNS, change, HOLDINGS, factors)
    const { volatility } = figuresOf(only(inputs, [{ kind: 'correlations', theta: 1 }])).before
    const own = book.model.variances().map((variance) => Math.sqrt(variance * 252))
    expect(relativeGap(volatility!.total, 0.5 * own[0]! + 0.5 * own[1]!)).toBeLessThanOrEqual(1e-13)
  })

  test('that nearer correlations lower the risk of a book with both signs is said, and of which weights', async () => {
    const inputs = await inputsOf(MATRIX)
    const scenario: Scenario = { kind: 'correlations', theta: 0.5 }
    const short = Float64Array.of(0.5, -0.5)
    // 0.01 - 0.005 + 0.0225 before; of |0.1 - 0.15|^2 and that the mean
    const lowered = `from ${(Math.sqrt(0.0275) * 100).toFixed(2)}% to ${(Math.sqrt(0.015) * 100).toFixed(2)}%: positions of opposite sign offset each other more.`
    expect(only(inputs, [scenario], EVEN).notes).toEqual([])
    expect(only(inputs, [scenario], short).notes).toEqual([
      `Here correlations nearer to 1 lower the risk, ${lowered}`,
    ])
    expect(only(inputs, [scenario], EVEN, short).notes).toEqual([
      `Here correlations nearer to 1 lower the risk after the trades, ${lowered}`,
    ])
    expect(only(inputs, [scenario], short, EVEN).notes).toEqual([
      `Here correlations nearer to 1 lower the risk before the trades, ${lowered}`,
    ])
    const louder = only(inputs, [{ kind: 'both', factor: 2, theta: 0.5 }], short).notes
    expect(louder[0]).toContain(`to ${(2 * Math.sqrt(0.015) * 100).toFixed(2)}%`)
  })

  test.each<[Scenario, string]>([
    [{ kind: 'correlations', theta: 1.2 }, 'Correlations moved by 1.2; a share from 0 to 1 is needed.'],
    [{ kind: 'volatilities', factor: -1 }, 'Factor -1; a number of 0 or more is needed.'],
    [
      { kind: 'volatilities', factor: { header: 'Region', factors: [['North', 2]] } },
      'The holdings have no group column “Region”.',
    ],
    [
      { kind: 'both', theta: 0.5, factor: { header: 'Sector', factors: [['Water', 2]] } },
      'No holding stands under “Water” in the column “Sector”.',
    ],
    [
      {
        kind: 'volatilities',
        factor: {
          header: 'Sector',
          factors: [
            ['Grass', 2],
            ['grass', 3],
          ],
        },
      },
      '“grass” has two factors: one is needed.',
    ],
    [span(DAYS[0]!, DAYS[1]!), 'A covariance matrix holds no dates to replay: a block of returns is needed.'],
  ])('%j of a matrix says why it cannot be made, and the others stand', async (scenario, sentence) => {
    const { cases } = compared(await inputsOf(MATRIX), [scenario, { kind: 'volatilities', factor: 2 }])
    expect(refusal(cases[1]!)).toBe(sentence)
    expect(figuresOf(cases[2]!).before.volatility!.total).toBeCloseTo(2 * Math.sqrt(0.0375), 14)
  })

  test('a matrix that these weights show to be none has nothing to compare with', async () => {
    const impossible: CellValue[][] = [
      ['Meadow', 'Orchard', 'Heath'],
      [1, 0.9, -0.9],
      [0.9, 1, 0.9],
      [-0.9, 0.9, 1.0001],
    ]
    const rows = [
      ['Holding', 'Weight'],
      ['Meadow', 1],
      ['Orchard', -1],
      ['Heath', 1],
    ]
    const settings = { ...DEFAULT_SETTINGS }
    const holdings = readHoldings(blockOf(rows), settings, ENGLISH)
    const returns = readReturns(blockOf(impossible, 'Returns'), settings, ENGLISH)
    const blocks = { holdings, returns, match: matchHoldings(holdings, returns, []), factors: null }
    const inputs = stressInputs(blocks, await modelFor(blocks, settings), settings)
    expect(stressOf(inputs, [], Float64Array.of(1, -1, 1), null)).toMatch(
      /^These weights would have a variance of -2\.\d+; a covariance matrix without negative eigenvalues is needed\.$/,
    )
  })
})

describe('a replayed stretch', () => {
  test('adds its returns up by position and by group, and stands beside its own volatility', async () => {
    const one = only(await inputsOf(RETURNS), [span(DAYS[1]!, DAYS[3]!)])
    const { stretch, volatility } = figuresOf(one).before
    // half of -0.1 - 0.06 + 0.05 and half of 0.04 - 0.02 - 0.01
    expect(relativeGap(stretch!.parts, [-0.055, 0.005])).toBeLessThanOrEqual(1e-13)
    expect(stretch!.total).toBeCloseTo(-0.05, 14)
    expect(relativeGap(stretch!.byGroup[0]!, [-0.055, 0.005])).toBeLessThanOrEqual(1e-13)
    // the book returns -0.03, -0.04 and 0.02
    expect(stretch!.compounded).toBeCloseTo(0.97 * 0.96 * 1.02 - 1, 14)
    expect(stretch!.worstFall!.share).toBeCloseTo(1 - 0.97 * 0.96, 14)
    expect(stretch!.worstFall!.between).toEqual(['before 2 Jan 2024', '3 Jan 2024'])
    // mean -0.05/3, squares about it 1/2 of their sum, 252 days
    const m = -0.05 / 3
    const variance = ((-0.03 - m) ** 2 + (-0.04 - m) ** 2 + (0.02 - m) ** 2) / 2
    expect(volatility!.total).toBeCloseTo(Math.sqrt(252 * variance), 12)
    expect(one.dates).toEqual({ first: '2 Jan 2024', last: '4 Jan 2024', used: 3, leftOut: 0 })
    expect(one.name).toBe('2 Jan 2024 to 4 Jan 2024 replayed')
  })

  test('without dates goes by the number of the date', async () => {
    const undated = RETURNS.map((row) => row.slice(1))
    const inputs = await inputsOf(undated)
    const one = only(inputs, [{ kind: 'stretch', by: 'rows', from: 2, to: 4 }])
    expect(figuresOf(one).before.stretch!.total).toBeCloseTo(-0.05, 14)
    expect(one.dates).toEqual({ first: 'date 2', last: 'date 4', used: 3, leftOut: 0 })
    expect(one.name).toBe('Dates 2 to 4 of the returns replayed')
    expect(refusal(only(inputs, [span(DAYS[0]!, DAYS[1]!)]))).toBe(
      'The returns carry no dates: a stretch is chosen by their number, the oldest being 1.',
    )
  })

  test('of log returns counts what they stand for', async () => {
    const prices: CellValue[][] = [
      ['Date', 'Meadow', 'Orchard'],
      [DAYS[0]!, 100, 50],
      [DAYS[1]!, 110, 50],
      [DAYS[2]!, 88, 60],
      [DAYS[3]!, 99, 60],
    ]
    const change = { content: 'prices', returnKind: 'log' } as const
    const { stretch } = figuresOf(only(await inputsOf(prices, change), [span(DAYS[1]!, DAYS[2]!)])).before
    // 10% and -20%; 0 and 20%
    expect(relativeGap(stretch!.parts, [-0.05, 0.1])).toBeLessThanOrEqual(1e-12)
  })

  test('says which dates within it are left out', async () => {
    const gappy = RETURNS.map((row, k) => (k === 3 ? [row[0]!, row[1]!, ''] : row))
    const one = only(await inputsOf(gappy), [span(DAYS[0]!, DAYS[4]!)])
    expect(one.dates).toMatchObject({ used: 4, leftOut: 1 })
    expect(one.notes).toContain(
      '1 date within the stretch is left out, where some holding has no return: what the book made there is not in the figures.',
    )
  })

  test('of one date has a return and no volatility', async () => {
    const one = only(await inputsOf(RETURNS), [span(DAYS[1]!, DAYS[1]!)])
    const { volatility, stretch } = figuresOf(one).before
    expect(volatility).toBeNull()
    expect(stretch!.total).toBeCloseTo(-0.03, 14)
    expect(one.notes).toEqual(['One date has no volatility: its return and the parts of it are shown alone.'])
  })

  test('of few dates says how rough its volatility is (1/sqrt(2T) for normal returns, Kendall & Stuart; from memory)', async () => {
    const { checks } = readJson<{
      checks: { id: string; inputs: { T: number[] }; outputs: { relative: number[] } }[]
    }>('published.json')
    const { inputs: given, outputs } = checks.find(({ id }) => id === 'vol-standard-error')!
    const months = given.T[0]!
    expect(months).toBe(36)
    const rows: CellValue[][] = [
      ['Meadow', 'Orchard'],
      ...Array.from({ length: months + 40 }, (_, t) => [Math.sin(t) / 50, Math.cos(t * t) / 50]),
    ]
    const one = only(await inputsOf(rows), [{ kind: 'stretch', by: 'rows', from: 1, to: months }])
    expect(one.notes).toEqual([
      `The volatility of 36 dates is a rough figure: for normal returns its standard error is about ${(outputs.relative[0]! * 100).toFixed(0)}% of it.`,
    ])
    expect(only(await inputsOf(rows), [{ kind: 'stretch', by: 'rows', from: 1, to: 60 }]).notes).toEqual([])
  })

  test('that takes all a book has says when, and of which weights', async () => {
    const geared = Float64Array.of(11, 0)
    const one = only(await inputsOf(RETURNS), [span(DAYS[0]!, DAYS[4]!)], EVEN, geared)
    const { before, after } = figuresOf(one)
    expect(before.stretch!.compounded).not.toBeNull()
    expect(after!.stretch!.compounded).toBeNull()
    expect(after!.stretch!.worstFall).toBeNull()
    expect(one.notes[0]).toBe(
      'On 2 Jan 2024 the book after the trades loses all its value or more (−110.0%), so that nothing is left to compound.',
    )
  })

  test('a holding without returns is said to count at 0', async () => {
    const rows = [...HOLDINGS, ['Till', 0.1, 'Cash']]
    const inputs = await inputsOf(RETURNS, { riskless: ['Till'] }, rows)
    const weights = Float64Array.of(0.5, 0.4, 0.1)
    expect(only(inputs, [span(DAYS[0]!, DAYS[4]!)], weights).notes).toContain(
      '“Till” counts at a return of 0.',
    )
    const without = only(inputs, [span(DAYS[0]!, DAYS[4]!)], Float64Array.of(0.5, 0.5, 0))
    expect(without.notes.join()).not.toContain('Till')
  })

  test('outside the look-back, or the wrong way round, it says so', async () => {
    const inputs = await inputsOf(RETURNS, { lookBack: { kind: 'last', dates: 3 } })
    expect(refusal(only(inputs, [span(DAYS[0]!, DAYS[1]!)]))).toBe(
      'No date with a return for every holding lies within the stretch: those of the look-back run from 3 Jan 2024 to 5 Jan 2024.',
    )
    expect(refusal(only(inputs, [span(DAYS[4]!, DAYS[3]!)]))).toBe('The stretch begins after it ends.')
    expect(only(inputs, [span(DAYS[0]!, DAYS[2]!)]).dates!.used).toBe(1)
  })
})

describe('the stretch with the largest loss', () => {
  test('is a scenario whose replay loses what the sentence says', async () => {
    const inputs = await inputsOf(RETURNS)
    const found = worstStretch(inputs, EVEN, 2)
    // the book returns 0.015, -0.03, -0.04, 0.02, 0.025
    expect(found).toEqual({
      scenario: span(DAYS[1]!, DAYS[2]!),
      sentence:
        'Of all stretches of 2 dates among 5, 2 Jan 2024 to 3 Jan 2024 has the largest loss at these weights: a sum of returns of −7.00%.',
    })
    if (typeof found === 'string') throw new Error(found)
    expect(figuresOf(only(inputs, [found.scenario])).before.stretch!.total).toBeCloseTo(-0.07, 14)
  })

  test('goes by numbers where there are no dates, and finds gains where there are no losses', async () => {
    const undated = RETURNS.map((row) => row.slice(1))
    const short = Float64Array.of(-1, 0)
    const found = worstStretch(await inputsOf(undated), short, 4)
    // -(0.02 - 0.1 - 0.06 + 0.05) = 0.09 and -(-0.1 - 0.06 + 0.05 + 0.03) = 0.08
    expect(found).toEqual({
      scenario: { kind: 'stretch', by: 'rows', from: 2, to: 5 },
      sentence:
        'No stretch of 4 dates among 5 was a loss at these weights. The one with the smallest gain is date 2 to date 5: a sum of returns of 8.00%.',
    })
  })

  test('says why there is none', async () => {
    expect(worstStretch(await inputsOf(MATRIX), EVEN, 2)).toBe(
      'A covariance matrix holds no dates to replay: a block of returns is needed.',
    )
    expect(worstStretch(await inputsOf(RETURNS), EVEN, 6)).toBe('A stretch of 6 dates; the returns have 5.')
    expect(worstStretch(await inputsOf(RETURNS), EVEN, 0)).toBe(
      'A stretch of 0 dates; a whole number of 1 or more is needed.',
    )
  })

  test('nor where fewer than two dates are shared by all holdings', async () => {
    const inputs = await inputsOf(RETURNS)
    const unshared = { ...inputs, book: { ...inputs.book, data: null } }
    const sentence = 'Fewer than 2 dates have a return for every holding: there is no stretch to replay.'
    expect(worstStretch(unshared, EVEN, 1)).toBe(sentence)
    expect(refusal(only(unshared, [span(DAYS[0]!, DAYS[1]!)]))).toBe(sentence)
  })
})

describe('scenarios as a written table', () => {
  const SCENARIOS: readonly Scenario[] = [
    { kind: 'volatilities', factor: 1.5 },
    { kind: 'both', factor: { header: 'Sector', factors: [['Grass', 2]] }, theta: 0.25 },
    span(DAYS[1]!, DAYS[3]!),
    { kind: 'correlations', theta: 2 },
  ]
  const AFTER = Float64Array.of(0.25, 0.5)

  const written = async (after: Float64Array | null) => {
    const { inputs, breakdown } = await bookOf(RETURNS)
    return stressTable(
      'Book',
      compared(inputs, SCENARIOS, EVEN, after),
      breakdown,
      after && 'Meadow −25%; cash',
    )
  }
  const valuesOf = ({ cells }: Table) => cells.map((row) => row.map(({ value }) => value))
  /** The rows of a part: from its heading to the next blank row. */
  const part = (table: Table, section: string) => {
    const rows = valuesOf(table)
    const from = rows.findIndex(([first]) => first === section)
    const length = rows.slice(from).findIndex((row) => row.every((value) => value === ''))
    if (from < 0 || length < 0) throw new Error(`no part ${section}`)
    return rows.slice(from, from + length)
  }
  const labelled = (rows: CellValue[][], label: string) => rows.find(([first]) => first === label)!

  test('every row has as many cells as there are columns: a label, the weights, each case', async () => {
    for (const [after, columns] of [
      [null, 1 + 6],
      [AFTER, 1 + 2 * 6],
    ] as const) {
      const { cells, widths, numeric } = await written(after)
      expect(new Set(cells.map((row) => row.length))).toEqual(new Set([columns]))
      expect([widths.length, numeric.length]).toEqual([columns, columns])
    }
  })

  test('the cases stand side by side under their names, before and after', async () => {
    const rows = part(await written(AFTER), 'Contribution to risk by holding')
    expect(rows[1]).toEqual([
      'Holding',
      ...['Weight', 'As estimated', 'Volatilities × 1.5'].flatMap((name) => [name, '']),
      ...['Volatilities by Sector: Grass × 2, correlations moved 25% toward 1', ''],
      ...['2 Jan 2024 to 4 Jan 2024 replayed', '', 'Correlations moved 200% toward 1', ''],
    ])
    expect(rows[2]).toEqual(['', ...Array.from({ length: 6 }, () => ['Before', 'After']).flat()])
    expect(labelled(rows, 'Meadow').slice(1, 3)).toEqual([0.5, 0.25])
    expect(labelled(rows, 'Total').slice(1, 3)).toEqual([1, 0.75])
  })

  test('holdings and groups add up to the total in every column, and what is left is printed', async () => {
    const table = await written(AFTER)
    for (const [by, ...members] of [
      ['holding', 'Meadow', 'Orchard'],
      ['Sector', 'Grass', 'Trees'],
    ]) {
      const rows = part(table, `Contribution to risk by ${by}`)
      const [one, other, total] = [...members, 'Total'].map((label) => labelled(rows, label))
      for (let k = 1; k <= 10; k++)
        expect(Number(one![k]) + Number(other![k])).toBeCloseTo(Number(total![k]), 14)
    }
    const rows = part(table, 'Contribution to risk by holding')
    expect(Math.abs(Number(labelled(rows, 'Difference')[3]))).toBeLessThan(1e-15)
    // 1.5 times as estimated
    const volatility = labelled(part(table, 'Volatility a year'), 'Volatility')
    expect(Number(volatility[5])).toBeCloseTo(1.5 * Number(volatility[3]), 14)
    expect(Number(volatility[6])).toBeCloseTo(1.5 * Number(volatility[4]), 14)
    const change = labelled(part(table, 'Volatility a year'), 'Change from as estimated')
    expect(change.slice(3, 5)).toEqual(['', ''])
    expect(Number(change[6])).toBeCloseTo(0.5 * Number(volatility[4]), 14)
  })

  test('only a replayed stretch has returns, which add up as well', async () => {
    const table = await written(null)
    const rows = part(table, 'Return over the replayed dates')
    expect(labelled(rows, 'First date')).toEqual(['First date', '', '', '', '', '2 Jan 2024', 'not shown'])
    const parts = part(table, 'Part of the sum of returns by holding')
    const column = (label: string): number => Number(labelled(parts, label)[5])
    expect(column('Total')).toBeCloseTo(-0.05, 14)
    expect(column('Meadow') + column('Orchard')).toBeCloseTo(-0.05, 14)
    expect(labelled(parts, 'Total').slice(2, 5)).toEqual(['', '', ''])
    const { inputs, breakdown } = await bookOf(RETURNS)
    const bent = stressTable('Book', compared(inputs, SCENARIOS.slice(0, 2)), breakdown)
    expect(valuesOf(bent).flat()).not.toContain('Return over the replayed dates')
  })

  test('settings, data dates, trades, caution and what could not be made are printed beside it', async () => {
    const printed = valuesOf(await written(AFTER)).map((row) =>
      row.filter((value) => value !== '').join(' | '),
    )
    expect(printed[0]).toBe('Stress: Book')
    expect(printed[1]).toMatch(
      /^Volatility as estimated \d+\.\d\d% a year before the trades and \d+\.\d\d% after them, from 5 dates, 1 Jan 2024 to 5 Jan 2024; 4 scenarios beside it\.$/,
    )
    expect(printed).toContain(CAUTION)
    expect(printed).toContain('Dates used | 5, 1 Jan 2024 to 5 Jan 2024')
    expect(printed).toContain('Trades | Meadow −25%; cash')
    expect(printed).toContain(
      'Correlations moved 200% toward 1: not shown. Correlations moved by 2; a share from 0 to 1 is needed.',
    )
    expect(printed.filter((row) => row.startsWith('Replayed stretch | '))).toHaveLength(1)
    expect(
      printed.some((row) => row.startsWith('2 Jan 2024 to 4 Jan 2024 replayed | The volatility of 3 dates')),
    ).toBe(true)
    expect(valuesOf(await written(null)).flat()).not.toContain('Trades')
  })

  test('text is written as text and figures as percentages', async () => {
    for (const { value, format } of (await written(AFTER)).cells.flat())
      if (typeof value === 'number') expect(['0.00%', '0.0E+00']).toContain(format)
      else if (value !== '') expect(format).toBe('@')
  })
})

/**
 * What a user can ask of a book beyond its figures: estimators, the look over the data, studies, the benchmark. Over a workbook of
 * plain arrays; figures are compared with each other.
 */
import type { Books, BooksState, CellValue, Workbook } from '../../../src/sheet'
import { openBooks } from '../../../src/sheet'
import { plainWorkbook } from './plain-workbook'

const NAMES = ['Meadow', 'Orchard', 'Mill', 'Index']
const WEEKS = 120
const FIRST = 45000
/** Returns of no common period; the mill begins in the 41st week. */
const value = (t: number, i: number): number =>
  Number((0.02 * Math.sin(1 + 1.7 * t + 2.3 * i * i + 0.1 * t * i) + 0.01 * Math.sin(t * t)).toFixed(6))
const RETURNS: CellValue[][] = [
  ['Week', ...NAMES],
  ...Array.from({ length: WEEKS }, (_, t) => [
    FIRST + 7 * t,
    ...NAMES.map((_, i) => (i === 2 && t < 40 ? '' : value(t, i))),
  ]),
]
const HOLDINGS: CellValue[][] = [
  ['Holding', 'Class', 'Region', 'Weight', 'Benchmark weight'],
  ['Meadow', 'Land', 'North', 0.5, 0.6],
  ['Orchard', 'Land', 'South', 0.3, 0.4],
  ['Mill', 'Works', 'North', 0.2, ''],
]
const FACTORS: CellValue[][] = [
  ['Week', 'Common'],
  ...Array.from({ length: WEEKS }, (_, t) => [FIRST + 7 * t, value(t, 0) + value(t, 1)]),
]

const running: Books[] = []
afterEach(async () => {
  for (const books of running.splice(0)) await books.close()
})

/** Everything on a sheet. */
const sheetOf = async (port: Workbook, sheet: string): Promise<readonly (readonly CellValue[])[]> =>
  (await port.read({ sheet, row: 0, column: 0, rows: 150, columns: 8 })).values

async function desk() {
  const workbook = plainWorkbook({
    Book: HOLDINGS.map((row) => [...row]),
    Returns: RETURNS.map((row) => [...row]),
    Factors: FACTORS.map((row) => [...row]),
    Given: [
      ['Return', 'Value at risk'],
      [-0.03, 0.02],
      [0.01, 0.02],
      [-0.01, 0.02],
      ['', 0.02],
    ],
    // losses as negative numbers, as some write them; and a record without any exception
    Signed: [
      ['Return', 'Value at risk'],
      [-0.03, -0.02],
      [0.01, -0.02],
    ],
    Calm: [['Return', 'Value at risk'], ...Array.from({ length: 30 }, (_, t) => [value(t, 0), 0.5])],
    // an exception every other date: they never follow one another
    Regular: [
      ['Return', 'Value at risk'],
      ...Array.from({ length: 30 }, (_, t) => [t % 2 === 0 ? -0.03 : 0.01, 0.02]),
    ],
  })
  const books = await openBooks(workbook.port)
  running.push(books)
  const take = async (field: 'holdings' | 'returns' | 'factors', address: string): Promise<void> => {
    workbook.select(address)
    await books.takeSelection(field)
  }
  await take('holdings', 'Book!A1:E4')
  await take('returns', `Returns!A1:E${WEEKS + 1}`)
  await books.compute()
  /** Until edits have settled and what they set off is done. */
  const quiet = async () => {
    do await new Promise((resolve) => setTimeout(resolve, 150))
    while (books.state().working)
    return books.state()
  }
  const volatility = (): number => books.state().breakdown?.decomposition.volatility ?? NaN
  return { ...workbook, books, take, quiet, volatility }
}

describe('The look over the data', () => {
  test('tells the short history with the volatility each correction gives, and taking one gives just that', async () => {
    const { books, quiet, volatility } = await desk()
    const { checks } = await quiet()
    const line = checks?.find(({ check }) => check.kind === 'short history')
    expect(line?.check.sentence).toMatch(/Returns!D2:D41.*“Mill”/)
    expect(line?.corrections.length).toBeGreaterThan(1)
    const before = volatility()
    for (const correction of line?.corrections ?? []) {
      expect(correction.volatility).not.toBeCloseTo(before, 6)
      await books.choose(correction.change ?? {})
      expect(books.state().status).toEqual({ kind: 'up to date' })
      expect(volatility()).toBeCloseTo(Number(correction.volatility), 12)
      await books.choose({ gaps: 'common dates', estimator: { kind: 'sample' } })
    }
    expect(volatility()).toBe(before)
  })

  test('few dates for the holdings warn beside the figures as well, once they are looked over', async () => {
    const { books, quiet } = await desk()
    await books.choose({ lookBack: { kind: 'last', dates: 5 } })
    const { breakdown, checks } = await quiet()
    expect(checks?.map(({ check }) => check.kind)).toContain('few dates')
    expect(breakdown?.findings.map(({ sentence }) => sentence)).toContain(
      '5 dates for 3 series that move: 1.7 dates a series.',
    )
  })

  test('follows a weight and an edit of the returns', async () => {
    const { quiet, type } = await desk()
    const correction = ({ checks }: Pick<BooksState, 'checks'>) =>
      checks?.find(({ check }) => check.kind === 'short history')?.corrections[0]?.volatility
    const before = correction(await quiet())
    type('Book!D2', 0.9)
    const after = correction(await quiet())
    expect(after).not.toBe(before)
    type('Returns!B60', 0.9)
    const { checks } = await quiet()
    expect(checks?.some(({ check }) => check.kind === 'outlier' && /Returns!B60/.test(check.sentence))).toBe(
      true,
    )
  })

  test('is there before anything is computed, and gone while a block cannot be read', async () => {
    const workbook = plainWorkbook({
      Book: HOLDINGS.map((row) => [...row]),
      Returns: RETURNS.map((row) => [...row]),
    })
    const books = await openBooks(workbook.port)
    running.push(books)
    workbook.select('Book!A1:E4')
    await books.takeSelection('holdings')
    expect(books.state().checks).toBeNull()
    workbook.select(`Returns!A1:E${WEEKS + 1}`)
    await books.takeSelection('returns')
    for (let waited = 0; !books.state().checks && waited < 5000; waited += 50)
      await new Promise((resolve) => setTimeout(resolve, 50))
    expect(books.state().breakdown).toBeNull()
    expect(books.state().checks?.length).toBeGreaterThan(0)
  })

  test('is written to a sheet of its own, and the next list takes the place of the first', async () => {
    const { books, quiet, valueAt, type } = await desk()
    await quiet()
    await books.writeChecks()
    expect(books.state().notice).toMatch(/^Data checks written to 'Data checks'!A1:H\d+\./)
    expect(valueAt("'Data checks'!A5")).toBe('Severity')
    type('Returns!B60', 0.9)
    await quiet()
    await books.writeChecks()
    expect(books.state().notice).toMatch(/^Data checks written to 'Data checks'!A1:H\d+\./)
    expect(books.state().faults.table).toBeUndefined()
  })
})

describe('Choices', () => {
  test('every estimator gives figures of its own that add up, and is saved', async () => {
    const { books, volatility, settings } = await desk()
    const seen = new Set([volatility()])
    for (const estimator of [
      { kind: 'exponential', decay: 0.9 },
      { kind: 'shrinkage', target: 'identity' },
      { kind: 'shrinkage', target: 'correlation' },
      { kind: 'shrinkage', target: 'oas' },
      { kind: 'lagged', lags: 3 },
    ] as const) {
      await books.choose({ estimator })
      const { status, breakdown, faults } = books.state()
      expect([estimator, faults]).toEqual([estimator, {}])
      expect(status).toEqual({ kind: 'up to date' })
      expect(breakdown?.decomposition.sumOfContributions).toBeCloseTo(volatility(), 12)
      expect(typeof breakdown?.bands).toBe('object')
      expect(settings.get('book.1')).toMatchObject({ settings: { estimator } })
      seen.add(volatility())
    }
    expect(seen.size).toBe(6)
  })

  test('a factor model wants its block first, then splits the volatility among factors and holdings', async () => {
    const { books, take, names, volatility } = await desk()
    await books.choose({ estimator: { kind: 'factors' } })
    expect(books.state().faults.factors ?? books.state().faults.estimator).toMatch(/factor returns/)
    await take('factors', `Factors!A1:B${WEEKS + 1}`)
    await books.compute()
    const { breakdown, status } = books.state()
    expect(status).toEqual({ kind: 'up to date' })
    expect(names.get('1_factors')?.sheet).toBe('Factors')
    const { systematic, specific } = breakdown!.factors!
    const sum = (values: Float64Array) => values.reduce((total, part) => total + part, 0)
    expect(sum(systematic) + sum(specific)).toBeCloseTo(volatility(), 12)
    await books.dropFactors()
    expect(books.state().settings.estimator).toEqual({ kind: 'sample' })
    expect(names.has('1_factors')).toBe(false)
    expect(books.state().status).toEqual({ kind: 'up to date' })
  })

  test('factor returns that no figure rests on leave the figures up to date, and the choice of the model computes', async () => {
    const { books, take, names, volatility } = await desk()
    const before = volatility()
    await take('factors', `Factors!A1:B${WEEKS + 1}`)
    expect(books.state().status).toEqual({ kind: 'up to date' })
    expect(names.get('1_factors')?.sheet).toBe('Factors')
    await books.choose({ estimator: { kind: 'factors' } })
    expect(books.state().status).toEqual({ kind: 'up to date' })
    expect(books.state().breakdown?.factors?.names).toEqual(['Common'])
    expect(volatility()).not.toBe(before)
  })

  test('a choice made after a block was taken anew computes from that block and links it', async () => {
    const { books, take, names } = await desk()
    await take('returns', `Returns!A1:E${WEEKS - 9}`)
    expect(books.state().status.kind).toBe('stale')
    await books.choose({ estimator: { kind: 'lagged', lags: 1 } })
    expect(books.state().status).toEqual({ kind: 'up to date' })
    expect(names.get('1_returns')?.rows).toBe(WEEKS - 9)
  })

  test('an edit of the factor returns is followed', async () => {
    const { books, take, type, quiet, volatility } = await desk()
    await take('factors', `Factors!A1:B${WEEKS + 1}`)
    await books.compute()
    await books.choose({ estimator: { kind: 'factors' } })
    const before = volatility()
    type('Factors!B90', 0.5)
    expect((await quiet()).status).toEqual({ kind: 'up to date' })
    expect(volatility()).not.toBe(before)
  })

  test('the benchmark is the column, a series or none, and the book less itself has no active risk', async () => {
    const { books, type, quiet } = await desk()
    const { active } = books.state().breakdown!
    expect(active?.label).toBe('Column “Benchmark weight” of the holdings')
    await books.choose({ benchmark: { kind: 'series', name: 'Index' } })
    expect(books.state().breakdown?.active?.names.at(-1)).toBe('Index (the benchmark)')
    await books.choose({ benchmark: { kind: 'none' } })
    expect(books.state().breakdown?.active).toBeNull()
    await books.choose({ benchmark: { kind: 'column' } })
    type('Book!D2', 0.6)
    type('Book!D3', 0.4)
    type('Book!D4', 0)
    const own = (await quiet()).breakdown?.active
    expect(own?.risk.trackingError).toBe(0)
    expect(own?.risk.share).toBeNull()
    expect(own?.sharesWithheld).toMatch(/^Shares are not defined: the book is its benchmark/)
  })

  test('a column of benchmark weights without any weight is told', async () => {
    const { books, type, quiet } = await desk()
    type('Book!E2', 0)
    type('Book!E3', 0)
    const { breakdown } = await quiet()
    expect(breakdown?.active).toBeNull()
    expect(breakdown?.findings.map(({ sentence }) => sentence)).toContain(
      '“Benchmark weight” holds no benchmark weight: there are no figures against a benchmark.',
    )
    await books.choose({ benchmark: { kind: 'none' } })
    expect(
      books.state().breakdown?.findings.some(({ sentence }) => /no benchmark weight/.test(sentence)),
    ).toBe(false)
  })

  test('a benchmark series that is not there says so at its own field', async () => {
    const { books } = await desk()
    await books.choose({ benchmark: { kind: 'series', name: 'Gold' } })
    expect(books.state().faults.benchmark).toMatch(/found no series “Gold”/i)
  })

  test('nested groups add up to their parents and to the whole', async () => {
    const { books, volatility } = await desk()
    await books.choose({ nesting: ['Region', 'Class'] })
    const { nested } = books.state().breakdown!
    expect(nested.map(({ label }) => label)).toEqual(['North', 'South'])
    for (const group of nested)
      expect(group.children.reduce((sum, { contribution }) => sum + contribution, 0)).toBeCloseTo(
        group.contribution,
        14,
      )
    expect(nested.reduce((sum, { contribution }) => sum + contribution, 0)).toBeCloseTo(volatility(), 14)
    expect(nested[0]?.children.map(({ positions }) => positions)).toEqual([[0], [2]])
  })

  test('a tail method that does not go with the horizon says why, and the figures stand', async () => {
    const { books, volatility } = await desk()
    const before = volatility()
    await books.choose({ tails: { method: { kind: 'historical' }, confidence: 0.95, periods: 4 } })
    expect(books.state().breakdown?.tails).toMatch(/^The horizon is 4 weeks: past returns/)
    expect(volatility()).toBe(before)
    await books.choose({ tails: { method: { kind: 'normal' }, confidence: 0.95, periods: 4 } })
    expect(books.state().breakdown?.tails).toMatchObject({ label: '95% confidence, 4 weeks' })
  })
})

describe('Studies', () => {
  const bootstrap = { replicates: 200, seed: 5, blockLength: 1 }

  test('a bootstrap agrees with the bands, stands beside the figures, and goes with them', async () => {
    const { books, type, quiet } = await desk()
    await books.bootstrap(bootstrap)
    const { studies, breakdown } = books.state()
    const bands = breakdown!.bands
    if (typeof bands === 'string') throw new Error(bands)
    const ratio = studies.bootstrap!.result.volatility.deviation / bands.volatility
    // 200 replicates leave 5% of a standard deviation, 80 dates a bias of their own: 25% is far beyond both
    expect(Math.abs(ratio - 1)).toBeLessThan(0.25)
    expect(studies.bootstrap?.method).toMatch(/seed 5$/)
    await books.choose({ tails: { method: { kind: 'normal' }, confidence: 0.99, periods: 1 } })
    expect(books.state().studies.bootstrap).toBe(studies.bootstrap)
    type('Book!D2', 0.7)
    const after = (await quiet()).studies
    expect(after.bootstrap).toBeNull()
    expect(after.outdated).toEqual({ bootstrap: true, backtest: false })
    await books.bootstrap(bootstrap)
    expect(books.state().studies.outdated.bootstrap).toBe(false)
  })

  test('a new weight outdates a back-test of the book, and leaves one of forecasts made elsewhere', async () => {
    const { books, select, type, quiet } = await desk()
    const choice = { window: null, confidence: 0.95, method: 'normal' } as const
    await books.backtest(choice, 'this book')
    type('Book!D2', 0.7)
    expect((await quiet()).studies).toMatchObject({ backtest: null, outdated: { backtest: true } })
    select('Given!A1:B5')
    await books.backtest(choice, 'selection')
    const given = books.state().studies.backtest
    expect(given).not.toBeNull()
    type('Book!D2', 0.6)
    expect((await quiet()).studies).toMatchObject({ backtest: given, outdated: { backtest: false } })
  })

  test('a back-test goes through the past at today’s weights, with a sentence for each test', async () => {
    const { books } = await desk()
    await books.backtest({ window: 40, confidence: 0.95, method: 'normal' }, 'this book')
    const { studies, faults } = books.state()
    expect(faults.study).toBeUndefined()
    const study = studies.backtest!
    expect(study.result.returns).toHaveLength(40)
    expect(study.dates?.at(-1)).toBe(FIRST + 7 * (WEEKS - 1))
    expect(study.lines.map(([label]) => label)).toEqual([
      'Exceptions',
      'Unconditional coverage (Kupiec)',
      'Independence (Christoffersen)',
      'Conditional coverage (Christoffersen)',
      'Zone (Basel Committee, MAR32)',
      'Bias statistic',
    ])
  })

  test('a back-test is written with every date, so that its exceptions can be counted again', async () => {
    const { books, port } = await desk()
    await books.writeStudy('back-test')
    expect(books.state().faults.study).toMatch(/^No back-test stands beside these figures; run it first\.$/)
    await books.backtest({ window: 40, confidence: 0.95, method: 'normal' }, 'this book')
    await books.writeStudy('back-test')
    expect(books.state().faults.study).toBeUndefined()
    const { result } = books.state().studies.backtest!
    const sheet = await sheetOf(port, 'Back-test')
    const head = sheet.findIndex(([label]) => label === 'Date')
    const lines = sheet.slice(head + 1, head + 41)
    expect(lines.map((row) => row[1])).toEqual([...result.returns])
    const below = lines.filter((row) => Number(row[1]) < Number(row[3]))
    expect(below).toHaveLength(result.tests.exceptions)
    expect(lines.filter((row) => row[4] === 'exception')).toEqual(below)
    expect(sheet.flat()).toContain(
      result.tests.exceptions === 1 ? '1 of 40 dates' : `${result.tests.exceptions} of 40 dates`,
    )
  })

  test('a bootstrap is written beside the errors in closed form, and their ratio can be taken again', async () => {
    const { books, port } = await desk()
    await books.bootstrap(bootstrap)
    await books.writeStudy('bootstrap')
    const { breakdown, studies } = books.state()
    const bands = breakdown!.bands
    if (typeof bands === 'string') throw new Error(bands)
    const sheet = await sheetOf(port, 'Bootstrap')
    const head = sheet.findIndex(([label]) => label === 'Holding')
    const lines = sheet.slice(head + 1, head + 4)
    expect(lines.map((row) => row[0])).toEqual(['Meadow', 'Orchard', 'Mill'])
    expect(lines.map((row) => row[2])).toEqual([...bands.contribution])
    expect(lines.map((row) => row[3])).toEqual([...studies.bootstrap!.result.contribution.deviation])
    const total = sheet[head + 4]!
    expect(total.slice(0, 2)).toEqual(['Volatility', breakdown!.decomposition.volatility])
    const ratio = sheet.find((row) => row[0] === 'Volatility' && row !== total)?.[1]
    expect(ratio).toBe(Number(total[3]) / Number(total[2]))
    expect(sheet.flat()).toContain(`${studies.bootstrap!.method}.`)
  })

  test('forecasts made elsewhere are tested from a selection; a date without a return counts as an exception', async () => {
    const { books, select } = await desk()
    select('Given!A1:B5')
    await books.backtest({ window: null, confidence: 0.95, method: 'normal' }, 'selection')
    const { faults, studies } = books.state()
    expect(faults.study).toBeUndefined()
    expect([...studies.backtest!.result.exceptions]).toEqual([1, 0, 0, 1])
    select('Book!A1:E4')
    await books.backtest({ window: null, confidence: 0.95, method: 'normal' }, 'selection')
    expect(books.state().faults.study).toBeDefined()
  })

  test('values at risk that are all below 0 are refused, not taken for forecasts of a gain', async () => {
    const { books, select } = await desk()
    select('Signed!A1:B3')
    await books.backtest({ window: null, confidence: 0.95, method: 'normal' }, 'selection')
    expect(books.state().faults.study).toMatch(/found no number above 0 under “Value at risk”/i)
  })

  test('independence is not tested where no date follows an exception, and clusters are told from alternation', async () => {
    const { books, select } = await desk()
    const lines = async (address: string) => {
      select(address)
      await books.backtest({ window: null, confidence: 0.95, method: 'normal' }, 'selection')
      return new Map(
        books
          .state()
          .studies.backtest!.lines.map(([label, figure, meaning]) => [label, `${figure}: ${meaning}`]),
      )
    }
    const calm = await lines('Calm!A1:B31')
    expect(calm.get('Independence (Christoffersen)')).toMatch(/^not tested: No date follows an exception/)
    expect(calm.get('Conditional coverage (Christoffersen)')).toMatch(/^not tested/)
    expect((await lines('Regular!A1:B31')).get('Independence (Christoffersen)')).toMatch(
      /^p below 0\.001: Exceptions follow one another more seldom/,
    )
  })

  test('a window too short for its confidence is told, and so are the dates of a back-test under another rule for gaps', async () => {
    const { books } = await desk()
    const method = async (window: number | null, confidence: number) => {
      await books.backtest({ window, confidence, method: 'historical' }, 'this book')
      return books.state().studies.backtest!.method
    }
    expect(await method(40, 0.99)).toMatch(/fewer than the 100 dates that 99\.0% confidence needs/)
    expect(await method(40, 0.95)).not.toMatch(/fewer/)
    expect(await method(20, 0.95)).not.toMatch(/fewer/)
    await books.choose({ gaps: 'own overlap' })
    expect(await method(40, 0.95)).toMatch(/run on the 80 dates common to all holdings/)
  })

  test('bands of few dates, or of dates that count for few, say that they run narrow', async () => {
    const { books } = await desk()
    const note = () => {
      const { bands } = books.state().breakdown!
      return typeof bands === 'string' ? bands : bands.note
    }
    expect(note()).toBeNull()
    // 1 / sum of squared weights: (1 + 0.9) / (1 - 0.9) = 19 for a long history, whatever was before it
    await books.choose({ estimator: { kind: 'exponential', decay: 0.9 } })
    expect(note()).toMatch(/^By their weights 80 dates tell as much as 19 dates that count alike\. .*narrow/)
    await books.choose({ estimator: { kind: 'sample' }, lookBack: { kind: 'last', dates: 24 } })
    expect(note()).toMatch(/^The bands rest on 24 dates\./)
    await books.choose({ lookBack: { kind: 'last', dates: 4 } })
    expect(note()).toMatch(/^4 dates do not tell how far the figures vary/)
    await books.choose({ estimator: { kind: 'lagged', lags: 2 }, lookBack: { kind: 'all' } })
    await books.bootstrap(bootstrap)
    expect(books.state().studies.bootstrap?.method).toMatch(
      /those without shrinkage, factors or lagged terms/,
    )
    // five blocks of 16 dates make 80; of one block of all of them every history is the same
    await books.bootstrap({ ...bootstrap, blockLength: 16 })
    expect(books.state().studies.bootstrap?.agreement).toMatch(/in closed form/)
    await books.bootstrap({ ...bootstrap, blockLength: 80 })
    expect(books.state().studies.bootstrap?.agreement).toMatch(/^No errors to go by/)
    await books.backtest({ window: 40, confidence: 0.95, method: 'normal' }, 'this book')
    expect(books.state().studies.backtest?.method).toMatch(
      /a volatility for many dates rather than for the next/,
    )
  })

  test('a window longer than the history is told at its own field and leaves the figures alone', async () => {
    const { books } = await desk()
    await books.backtest({ window: 500, confidence: 0.95, method: 'normal' }, 'this book')
    expect(books.state().faults.study).toMatch(/found 80 dates for a window of 500/i)
    expect(books.state().status).toEqual({ kind: 'up to date' })
  })
})

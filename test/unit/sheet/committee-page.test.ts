/**
 * The page for a committee: what stands on it, that its rows add up, and that what is left out or missing is said. The books are made up; figures
 * are held against the breakdown they come from, to 1e-12: the same doubles, at most added in another order.
 */
import type { Breakdown, CellValue, Table } from '../../../src/sheet'
import { committeePage } from '../../../src/sheet/committee-page'
import { changeSince, demoBook, inputOf, keptResults, madeBook } from '../../committee-books'

const linesOf = ({ cells }: Table): string[] =>
  cells.map((row) =>
    row
      .map(({ value }) => value)
      .filter((value) => value !== '')
      .join(' | '),
  )
const rowIn = ({ cells }: Table, label: string, from = 0): number => {
  const row = cells.findIndex(([first], k) => k >= from && first?.value === label)
  if (row < 0) throw new Error(`no row ${label}`)
  return row
}
const valuesAt = ({ cells }: Table, row: number): CellValue[] => cells[row]!.map(({ value }) => value)
const near = (shown: CellValue | undefined, figure: number): void =>
  expect(Math.abs((shown as number) - figure)).toBeLessThanOrEqual(1e-12)

let demo: Breakdown
beforeAll(async () => {
  demo = await demoBook(true)
}, 60_000)

describe('the page', () => {
  test('has its parts in the order a committee reads them', () => {
    const history = keptResults(6, demo.decomposition.volatility, demo.active!.risk.trackingError)
    const page = committeePage(inputOf(demo, { history, change: changeSince(history.at(-1)!, demo) }))
    const lines = linesOf(page)
    const order = [
      'Risk report: Larkmoor Foundation',
      'Data to 27 Nov 2026, 130 dates of returns from 7 Jun 2024. Risk a year. Prepared by: R. Hollis. Page made on 1 Dec 2026.',
      'Risk and limits | ',
      'Volatility a year | ',
      'Tracking error (ex ante) a year | ',
      'Region: Islands, share of risk | ',
      '25 limits: 2 breached',
      'Change since 30 Oct 2026 | ',
      'Largest contributors | Weight | Contribution | Share of risk | 95% band',
      'Risk-reducing positions',
      'Others (',
      'Total | 1 | ',
      'By Asset class | Weight | Contribution | Share of risk | By Region',
      'Concentration and leverage | Large losses: 95% confidence, 1 week',
      'Risk through time | Volatility | Tracking error',
      'Data warnings: 2',
      'Settings. ',
      'An estimate from past returns, not advice.',
    ]
    let at = 0
    for (const begin of order) {
      const found = lines.findIndex((line, k) => k >= at && line.startsWith(begin))
      expect([begin, found >= 0]).toEqual([begin, true])
      at = found
    }
    expect(page.page).toEqual({
      paper: 'A4',
      orientation: 'portrait',
      onePage: true,
      header: { left: 'Larkmoor Foundation', right: 'Data to 27 Nov 2026' },
      footer: 'An estimate from past returns, not advice. Local rules and licensed practice come first.',
    })
  })

  test('puts breaches before what is over a soft limit, each with its band, its limits and a mark that differs by shape', () => {
    const lines = linesOf(committeePage(inputOf(demo)))
    const statuses = lines.flatMap((line) => /[●◐○] .*$/.exec(line) ?? [])
    expect(statuses).toEqual([
      '○ Within, 1.66% below hard limit',
      '○ Within, 0.59% below hard limit',
      '● Breach, 2.7% over hard limit',
      '● Breach, 0.9% over hard limit',
      '◐ Over soft limit by 1.00%',
    ])
    expect(lines.find((line) => line.startsWith('Volatility a year'))).toMatch(
      /^Volatility a year \| 0\.083\d+ \| 7\.18% to 9\.51% \| 0\.09 \| 0\.1 \| ○/,
    )
  })

  test('bands the tracking error as the volatility of the active weights', () => {
    const bands = demo.bands as Exclude<Breakdown['bands'], string>
    const { weights, benchmark, risk } = demo.active!
    const error = bands.ofVolatility(weights.map((weight, i) => weight - benchmark[i]!))
    const row = valuesAt(
      committeePage(inputOf(demo)),
      rowIn(committeePage(inputOf(demo)), 'Tracking error (ex ante) a year'),
    )
    const shown = String(row[4])
      .split(' to ')
      .map((end) => parseFloat(end) / 100)
    expect(shown[0]).toBeCloseTo(risk.trackingError - 1.96 * error, 4)
    expect(shown[1]).toBeCloseTo(risk.trackingError + 1.96 * error, 4)
  })

  test('counts the limits it has no room for', async () => {
    const crowded = { ...demo, limits: Array.from({ length: 12 }, () => demo.limits.find(({ status }) => status === 'breach')!) } // prettier-ignore
    const history = keptResults(9, 0.08, 0.01)
    const lines = linesOf(committeePage(inputOf(crowded, { paper: 'Letter', history })))
    const listed = lines.filter((line) => line.includes('● Breach')).length
    expect(listed).toBeLessThan(12)
    expect(lines).toContain(
      `12 limits: 12 breached. ${12 - listed} of those exceeded are not on this page (${12 - listed} breached): see the table of contributions to risk.`,
    )
  })
})

describe('its rows add up', () => {
  const books: readonly (readonly [string, () => Promise<Breakdown>])[] = [
    ['the demo', () => Promise.resolve(demo)],
    ['5 positions', () => madeBook({ positions: 5, weight: () => 0.2, groups: 1 })],
    ['500 positions', () => madeBook({ positions: 500, weight: (k) => (k % 7 === 3 ? -0.001 : 0.0025), groups: 2 })],
    ['long and short', () => madeBook({ positions: 20, weight: (k) => (k % 2 ? -0.1 : 0.1), groups: 6 })],
  ] // prettier-ignore
  test.each(books)('%s', async (_, book) => {
    const breakdown = await book()
    const page = committeePage(inputOf(breakdown))
    const { decomposition: d } = breakdown
    const first = rowIn(page, 'Largest contributors') + 1
    const total = rowIn(page, 'Total', first)
    for (const [column, whole] of [[1, breakdown.net], [2, d.volatility], [3, 1]] as const) {
      const parts = page.cells.slice(first, total).map((row) => Number(row[column]!.value))
      near(parts.reduce((sum, part) => sum + part, 0), whole)
      near(valuesAt(page, total)[column], whole)
    }
    const shown = page.cells.slice(first, total).filter(([label]) => breakdown.names.includes(String(label!.value)))
    const others = page.cells.slice(first, total).flatMap(([label]) => /^Others \((\d+)\)$/.exec(String(label!.value))?.[1] ?? [])
    expect(shown.length + Number(others[0] ?? 0)).toBe(breakdown.names.length)

    const group = page.cells.findIndex(([label]) => String(label!.value).startsWith('By '))
    for (const [labels, columns] of [[0, [1, 2, 3]], [6, [8, 9, 10]]] as const) {
      if (page.cells[group]![labels]!.value === '') continue
      const end = page.cells.findIndex((row, k) => k > group && row[labels]!.value === 'Total')
      columns.forEach((column, k) => {
        const parts = page.cells.slice(group + 1, end).map((row) => Number(row[column]!.value))
        near(parts.reduce((sum, part) => sum + part, 0), [breakdown.net, d.volatility, 1][k]!)
      })
    }
  }, 60_000) // prettier-ignore
})

describe('what is missing is said', () => {
  test('for a covariance matrix: no dates, no bands, no large losses; and no limits, groups, kept results, benchmark or name', async () => {
    const matrix = await madeBook({ positions: 4, weight: () => 0.25, isMatrix: true })
    const page = committeePage(inputOf(matrix, { preparedBy: '' }))
    const text = linesOf(page).join('\n')
    for (const sentence of [
      'Data: a covariance matrix as given, without dates.',
      'Prepared by: not named.',
      'Volatility per period',
      'No limit is set',
      'No limits are set for this book.',
      'No error bands: A covariance matrix does not tell how many dates it rests on.',
      'not shown, as no benchmark is chosen',
      'No result has been kept yet: what changed cannot be told.',
      'Risk-reducing positions: none',
      'The holdings have no column that groups them.',
      'Not shown. A covariance matrix holds no past returns',
      'No result is kept: at least 3 are needed to show a course.',
      'The data have not been looked over for further faults.',
    ])
      expect(text).toContain(sentence)
    expect(page.page?.header.right).toBe('Data without dates')
    expect(page.charts?.map(({ title }) => title)).toEqual(['Weight and share of risk'])
  })

  test('for shares that are withheld: no column of them, no chart of them, and why', () => {
    const withheld = { ...demo, sharesWithheld: 'Shares of risk are withheld.' }
    const page = committeePage(inputOf(withheld))
    expect(linesOf(page)).toContain('Largest contributors | Weight | Contribution | 95% band')
    expect(linesOf(page).join(' ')).toContain('Shares of risk are withheld.')
    const [chart] = page.charts!
    expect([chart!.title, chart!.series.map(({ name }) => name)]).toEqual(['Contribution to risk', ['Contribution to risk']]) // prettier-ignore
  })

  test('for a change that is not split by its causes', () => {
    const history = keptResults(1, 0.08, null)
    const change = { ...changeSince(history[0]!, demo), total: 'A matrix is missing.' }
    const text = linesOf(committeePage(inputOf(demo, { history, change }))).join('\n')
    expect(text).toMatch(/Volatility a year from 7\.20% to 8\.34%: \+1\.14%\. Not split by cause: A matrix is missing\./) // prettier-ignore
    const told = linesOf(
      committeePage(inputOf(demo, { history, change: 'The only result kept is this one.' })),
    )
    expect(told).toContain('Not told: The only result kept is this one.')
  })

  test('for names that are too long: the words that tell them apart stay, and it is said that they are shortened', async () => {
    const long = await madeBook({ positions: 8, weight: () => 0.125, areNamesLong: true, groups: 2 })
    const page = committeePage(inputOf(long))
    const first = rowIn(page, 'Largest contributors') + 1
    const labels = page.cells.slice(first, first + 8).map(([label]) => String(label!.value))
    expect(new Set(labels).size).toBe(8)
    for (const label of labels) expect(label).toMatch(/…/)
    expect(linesOf(page).join('\n')).toContain('What has … is shortened here: see the table of contributions to risk.') // prettier-ignore
  })
})

describe('its charts', () => {
  test('draw figures that stand in cells of the page, and say in words what they show', () => {
    const history = keptResults(6, 0.08, 0.009)
    const page = committeePage(inputOf(demo, { history }))
    const [bars, line] = page.charts!
    const column = (span: { row: number; column: number; rows: number }): CellValue[] =>
      page.cells.slice(span.row, span.row + span.rows).map((row) => row[span.column]!.value)
    const names = column(bars!.categories).filter((name) => name !== 'Risk-reducing positions')
    const places = names.map((name) => demo.names.indexOf(String(name)))
    expect(places.every((place) => place >= 0)).toBe(true)
    const figures = bars!.series.map(({ values }) => column(values).filter((value) => value !== ''))
    expect(figures[0]).toEqual(places.map((i) => demo.decomposition.weights[i]))
    expect(figures[1]).toEqual(places.map((i) => demo.decomposition.share![i]))
    expect(bars!.alt).toContain('“Northern coast equities”, has 14.0% of the weight and 26.5% of the risk')
    expect(column(line!.categories).at(-1)).toBe('This page')
    expect(column(line!.series[0]!.values).at(-1)).toBe(demo.decomposition.volatility)
    expect(line!.alt).toMatch(/^A line of the volatility at \d dates: from .* to 8\.34% \(This page\), and one of the tracking error\.$/) // prettier-ignore
    // nothing of the page lies under them
    for (const { over } of page.charts!)
      for (const row of page.cells.slice(over.row, over.row + over.rows))
        expect(row.slice(over.column, over.column + over.columns).every(({ value }) => value === '')).toBe(
          true,
        )
  })

  test('leave the course of risk out while fewer than three results are kept, and end at the last one where it is this page', () => {
    const titles = (count: number): (string | undefined)[] =>
      committeePage(inputOf(demo, { history: keptResults(count, 0.08, null) })).charts!.map(
        ({ title }) => title,
      )
    expect(titles(2)).toEqual(['Weight and share of risk'])
    expect(titles(3)).toEqual(['Weight and share of risk', 'Risk a year through time'])
    const same = keptResults(3, 0.08, null).map((head, k) => (k === 2 ? { ...head, volatility: demo.decomposition.volatility } : head)) // prettier-ignore
    const lines = linesOf(committeePage(inputOf(demo, { history: same })))
    expect(lines.some((line) => line.startsWith('This page'))).toBe(false)
  })

  test('bring results that were kept per period to the scale of the page', () => {
    const kept = keptResults(3, 0.08, 0.009)
    const weekly = kept.map((head) => ({ ...head, volatility: head.volatility / Math.sqrt(52), trackingError: head.trackingError! / Math.sqrt(52), periodsPerYear: 1 })) // prettier-ignore
    const course = (history: typeof kept): number[][] => {
      const page = committeePage(inputOf(demo, { history }))
      return page
        .charts!.at(-1)!
        .series.map(({ values: { row, column, rows } }) =>
          page.cells.slice(row, row + rows).map((cells) => Number(cells[column]!.value)),
        )
    }
    // a root taken and undone: a few units of the last digit
    course(weekly).forEach((line, k) => {
      line.forEach((value, t) => {
        expect(value).toBeCloseTo(course(kept)[k]![t]!, 15)
      })
    })
    const page = linesOf(committeePage(inputOf(demo, { history: weekly }))).join(' ')
    expect(page).toContain('each under the settings of its day but scaled as this page is')
  })
})

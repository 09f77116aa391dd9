/**
 * What changed between two results, and how it is laid out. Oracles: contributions and parts worked out here from weights, volatilities and
 * correlations by the definitions (the split itself is held against other computations where core's is), and results computed from blocks.
 */
import type { CellValue, Settings, Table } from '../../../src/sheet'
import { DEFAULT_SETTINGS, steppingCalculator } from '../../../src/sheet'
import { changeSteps, changeTable } from '../../../src/sheet/change-table'
import { percentText } from '../../../src/sheet/wording'
import { growthBetween, remakeFrom } from '../../../src/sheet/history'
import type { ChangeSources, RiskChange } from '../../../src/sheet/risk-change'
import { riskChangeOf } from '../../../src/sheet/risk-change'
import type { Snapshot } from '../../../src/sheet/snapshot'
import { idleWork } from './blocks-of-cells'
import { blocksOf, FRIDAY, resultOf, weekly } from './results'

/** volatilities near 0.1: a hundred roundings */
const TOLERANCE = 1e-14

interface Made {
  readonly names?: readonly string[]
  readonly weights: readonly number[]
  readonly volatilities: readonly number[]
  /** row by row */
  readonly correlations: readonly number[]
}

/** A result of these figures, whose volatility and contributions follow from them. */
function snapshot(made: Made, more: Partial<Snapshot> = {}): Snapshot {
  const { names = ['Oak', 'Elm'], weights, volatilities, correlations } = made
  const x = weights.map((weight, i) => weight * volatilities[i]!)
  const products = x.map(
    (xi, i) => xi * x.reduce((sum, xj, j) => sum + correlations[i * x.length + j]! * xj, 0),
  )
  const volatility = Math.sqrt(products.reduce((sum, product) => sum + product, 0))
  return {
    id: '1',
    title: 'Orchard',
    note: '',
    keptOn: FRIDAY + 2,
    dataDate: FRIDAY,
    volatility,
    trackingError: null,
    positions: names.length,
    inputsHash: JSON.stringify([made, more.settings, more.dataDate]),
    names,
    groupHeaders: [],
    groups: names.map(() => []),
    weights: Float64Array.from(weights),
    volatilities: Float64Array.from(volatilities),
    contribution: Float64Array.from(products, (product) => product / volatility),
    correlations: Float64Array.from(correlations),
    horizon: 'a year',
    periodsPerYear: 52,
    dates: { used: 60, dropped: 0, first: FRIDAY - 7 * 59, last: FRIDAY },
    settings: DEFAULT_SETTINGS,
    settingLines: [['Estimator', 'Sample covariance'], ['Look-back', 'All dates'], ['Dates used', '60']], // prettier-ignore
    returnsHash: 'r',
    ...more,
  }
}

const NO_SOURCES: ChangeSources = {
  remake: () => Promise.resolve('The data are gone.'),
  growth: () => 'Nobody asked the prices.',
}

const LATER: Partial<Snapshot> = { id: '2', keptOn: FRIDAY + 9, dataDate: FRIDAY + 7 }
const OLD = { weights: [0.6, 0.4], volatilities: [0.2, 0.1], correlations: [1, 0.3, 0.3, 1] }
const NEW = { weights: [0.5, 0.5], volatilities: [0.25, 0.12], correlations: [1, 0.1, 0.1, 1] }

const partsOf = ({ total }: RiskChange): Exclude<RiskChange['total'], string> => {
  if (typeof total === 'string') throw new Error(total)
  return total
}
const near = (a: number, b: number): boolean => Math.abs(a - b) <= TOLERANCE

/** What has to hold of every comparison that is split. */
function expectTied(change: RiskChange): void {
  const total = partsOf(change)
  expect(near(change.sum, change.change)).toBe(true)
  expect(change.difference).toBe(change.sum - change.change)
  const sides = [change.holdings, ...change.groups.map(({ lines }) => lines)]
  for (const lines of sides) {
    const sum = (of: (line: (typeof lines)[number]) => number): number =>
      lines.reduce((all, line) => all + of(line), 0)
    for (const cause of ['positions', 'volatilities', 'correlations'] as const)
      expect(
        near(
          sum((line) => line[cause]),
          total[cause],
        ),
      ).toBe(true)
    expect(
      near(
        sum((line) => line.settings),
        change.settings?.effect ?? 0,
      ),
    ).toBe(true)
    expect(
      near(
        sum((line) => line.contributionFrom),
        change.from.volatility,
      ),
    ).toBe(true)
    expect(
      near(
        sum((line) => line.contributionTo),
        change.to.volatility,
      ),
    ).toBe(true)
    for (const line of lines)
      expect(
        near(
          line.settings + line.positions + line.volatilities + line.correlations,
          line.contributionTo - line.contributionFrom,
        ),
      ).toBe(true)
  }
}

describe('What changed', () => {
  test('adds up in total, by holding and by group', async () => {
    const groups = { groupHeaders: ['Kind'], groups: [['Hard wood'], ['Soft wood']] }
    const change = await riskChangeOf(snapshot(OLD, groups), snapshot(NEW, { ...LATER, ...groups }), {
      ...NO_SOURCES,
      growth: () => Float64Array.of(1.1, 0.95),
    })
    expectTied(change)
    expect(change.to.isNow).toBe(false)
    expect(change.settings).toBeNull()
    const { positions, drift, trades } = partsOf(change)
    expect(near(drift! + trades!, positions)).toBe(true)
    expect(change.groups[0]!.lines.map(({ label }) => label)).toEqual(['Hard wood', 'Soft wood'])
    expect(change.notes).toEqual([
      'Drift of weights: what returns after 27 Nov 2026 up to 4 Dec 2026 made of the weights compared from, nothing traded. Weights are taken as shares of capital; what they leave to 100% counts as cash that earns nothing.',
    ])
  })

  test('lets weights drift with their growth and cash stay', async () => {
    // 0.5 at growth 1.2 beside 0.5 cash: 0.6 / 1.1, which is what stands there: all of it is drift
    const one = (weight: number): Made => ({
      names: ['Oak'],
      weights: [weight],
      volatilities: [0.2],
      correlations: [1],
    })
    const change = await riskChangeOf(snapshot(one(0.5)), snapshot(one(0.6 / 1.1), LATER), {
      ...NO_SOURCES,
      growth: (names, from, to) => {
        expect([names, from, to]).toEqual([['Oak'], FRIDAY, FRIDAY + 7])
        return Float64Array.of(1.2)
      },
    })
    expect(near(partsOf(change).drift!, 0.2 * (0.6 / 1.1 - 0.5))).toBe(true)
    expect(partsOf(change).trades).toBe(0)
  })

  test('asks no prices of what does not move or is not held', async () => {
    const names = ['Oak', 'Cash', 'Elm']
    const of = { names, weights: [0.5, 0.5, 0], volatilities: [0.2, 0, 0.3], correlations: [1, 0, 0, 0, 1, 0, 0, 0, 1] } // prettier-ignore
    const asked: string[] = []
    const change = await riskChangeOf(snapshot(of), snapshot(of, LATER), {
      ...NO_SOURCES,
      growth: (wanted) => {
        asked.push(...wanted)
        return Float64Array.from(wanted, () => 1.2)
      },
    })
    expect(asked).toEqual(['Oak'])
    // drift to 0.6 / 1.1, traded back
    expect(near(partsOf(change).drift!, 0.2 * (0.6 / 1.1 - 0.5))).toBe(true)
    expect(near(partsOf(change).trades!, -partsOf(change).drift!)).toBe(true)
  })

  test.each([
    [
      'where data have no dates',
      { dataDate: null },
      LATER,
      'The data of the result compared from have no dates.',
    ],
    [
      'between results of one date',
      {},
      { id: '2' },
      'Both results rest on data to 27 Nov 2026: prices had no time to move.',
    ],
    [
      'backwards',
      LATER,
      {},
      'The result compared to rests on older data (to 27 Nov 2026) than the one compared from (to 4 Dec 2026).',
    ],
    ['where the returns do not reach', {}, LATER, 'Nobody asked the prices.'],
  ])('does not part drift from trades %s, and says why', async (_, from, to, reason) => {
    // prettier-ignore
    const change = await riskChangeOf(snapshot(OLD, from), snapshot(NEW, to), NO_SOURCES)
    expectTied(change)
    expect(partsOf(change)).toMatchObject({ drift: null, trades: null })
    expect(change.notes).toContain(`Positions are not parted into drift and trades. ${reason}`)
  })

  test('does not part them where the returns take all capital', async () => {
    const change = await riskChangeOf(snapshot(OLD), snapshot(NEW, LATER), {
      ...NO_SOURCES,
      growth: () => Float64Array.of(-0.8, 0),
    })
    expect(partsOf(change).drift).toBeNull()
    expect(change.notes.join(' ')).toContain('would have taken all of the capital')
  })

  test('takes what new and gone holdings lack from the other side, and says so', async () => {
    const to = { names: ['Ash', '  OAK '], weights: [0.3, 0.5], volatilities: [0.3, 0.25], correlations: [1, -0.2, -0.2, 1] } // prettier-ignore
    const change = await riskChangeOf(snapshot(OLD), snapshot(to, LATER), NO_SOURCES)
    expectTied(change)
    expect(change.holdings.map(({ label, presence }) => [label, presence])).toEqual([
      ['Ash', 'new'],
      ['  OAK ', 'both'],
      ['Elm', 'gone'],
    ])
    expect(change.holdings[0]).toMatchObject({ volatilityFrom: null, volatilityTo: 0.3, contributionFrom: 0 })
    expect(change.holdings[2]).toMatchObject({ volatilityFrom: 0.1, volatilityTo: null, weightTo: 0 })
    expect(change.notes.slice(0, 2)).toEqual([
      'New: “Ash”. Its volatility and correlations on the side compared from are taken from the side compared to.',
      'Gone: “Elm”. Its volatility and correlations on the side compared to are taken from the side compared from.',
    ])
  })

  test('is not split where correlations of both sides fit together no more', async () => {
    const from = { ...OLD, correlations: [1, 0.95, 0.95, 1] }
    const to = { names: ['Oak', 'Elm', 'Ash'], weights: [0.3, 0.3, 0.4], volatilities: [0.2, 0.2, 0.2], correlations: [1, -0.9, 0.2, -0.9, 1, -0.6, 0.2, -0.6, 1] } // prettier-ignore
    const change = await riskChangeOf(snapshot(from), snapshot(to, LATER), NO_SOURCES)
    // least eigenvalue: numpy 2.4.6, eigvalsh of [[1, .95, .2], [.95, 1, -.6], [.2, -.6, 1]]: -0.22038
    expect(change.total).toBe(
      'A holding that is held on one side alone takes its correlations there from the other side, and with them those of the result compared from fit together no more: a portfolio of these holdings could have a variance below 0 (least eigenvalue of the correlations −0.2204).',
    )
    expect(change.sum).toBeNaN()
    expect(change.holdings[2]).toMatchObject({ positions: NaN, settings: 0, drift: null })
    expect(changeSteps(change).map(({ label }) => label)).toEqual(['From', 'Not split', 'To'])
  })

  test('is not split where neither side knows a correlation', async () => {
    const from = { ...OLD, volatilities: [0.2, 0.1] }
    const to = { names: ['Oak', 'Elm', 'Ash'], weights: [0.3, 0.3, 0.4], volatilities: [0.2, 0, 0.2], correlations: [1, 0, 0.2, 0, 1, 0, 0.2, 0, 1] } // prettier-ignore
    const change = await riskChangeOf(snapshot(from), snapshot(to, LATER), NO_SOURCES)
    expect(change.total).toBe(
      'The correlation between “Ash” and “Elm” is in neither result, and a mix of the two would need it.',
    )
  })

  test('makes correlations again that were not kept, or says why it cannot', async () => {
    const from = snapshot(OLD, { correlations: null })
    const refused = await riskChangeOf(from, snapshot(NEW, LATER), NO_SOURCES)
    expect(refused.total).toBe(
      'The correlations of the result compared from were not kept, as its holdings are many. The data are gone.',
    )
    const change = await riskChangeOf(from, snapshot(NEW, LATER), {
      ...NO_SOURCES,
      remake: (of, under) => {
        expect([of, under]).toEqual([from, from.settings])
        return Promise.resolve(snapshot(OLD))
      },
    })
    const whole = await riskChangeOf(snapshot(OLD), snapshot(NEW, LATER), NO_SOURCES)
    expect(change.total).toEqual(whole.total)
  })

  test('says where both results rest on the same inputs', async () => {
    const change = await riskChangeOf(snapshot(OLD), { ...snapshot(OLD), isNow: true }, NO_SOURCES)
    expect(change.notes[0]).toBe('Both results rest on the same inputs.')
    expect(change.to.isNow).toBe(true)
    expect(partsOf(change)).toMatchObject({ positions: 0, volatilities: 0, correlations: 0 })
  })

  test('groups a holding where it is now, or was last, and tells who has another label', async () => {
    const from = snapshot(OLD, { groupHeaders: ['Kind', 'Desk'], groups: [['Hard wood', 'A'], ['Soft wood', 'B']] }) // prettier-ignore
    const to = snapshot(
      { names: ['Oak'], weights: [1], volatilities: [0.2], correlations: [1] },
      { ...LATER, groupHeaders: ['kind', 'Land'], groups: [['Timber', 'North']] },
    )
    const change = await riskChangeOf(from, to, NO_SOURCES)
    expectTied(change)
    expect(change.groups).toHaveLength(1)
    expect(change.groups[0]!.lines.map(({ label, presence }) => [label, presence])).toEqual([
      ['Timber', 'both'],
      ['Soft wood', 'gone'],
    ])
    expect(change.notes).toContain(
      'kind: “Oak” has another label than before, and counts under the later one on both sides.',
    )
    expect(change.notes).toContain(
      'Not told by “Land” and “Desk”: one of the two results has no such column.',
    )
  })
})

const under = (settings: Partial<Settings>, lines: Snapshot['settingLines']): Partial<Snapshot> => ({
  settings: { ...DEFAULT_SETTINGS, ...settings },
  settingLines: lines,
})

describe('Changed settings', () => {
  const exponential = under({ estimator: { kind: 'exponential', decay: 0.97 } }, [
    ['Estimator', 'Exponential weighting'],
    ['Look-back', 'All dates'],
  ])
  const AGAIN = { ...OLD, volatilities: [0.3, 0.1] }

  test('come first, by making the side compared from again', async () => {
    const change = await riskChangeOf(snapshot(OLD), snapshot(NEW, { ...LATER, ...exponential }), {
      ...NO_SOURCES,
      remake: (of, settings) => {
        expect([of.id, settings.estimator.kind]).toEqual(['1', 'exponential'])
        return Promise.resolve(snapshot(AGAIN))
      },
    })
    expectTied(change)
    expect(near(change.settings!.effect!, snapshot(AGAIN).volatility - snapshot(OLD).volatility)).toBe(true)
    expect(change.settings!.changed).toEqual([
      { label: 'Estimator', from: 'Sample covariance', to: 'Exponential weighting' },
    ])
    const rest = await riskChangeOf(snapshot(AGAIN), snapshot(NEW, LATER), NO_SOURCES)
    expect(change.total).toEqual(rest.total)
    expect(changeSteps(change).map(({ label }) => label)).toEqual(['From', 'Settings', 'Positions', 'Volatilities', 'Correlations', 'To']) // prettier-ignore
  })

  test('are taken out of the other side where that alone can be made again', async () => {
    const to = snapshot(NEW, { ...LATER, ...exponential })
    const change = await riskChangeOf(snapshot(OLD), to, {
      ...NO_SOURCES,
      remake: (of, settings) =>
        Promise.resolve(
          of.id === '1'
            ? 'The data are gone.'
            : snapshot({ ...NEW, volatilities: [0.2, 0.12] }, { ...LATER, settings }),
        ),
    })
    expectTied(change)
    const back = snapshot({ ...NEW, volatilities: [0.2, 0.12] })
    expect(near(change.settings!.effect!, to.volatility - back.volatility)).toBe(true)
    expect(change.settings!.sentence).toContain('The other way round it cannot be done. The data are gone.')
  })

  test('leave the change whole where neither side can be made again', async () => {
    const change = await riskChangeOf(snapshot(OLD), snapshot(NEW, { ...LATER, ...exponential }), NO_SOURCES)
    expect(change.settings).toMatchObject({ effect: null, changed: [{ label: 'Estimator' }] })
    expect(change.total).toBe(
      'The settings differ, and neither result can be made again under those of the other, so that what they do cannot be told from the rest. Compared from: The data are gone. Compared to: The data are gone.',
    )
    expect(change.holdings[0]!.settings).toBeNaN()
  })

  test('of scaling alone need no data', async () => {
    const perPeriod = snapshot(
      { ...OLD, volatilities: [0.02, 0.01] },
      { horizon: 'per period', periodsPerYear: 1, settingLines: [['Scaling', 'Per period, not scaled']] },
    )
    const change = await riskChangeOf(perPeriod, snapshot(NEW, LATER), NO_SOURCES)
    expectTied(change)
    expect(change.settings!.effect).toBeCloseTo(perPeriod.volatility * (Math.sqrt(52) - 1), 14)
    expect(change.settings!.changed).toEqual([
      { label: 'Scaling', from: 'Per period, not scaled', to: 'None chosen' },
    ])
    expect(change.horizon).toBe('a year')
  })

  test('are none where only the dates, the holdings or what has no part in it are others', async () => {
    const from = snapshot(OLD, under({ riskless: ['Gone deposit'], nesting: ['Kind'], lookBack: { kind: 'last', dates: 60 } }, [['Look-back', 'Last 60 dates']])) // prettier-ignore
    const to = snapshot(NEW, { ...LATER, ...under({ riskless: ['New deposit'], repair: 'shrunk', lookBack: { kind: 'last', dates: 60 } }, [['Look-back', 'Last 60 dates']]) }) // prettier-ignore
    expect((await riskChangeOf(from, to, NO_SOURCES)).settings).toBeNull()
  })

  test('keep the marks of holdings that only one side has', async () => {
    const names = ['Oak', 'Deposit']
    const old = { names, weights: [0.6, 0.4], volatilities: [0.2, 0], correlations: [1, 0, 0, 1] }
    const from = snapshot(old, under({ riskless: ['Deposit'] }, []))
    let asked: readonly string[] = []
    await riskChangeOf(from, snapshot(NEW, { ...LATER, ...exponential }), {
      ...NO_SOURCES,
      remake: (of, settings) => {
        if (of.id === '1') asked = settings.riskless
        return Promise.resolve('no')
      },
    })
    expect(asked).toEqual(['Deposit'])
  })

  test.each<[string, Partial<Snapshot>, Partial<Snapshot>, RiskChange['settings']]>([
    [
      'a covariance matrix in place of returns',
      {},
      { dates: null },
      {
        effect: null,
        sentence: '',
        changed: [{ label: 'Data', from: 'Returns', to: 'A covariance matrix as given' }],
      },
    ],
    [
      'a riskless mark',
      {},
      under({ riskless: ['elm'] }, []),
      { effect: null, sentence: '', changed: [{ label: 'Riskless', from: 'None', to: 'elm' }] },
    ],
    [
      'the kind of returns',
      {},
      under({ returnKind: 'log' }, []),
      {
        effect: null,
        sentence: '',
        changed: [{ label: 'Kind of returns', from: 'Simple returns', to: 'Log returns' }],
      },
    ],
    [
      'a repair',
      under({ gaps: 'own overlap' }, []),
      under({ gaps: 'own overlap', repair: 'shrunk' }, []),
      {
        effect: null,
        sentence: '',
        changed: [
          {
            label: 'Repair of pairs',
            from: 'The nearest correlation matrix',
            to: 'All correlations made smaller alike',
          },
        ],
      },
    ],
    [
      'a base currency',
      {},
      under({ currency: { base: 'EUR', returnsIn: 'base' } }, [['Base currency', 'EUR; stated']]),
      {
        effect: null,
        sentence: '',
        changed: [{ label: 'Base currency', from: 'None chosen', to: 'EUR; stated' }],
      },
    ],
  ])('are told in words: %s', async (_, from, to, expected) => {
    // prettier-ignore
    const change = await riskChangeOf(snapshot(OLD, from), snapshot(NEW, { ...LATER, ...to }), NO_SOURCES)
    expect(change.settings!.changed).toEqual(expected!.changed)
  })
})

describe('Results of a workbook', () => {
  const NAMES = ['Oak', 'Elm', 'Ash']
  const LONG = weekly(NAMES, 80)
  const EARLIER = [LONG[0]!, ...LONG.slice(1, -4)]
  const holdings = (...weights: number[]): CellValue[][] => [
    ['Holding', 'Weight'],
    ...NAMES.flatMap((name, i) => (weights[i] === 0 ? [] : [[name, weights[i]!]])),
  ]
  const sourcesOf = (now: ReturnType<typeof blocksOf>): ChangeSources => ({
    remake: (of, settings) => remakeFrom(of, settings, now, steppingCalculator, idleWork()),
    growth: (names, from, to) => growthBetween(now, names, from, to),
  })

  test('are compared with drift by the returns between their dates, and with settings from their own data', async () => {
    const before = await resultOf(blocksOf(holdings(0.5, 0.3, 0.2), EARLIER))
    const now = blocksOf(holdings(0.4, 0.6, 0), LONG)
    const settings: Settings = { ...DEFAULT_SETTINGS, estimator: { kind: 'exponential', decay: 0.94 } }
    const after = await resultOf(now, { settings, id: 'now', extent: 'whole' })
    const change = await riskChangeOf(before, { ...after, isNow: true }, sourcesOf(now))
    expectTied(change)
    expect(partsOf(change).drift).not.toBeNull()
    const remade = await resultOf(blocksOf(holdings(0.5, 0.3, 0.2), EARLIER), { settings })
    expect(near(change.settings!.effect!, remade.volatility - before.volatility)).toBe(true)
    expect(change.settings!.changed.map(({ label }) => label)).toEqual(['Estimator'])
  })
})

const column = (table: Table, k: number): readonly CellValue[] => table.cells.map((row) => row[k]!.value)
const rowOf = (table: Table, label: string): readonly CellValue[] =>
  table.cells.find((row) => row[0]!.value === label)!.map(({ value }) => value)

describe('The table of a comparison', () => {
  const compared = (): Promise<RiskChange> =>
    riskChangeOf(
      snapshot(OLD, { note: 'Before the committee' }),
      { ...snapshot(NEW, LATER), isNow: true },
      { ...NO_SOURCES, growth: () => Float64Array.of(1.1, 0.95) },
    )

  test('says what it is, of which data, by which settings, and prints sum and difference', async () => {
    const change = await compared()
    const table = changeTable('Orchard', change)
    const first = column(table, 0)
    expect(first[0]).toBe('What changed: Orchard')
    expect(first[1]).toBe(
      `Volatility a year from ${(snapshot(OLD).volatility * 100).toFixed(2)}% to ${(snapshot(NEW).volatility * 100).toFixed(2)}%: +${(change.change * 100).toFixed(2)}% in points of volatility. Volatilities and contributions are by the year.`,
    )
    expect(first[2]).toBe(
      'An estimate from past returns, not advice. Local rules and licensed practice come first.',
    )
    expect(rowOf(table, 'From').slice(1, 9)).toEqual([change.from.volatility, 2, FRIDAY + 2, FRIDAY, 'Before the committee', '', '', 'Orchard']) // prettier-ignore
    expect(rowOf(table, 'To').slice(1, 9)).toEqual([change.to.volatility, 2, 'not kept', FRIDAY + 7, 'None', '', '', 'Orchard']) // prettier-ignore
    expect(rowOf(table, 'Sum of parts')[1]).toBe(change.sum)
    expect(rowOf(table, 'Change of volatility')[1]).toBe(change.change)
    expect(rowOf(table, 'Difference')[1]).toBe(change.difference)
    expect(rowOf(table, 'Estimator')[1]).toBe('Sample covariance')
    expect(table.page).toMatchObject({
      orientation: 'landscape',
      header: { right: 'Data to 27 Nov 2026 and 4 Dec 2026' },
    })
  })

  test('has rows of one width, text as text, and no sentence longer than it is wide', async () => {
    const table = changeTable('=1+1', await compared())
    const room = table.widths.reduce((sum, width) => sum + width, 0)
    for (const row of table.cells) {
      expect(row).toHaveLength(table.widths.length)
      for (const { value, format, formula } of row) {
        expect(formula).toBeUndefined()
        if (typeof value === 'string' && value !== '') expect(format).toBe('@')
        expect(String(value).length).toBeLessThanOrEqual(room)
      }
    }
    expect(table.numeric).toHaveLength(table.widths.length)
  })

  test('gives each holding its parts, with what they miss its change by', async () => {
    const change = await compared()
    const table = changeTable('Orchard', change)
    const heads = table.cells.find((row) => row[0]!.value === 'Holding')!.map(({ value }) => value)
    const oak = rowOf(table, 'Oak')
    const at = (head: string): CellValue => oak[heads.indexOf(head)]!
    const [line] = change.holdings
    expect(at('Weight, from')).toBe(0.6)
    expect(at('Change of contribution')).toBe(line!.contributionTo - line!.contributionFrom)
    expect(at('Drift of weights')).toBe(line!.drift)
    expect(at('Trades')).toBe(line!.trades)
    expect(at('Volatilities')).toBe(line!.volatilities)
    expect(at('Correlations')).toBe(line!.correlations)
    expect(Math.abs(Number(at('Sum of parts less change')))).toBeLessThanOrEqual(TOLERANCE)
    expect(heads).not.toContain('Settings')
  })

  test('draws the way it prints: each column ends where the next begins, on room that is not seen', async () => {
    const table = changeTable('Orchard', await compared())
    const [chart] = table.charts!
    const read = ({ row, column: k, rows }: { row: number; column: number; rows: number }): CellValue[] =>
      table.cells.slice(row, row + rows).map((cells) => cells[k]!.value)
    const names = read(chart!.categories)
    expect(names).toEqual(['From', 'Drift of weights', 'Trades', 'Volatilities', 'Correlations', 'To'])
    const [under, level, rise, fall] = chart!.series.map(({ values }) => read(values).map(Number))
    expect(chart!.series.map(({ name, unseen }) => [name, unseen ?? false])).toEqual([['Not drawn', true], ['Volatility', false], ['Rise', false], ['Fall', false]]) // prettier-ignore
    let at = level![0]!
    for (let k = 1; k < names.length - 1; k++) {
      const start = rise![k]! > 0 ? under![k]! : under![k]! + fall![k]!
      expect(near(start, at)).toBe(true)
      at += rise![k]! - fall![k]!
    }
    expect(near(at, level!.at(-1)!)).toBe(true)
    // the picture lies over rows of its own
    const { row, rows, columns } = chart!.over
    for (const cells of table.cells.slice(row, row + rows))
      expect(cells.slice(0, columns).every(({ value }) => value === '')).toBe(true)
    expect(chart!.alt).toContain('Of that drift of weights ')
    // the axis begins below all that is drawn and near it, and the title says where
    const places = [...under!.filter((value) => value > 0), ...level!.filter((value) => value > 0)]
    expect(chart!.begins).toBeLessThan(Math.min(...places))
    expect(chart!.title).toContain(`The axis begins at ${percentText(chart!.begins!, 2)}`)
  })

  test('draws on both sides of 0 where a step goes below it', async () => {
    const change = await compared()
    const below: RiskChange = {
      ...change,
      total: {
        positions: -0.2,
        volatilities: 0.05,
        correlations: 0.15 + change.change,
        drift: null,
        trades: null,
      },
    }
    const table = changeTable('Orchard', below)
    const [chart] = table.charts!
    const rows = table.cells.slice(chart!.categories.row, chart!.categories.row + 5)
    const { volatility } = change.from
    const at = (name: string, step: number): number =>
      Number(rows[step]![chart!.series.find((series) => series.name === name)!.values.column]!.value)
    // positions cross 0, volatilities stay below, correlations come back over it
    expect(near(at('Fall', 1), volatility)).toBe(true)
    expect(near(at('Fall, below 0', 1), volatility - 0.2)).toBe(true)
    expect(at('Not drawn', 1)).toBe(0)
    expect(near(at('Not drawn', 2), volatility - 0.15)).toBe(true)
    expect(near(at('Rise, below 0', 2), -0.05)).toBe(true)
    expect(at('Rise', 2)).toBe(0)
    expect(near(at('Rise', 3), change.to.volatility)).toBe(true)
    expect(near(at('Rise, below 0', 3), volatility - 0.15)).toBe(true)
  })

  test('of a change that is not split leaves its parts out and says why', async () => {
    const change = await riskChangeOf(snapshot(OLD, { correlations: null }), snapshot(NEW, LATER), NO_SOURCES)
    const table = changeTable('Orchard', change)
    expect(column(table, 0)[3]).toBe(`Not split by cause. ${String(change.total)}`)
    expect(column(table, 0)).not.toContain('Sum of parts')
    expect(rowOf(table, 'Not split')[1]).toBe(change.change)
    const heads = rowOf(table, 'Holding')
    expect(heads).not.toContain('Positions')
    expect(heads).toContain('Change of contribution')
  })

  test('shows small volatilities in as many decimals as they need', async () => {
    const daily = (of: Made): Made => ({ ...of, volatilities: of.volatilities.map((v) => v / 16) })
    const table = changeTable('Orchard', await riskChangeOf(snapshot(daily(OLD)), snapshot(daily(NEW), LATER), NO_SOURCES)) // prettier-ignore
    expect(table.cells.find((row) => row[0]!.value === 'Volatilities')![1]!.format).toBe(
      '+0.000%;-0.000%;0.000%',
    )
  })
})

/**
 * What a kept result holds, its hashes, and what is made again from it. Oracles: the definitions, written out here with other means, and SHA-256 of
 * Node's own over bytes put together by hand from the documented order.
 */
import { createHash } from 'node:crypto'
import { covariance } from '../../../src/core'
import type { Blocks, CellValue, Settings } from '../../../src/sheet'
import { breakDown, DEFAULT_SETTINGS, steppingCalculator } from '../../../src/sheet'
import { growthBetween, MOST_KEPT, remakeFrom } from '../../../src/sheet/history'
import { hashOf, sortedJson } from '../../../src/sheet/history-hash'
import { recordHash, recordTable, snapshotFrom } from '../../../src/sheet/history-record'
import { historyBlock } from '../../../src/sheet/history-block'
import { settingsToJson } from '../../../src/sheet/settings'
import type { Snapshot } from '../../../src/sheet/snapshot'
import { idleWork, modelFor } from './blocks-of-cells'
import { blocksOf, FRIDAY, HOLDINGS, NAMES, resultOf, SETTINGS, weekly } from './results'

const RISKY = NAMES.slice(0, 3)
const RETURNS = weekly(RISKY, 60)
const remade = (of: Snapshot, under: Settings, blocks: Blocks): Promise<Snapshot | string> =>
  remakeFrom(of, under, blocks, steppingCalculator, idleWork())

/** The bytes of a text and of numbers as the hash takes them. */
const ofText = (text: string): Buffer => {
  const length = Buffer.alloc(4)
  length.writeUInt32LE(Buffer.byteLength(text))
  return Buffer.concat([Buffer.from('t'), length, Buffer.from(text)])
}
const ofNumbers = (...values: number[]): Buffer => {
  const bytes = Buffer.alloc(5 + 8 * values.length)
  bytes.write('n')
  bytes.writeUInt32LE(values.length, 1)
  values.forEach((value, k) => bytes.writeDoubleLE(value, 5 + 8 * k))
  return bytes
}
const sha256 = (...parts: Buffer[]): string => createHash('sha256').update(Buffer.concat(parts)).digest('hex')

describe('Hashes', () => {
  test('are those of the documented bytes', async () => {
    expect(await hashOf(['Südwind', Float64Array.of(0.1, -2), ''])).toBe(
      sha256(ofText('Südwind'), ofNumbers(0.1, -2), ofText('')),
    )
  })

  test('take a gap by one pattern of bits, and zeros as cells hold them', async () => {
    const gap = Buffer.concat([Buffer.from('n'), Buffer.from([1, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0xf8, 0x7f])])
    expect(await hashOf([Float64Array.of(NaN)])).toBe(sha256(gap))
    expect(await hashOf([Float64Array.of(-0, 5e-324)])).toBe(sha256(ofNumbers(0, 0)))
  })

  test('tell parts apart that read alike in a row', async () => {
    expect(await hashOf(['ab', 'c'])).not.toBe(await hashOf(['a', 'bc']))
  })

  test('of a result’s returns and inputs can be taken from the cells', async () => {
    const kept = await resultOf(blocksOf(HOLDINGS, RETURNS, SETTINGS), { settings: SETTINGS })
    const rows = RETURNS.slice(1).map((row) => row.map(Number))
    const returnsHash = sha256(
      ofText('returns'),
      ofNumbers(60, 4),
      ofNumbers(...rows.map(([date = 0]) => date)),
      ofNumbers(...rows.flatMap(([, ...values]) => [...values, 0])),
    )
    expect(kept.returnsHash).toBe(returnsHash)
    expect(kept.inputsHash).toBe(
      sha256(
        ofText('inputs'),
        ...NAMES.map(ofText),
        ofNumbers(0.5, 0.3, -0.2, 0.4),
        ofText(returnsHash),
        ofText(sortedJson(settingsToJson(SETTINGS))),
      ),
    )
  })

  test('of a covariance matrix are those of its numbers', async () => {
    const matrix = [['Oak', 'Elm'], [0.04, 0.01], [0.01, 0.09]] // prettier-ignore
    const blocks = blocksOf([['Holding', 'Weight'], ['Elm', 0.4], ['Oak', 0.6]], matrix) // prettier-ignore
    const kept = await resultOf(blocks)
    expect(kept.returnsHash).toBe(
      sha256(ofText('covariance'), ofNumbers(2), ofNumbers(0.09, 0.01, 0.01, 0.04)),
    )
    expect(kept.dataDate).toBeNull()
    expect([...kept.correlations!]).toEqual([1, 0.01 / (0.3 * 0.2), 0.01 / (0.3 * 0.2), 1])
  })

  test('change with any weight, name, return and setting', async () => {
    const one = async (
      holdings: CellValue[][],
      returns: CellValue[][],
      settings: Settings,
    ): Promise<string> => (await resultOf(blocksOf(holdings, returns, settings), { settings })).inputsHash
    const moved = RETURNS.map((row, t) =>
      t === 30 ? [row[0]!, Number(row[1]) + 1e-9, ...row.slice(2)] : row,
    )
    const hashes = [
      await one(HOLDINGS, RETURNS, SETTINGS),
      await one([...HOLDINGS.slice(0, 4), ['Deposit', 'Cash', 0.41]], RETURNS, SETTINGS),
      await one(HOLDINGS, moved, SETTINGS),
      await one(HOLDINGS, RETURNS, { ...SETTINGS, estimator: { kind: 'exponential', decay: 0.97 } }),
      await one(HOLDINGS, RETURNS, { ...SETTINGS, lookBack: { kind: 'last', dates: 60 } }),
    ]
    expect(new Set(hashes).size).toBe(5)
    expect(await one(HOLDINGS, RETURNS, SETTINGS)).toBe(hashes[0])
  })

  test('of returns with gaps hold the gaps where these have a part in the figures', async () => {
    const gappy = RETURNS.map((row, t) => (t === 5 ? [row[0]!, '', ...row.slice(2)] : row))
    const settings: Settings = { ...SETTINGS, gaps: 'own overlap' }
    const kept = await resultOf(blocksOf(HOLDINGS, gappy, settings), { settings })
    const rows = gappy.slice(1).map((row) => row.map((value) => (value === '' ? NaN : Number(value))))
    expect(kept.returnsHash).toBe(
      await hashOf([
        'returns',
        Float64Array.of(60, 4),
        Float64Array.from(rows, ([date = 0]) => date),
        Float64Array.from(rows.flatMap(([, ...values]) => [...values, 0])),
      ]),
    )
    const common = await resultOf(blocksOf(HOLDINGS, gappy, SETTINGS), { settings: SETTINGS })
    const complete = rows.filter((_, t) => t !== 4)
    expect(common.returnsHash).toBe(
      await hashOf([
        'returns',
        Float64Array.of(59, 4),
        Float64Array.from(complete, ([date = 0]) => date),
        Float64Array.from(complete.flatMap(([, ...values]) => [...values, 0])),
      ]),
    )
  })
})

describe('A result', () => {
  test('holds the figures as they stand, scaled alike', async () => {
    const blocks = blocksOf(HOLDINGS, RETURNS, SETTINGS)
    const kept = await resultOf(blocks, { settings: SETTINGS, note: 'Quarter end' })
    const book = await modelFor(blocks, SETTINGS)
    const breakdown = breakDown(blocks, book, SETTINGS)
    const matrix = covariance(book.model)
    expect(kept).toMatchObject({
      id: '1', title: 'Harbour book', note: 'Quarter end', dataDate: FRIDAY, readTo: FRIDAY, positions: 4,
      volatility: breakdown.decomposition.volatility, trackingError: null, horizon: 'a year', periodsPerYear: 52,
      names: NAMES, groupHeaders: ['Class'], groups: [['Shares'], ['Unassigned'], ['007'], ['Cash']],
    }) // prettier-ignore
    const sigma = [0, 1, 2, 3].map((i) => Math.sqrt(matrix[5 * i]! * 52))
    kept.volatilities.forEach((value, i) => expect(value).toBeCloseTo(sigma[i]!, 14))
    for (let i = 0; i < 4; i++)
      for (let j = 0; j < 4; j++)
        expect(kept.correlations![4 * i + j]).toBeCloseTo(
          i === j ? 1 : i === 3 || j === 3 ? 0 : (matrix[4 * i + j]! * 52) / (sigma[i]! * sigma[j]!),
          13,
        )
    // s^2 = w' D R D w: what is kept is enough to make the figure again
    let variance = 0
    for (let i = 0; i < 4; i++)
      for (let j = 0; j < 4; j++)
        variance += kept.weights[i]! * kept.volatilities[i]! * kept.correlations![4 * i + j]! * kept.volatilities[j]! * kept.weights[j]! // prettier-ignore
    expect(Math.sqrt(variance)).toBeCloseTo(kept.volatility, 14)
  })

  test('of many holdings is kept without correlations and compared with them', async () => {
    const names = Array.from({ length: MOST_KEPT + 1 }, (_, i) => `Fund ${i}`)
    const blocks = blocksOf(
      [['Holding', 'Weight'], ...names.map((name) => [name, 1 / names.length])],
      weekly(names, 20),
    )
    expect((await resultOf(blocks)).correlations).toBeNull()
    expect((await resultOf(blocks, { extent: 'whole' })).correlations).toHaveLength(names.length ** 2)
  })

  test('of as many holdings as keep their correlations is read back to the last bit and fits one request of 4 MB', async () => {
    const names = Array.from({ length: MOST_KEPT }, (_, i) => `Fund ${i}`)
    const kept = await resultOf(
      blocksOf([['Holding', 'Weight'], ...names.map((name) => [name, 1 / MOST_KEPT])], weekly(names, 40)),
    )
    expect(kept.correlations).toHaveLength(MOST_KEPT ** 2)
    const { cells } = recordTable(kept)
    const values = cells.map((row) => row.map(({ value }) => value))
    expect(snapshotFrom(values)).toEqual(kept)
    const formats = cells.map((row) => row.map(({ format }) => format))
    // as they are sent, and once more in the journal of the write
    expect(2 * JSON.stringify(values).length + JSON.stringify(formats).length).toBeLessThan(4_000_000)
    // what a saved workbook grows by is less: numbers of 17 digits compress to about half
    expect(JSON.stringify(values).length).toBeLessThan(350_000)
  })

  test('with texts beyond one cell is spread over several and read back', async () => {
    const kept = await resultOf(blocksOf(HOLDINGS, RETURNS, SETTINGS), { settings: SETTINGS })
    const long: Snapshot = {
      ...kept,
      settings: { ...kept.settings, riskless: Array.from({ length: 4000 }, (_, k) => `Deposit “${k}”`) },
    }
    const values = recordTable(long).cells.map((row) => row.map(({ value }) => value))
    expect(Math.max(...values.flat().map((value) => String(value).length))).toBeLessThan(32_000)
    expect(snapshotFrom(values)).toEqual(long)
    const rounded = (digits: number) =>
      values.map((row) =>
        row.map((value) => (typeof value === 'number' ? Number(value.toPrecision(digits)) : value)),
      )
    // programs that save 15 digits leave a record what it is
    expect(await recordHash(rounded(15))).toBe(await recordHash(values))
    expect(await recordHash(rounded(14))).not.toBe(await recordHash(values))
    expect(snapshotFrom([['nothing']])).toBeNull()
  })

  test('without risk is laid out without shares', async () => {
    const flat = await resultOf(
      blocksOf([HOLDINGS[0]!, ['Northern shares', 'Shares', 0], ['Deposit', 'Cash', 1]], RETURNS, SETTINGS),
      { settings: SETTINGS },
    )
    const rows = historyBlock(flat).cells.map((row) => row.map(({ value }) => value))
    expect(rows.find(([label]) => label === 'Deposit')?.at(-1)).toBe('not defined')
  })
})

describe('What one unit has become', () => {
  const dates = [FRIDAY - 21, FRIDAY - 14, FRIDAY - 7, FRIDAY]
  const returns: CellValue[][] = [
    ['Week ending', 'Oak', 'Elm', 'Ash'],
    [dates[0]!, 0.01, 0.02, 0.03],
    [dates[1]!, 0.1, -0.1, 0.5],
    [dates[2]!, 0.2, '', 0.25],
    [dates[3]!, -0.05, 0.04, -0.1],
  ]
  const held: CellValue[][] = [['Holding', 'Weight'], ['oak', 0.5], ['Elm', 0.3], ['Purse', 0.2]] // prettier-ignore
  const settings = { ...DEFAULT_SETTINGS, riskless: ['Purse'] }
  const blocks = blocksOf(held, returns, settings)

  test('is the product of its returns after the first date up to the second, held or not', () => {
    const growth = growthBetween(blocks, ['oak', 'Ash', 'Purse'], dates[0]!, dates[2]!)
    expect([...(growth as Float64Array)].map((g) => Number(g.toFixed(12)))).toEqual([1.32, 1.875, 1])
  })

  test('of prices read as log returns is what the prices say', () => {
    const prices: CellValue[][] = [
      ['Date', 'Oak', 'Elm'],
      ...dates.map((date, t): CellValue[] => [date, [100, 110, 99, 118.8][t]!, [50, 40, 44, 33][t]!]),
    ]
    const log: Settings = { ...settings, returnKind: 'log', content: 'prices' }
    const growth = growthBetween(blocksOf(held, prices, log), ['Oak', 'Elm'], dates[1]!, dates[3]!)
    expect(growth[0]).toBeCloseTo(118.8 / 110, 14)
    expect(growth[1]).toBeCloseTo(33 / 40, 14)
  })

  test.each<[string, string[], number, number, string]>([
    ['a gap', ['Elm'], dates[0]!, dates[3]!, '“Elm” has no return on 1 of 3 dates after 6 Nov 2026 up to 27 Nov 2026.'],
    ['a name without returns', ['Yew'], dates[0]!, dates[1]!, 'There are no returns for “Yew” in Returns!A1:D5.'],
    ['no time between', ['Oak'], dates[1]!, dates[1]!, 'There is no time between 13 Nov 2026 and 13 Nov 2026 for prices to move in.'],
    ['a date before the returns', ['Oak'], dates[0]! - 7, dates[1]!, '30 Oct 2026 is not among the dates of the returns in Returns!A1:D5.'],
    ['a date after them', ['Oak'], dates[0]!, dates[3]! + 1, '28 Nov 2026 is not among the dates of the returns in Returns!A1:D5.'],
  ])('is not told for %s', (_, names, from, to, sentence) => {
    expect(growthBetween(blocks, names, from, to)).toBe(sentence)
  }) // prettier-ignore

  test('is not told without dates or from a covariance matrix', () => {
    const undated = returns.map((row) => row.slice(1).map((value) => (value === '' ? 0 : value)))
    expect(growthBetween(blocksOf(held, undated, settings), ['Oak'], 1, 2)).toBe(
      'The returns carry no dates.',
    )
    const matrix = [['Oak', 'Elm'], [0.04, 0.01], [0.01, 0.09]] // prettier-ignore
    expect(growthBetween(blocksOf(held, matrix, settings), ['Oak'], 1, 2)).toBe(
      'A covariance matrix does not tell what prices have done.',
    )
  })

  test('of holdings in their own currencies is that in the base currency, and not told of what is not held', () => {
    const abroad: CellValue[][] = [['Holding', 'Weight', 'Currency'], ['Oak', 0.5, 'FLN'], ['Elm', 0.5, '']] // prettier-ignore
    const rates = returns.map((row, t): CellValue[] => [...row, t === 0 ? 'FLN' : 0.1])
    const local: Settings = { ...DEFAULT_SETTINGS, currency: { base: 'GLD', returnsIn: 'local' } }
    const there = blocksOf(abroad, rates, local)
    expect(growthBetween(there, ['Oak'], dates[0]!, dates[2]!)[0]).toBeCloseTo(1.1 * 1.1 * 1.2 * 1.1, 14)
    expect(growthBetween(there, ['Ash'], dates[0]!, dates[2]!)).toBe(
      'The returns stand in the holdings’ own currencies, and nobody knows that of “Ash”, which is not held now.',
    )
  })
})

describe('A result made again', () => {
  /** the book four weeks later: newer dates, other weights, one holding sold, one bought */
  const later = (
    settings: Settings = SETTINGS,
    returns: CellValue[][] = weekly([...RISKY, 'Hill shares'], 64),
  ): Blocks =>
    blocksOf(
      [
        HOLDINGS[0]!,
        ['=Southern shares', 'Shares', 0.6],
        ['Hill shares', 'Shares', 0.2],
        ['Deposit', 'Cash', 0.2],
      ],
      returns,
      settings,
    )
  const wide = weekly([...RISKY, 'Hill shares'], 64)
  const then = [wide[0]!, ...wide.slice(1, 61)].map((row) => row.slice(0, 4))

  test('under its own settings is the same to the last bit, whatever the book has become', async () => {
    const kept = await resultOf(blocksOf(HOLDINGS, then, SETTINGS), { settings: SETTINGS })
    const again = await remade(kept, SETTINGS, later())
    expect(again).toEqual({ ...kept, settingLines: expect.anything() })
    const lines = new Map((again as Snapshot).settingLines)
    expect(lines.get('Dates used')).toBe(new Map(kept.settingLines).get('Dates used'))
    expect(lines.get('Holdings')).toBe(new Map(kept.settingLines).get('Holdings'))
  })

  test('under other settings is what the book would have shown with them then', async () => {
    const blocks = blocksOf(HOLDINGS, then, SETTINGS)
    const kept = await resultOf(blocks, { settings: SETTINGS })
    for (const change of [
      { estimator: { kind: 'exponential', decay: 0.94 } },
      { estimator: { kind: 'shrinkage', target: 'correlation' } },
      { lookBack: { kind: 'last', dates: 26 } },
      { periodsPerYear: 50 },
    ] as const) {
      const settings: Settings = { ...SETTINGS, ...change }
      expect(await remade(kept, settings, later(settings))).toEqual({
        ...(await resultOf(blocks, { settings })),
        settingLines: expect.anything(),
      })
    }
  })

  test('finds the dates of then although older ones have come before them', async () => {
    const kept = await resultOf(blocksOf(HOLDINGS, [wide[0]!, ...wide.slice(11)].map((row) => row.slice(0, 4)), SETTINGS), { settings: SETTINGS }) // prettier-ignore
    expect(await remade(kept, SETTINGS, later())).toEqual({ ...kept, settingLines: expect.anything() })
  })

  test('knows of a last date that was read and not used', async () => {
    const gap = then.map((row, t) => (t === 60 ? [row[0]!, '', ...row.slice(2)] : row))
    const settings: Settings = { ...SETTINGS, lookBack: { kind: 'last', dates: 30 } }
    const kept = await resultOf(blocksOf(HOLDINGS, gap, settings), { settings })
    expect(kept.dates).toMatchObject({ used: 29, dropped: 1 })
    const now = wide.map((row, t) => (t === 60 ? [row[0]!, '', ...row.slice(2)] : row))
    expect(await remade(kept, settings, later(settings, now))).toEqual({
      ...kept,
      settingLines: expect.anything(),
    })
  })

  test('is refused with the reason where the data are not the same any more', async () => {
    const kept = await resultOf(blocksOf(HOLDINGS, then, SETTINGS), { settings: SETTINGS })
    const moved = wide.map((row, t) => (t === 20 ? [row[0]!, row[1]!, 0.5, ...row.slice(3)] : row))
    expect(await remade(kept, SETTINGS, later(SETTINGS, moved))).toMatch(
      /^The data of .* to 30 Oct 2026 are not in Returns!A1:E65 any more as they were when the result was kept on 29 Nov 2026\.$/,
    )
    const without = wide.map((row) => [row[0]!, ...row.slice(2)])
    expect(await remade(kept, SETTINGS, later(SETTINGS, without))).toMatch(
      /found no returns for “Northern shares” in Returns!A1:D65/,
    )
    const matrix = blocksOf(
      [['Holding', 'Weight'], ['Oak', 1], ['Elm', 0]],
      [['Oak', 'Elm'], [0.04, 0.01], [0.01, 0.09]],
    ) // prettier-ignore
    expect(await remade(kept, SETTINGS, matrix)).toMatch(/rests on a covariance matrix now/)
  })

  test('from prices can be told under the other kind of returns', async () => {
    const prices: CellValue[][] = [['Date', 'Oak', 'Elm']]
    let [oak, elm] = [100, 80]
    for (const [date = 0, a = 0, b = 0] of weekly(['a', 'b'], 30).slice(1) as number[][]) {
      prices.push([date, oak, elm])
      ;[oak, elm] = [oak * (1 + a), elm * (1 + b)]
    }
    const held: CellValue[][] = [['Holding', 'Weight'], ['Oak', 0.6], ['Elm', 0.4]] // prettier-ignore
    const simple: Settings = { ...DEFAULT_SETTINGS, content: 'prices' }
    const log: Settings = { ...simple, returnKind: 'log' }
    const kept = await resultOf(blocksOf(held, prices, simple), { settings: simple })
    const wanted = await resultOf(blocksOf(held, prices, log), { settings: log })
    const again = (await remade(kept, log, blocksOf(held, prices, simple))) as Snapshot
    // logarithms of quotients against those of one more than a return: a few units of the last place
    expect(again.volatility / wanted.volatility).toBeCloseTo(1, 12)
    expect(await remade(kept, simple, blocksOf(held, prices, log))).toMatch(
      /^Prices are read as log returns now/,
    )
  })

  test('under settings that cannot be followed says so', async () => {
    const kept = await resultOf(blocksOf(HOLDINGS, then, SETTINGS), { settings: SETTINGS })
    const settings: Settings = { ...SETTINGS, lookBack: { kind: 'since', date: FRIDAY + 100 } }
    expect(await remade(kept, settings, later(SETTINGS))).toMatch(/within the look-back/)
  })
})

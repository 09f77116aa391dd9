/**
 * Results kept in a workbook, over the stand-in for the host's API. Figures are those of made-up books; what is kept and read back is compared
 * to the last bit, so no number here has another origin.
 */
import { openWorkbook, saveWorkbook } from '../../src/desk/files'
import { pack } from '../../src/desk/files/archive'
import type { OfficeOptions } from '../../src/desk/office'
import { parseAddress, type Json, type Workbook } from '../../src/sheet'
import { History } from '../../src/sheet/history'
import { historyBlock } from '../../src/sheet/history-block'
import type { Snapshot } from '../../src/sheet/snapshot'
import { itInCalc, recalculated } from '../calc'
import { blocksOf, FRIDAY, HOLDINGS, NAMES, resultOf, SETTINGS, weekly } from '../unit/sheet/results'
import { closeAll, open, refusal } from './workbook-fixture'

afterEach(closeAll)

const RECORDS = 'Counterpoise results 1'
const RISKY = NAMES.slice(0, 3)

const result = (id = '1', last = FRIDAY, note = 'Before the meeting') =>
  resultOf(blocksOf(HOLDINGS, weekly(RISKY, 60, last), SETTINGS), { settings: SETTINGS, id, note })

/** A book of many holdings. */
const large = (n: number, id = '1') => {
  const names = Array.from({ length: n }, (_, i) => `Fund ${i + 1}`)
  const holdings = [['Holding', 'Weight'], ...names.map((name) => [name, 1 / n])]
  return resultOf(blocksOf(holdings, weekly(names, 40)), { id })
}

const heights = (snapshot: Snapshot): number => historyBlock(snapshot).cells.length

async function desk(options?: OfficeOptions) {
  const host = open(options)
  const history = new History(host.book, '1')
  history.open(undefined)
  /** another look at the same workbook, as after opening it again */
  const reopened = async (book: Workbook = host.book): Promise<History> => {
    const again = new History(book, '1')
    again.open((await book.recall())['history.1'])
    return again
  }
  const typeAt = (address: string, values: (string | number)[][]): void => {
    const at = parseAddress(address)
    host.user.type(at?.sheet ?? '', address.slice(address.indexOf('!') + 1), values)
  }
  const valuesAt = async (sheet: string, address: string): Promise<unknown[][]> =>
    (await host.cells(sheet, address))['values'] ?? []
  return { ...host, history, reopened, typeAt, valuesAt }
}

describe('A result that is kept', () => {
  test('is read back equal to the last bit', async () => {
    const { history } = await desk()
    const kept = await result()
    await history.keep(kept, null)
    expect(await history.read('1')).toEqual(kept)
    expect(kept.correlations).toHaveLength(16)
    expect(kept.names[1]).toBe('=Southern shares')
  })

  test('stands on a sheet called Kept results as a block a reader understands', async () => {
    const { history, valuesAt, book } = await desk()
    const kept = await result()
    const area = await history.keep(kept, null)
    expect(area).toEqual({ sheet: 'Kept results', row: 0, column: 0, rows: heights(kept), columns: 7 })
    const rows = (await valuesAt('Kept results', 'A1:G40')).map((row) => row.filter((value) => value !== ''))
    expect(rows[0]).toEqual(['Kept result 1: Harbour book'])
    expect(rows[1]?.[0]).toMatch(
      /^Volatility \d+\.\d\d% a year\. 60 dates of returns, \d+ \w+ 2025 to 27 Nov 2026\. Kept on 29 Nov 2026\.$/,
    )
    expect(rows).toContainEqual(['Note', 'Before the meeting'])
    expect(rows).toContainEqual(['Harbour bonds', '007', -0.2, kept.volatilities[2], 0.2 * kept.volatilities[2]!, kept.contribution[2], kept.contribution[2]! / kept.volatility]) // prettier-ignore
    expect(rows).toContainEqual(['Hash of the inputs', kept.inputsHash])
    expect(rows.find(([label]) => label === 'Difference')?.[1]).toBeCloseTo(0, 15)
    expect(await book.sheets()).toEqual(['Sheet1', 'Kept results'])
  })

  test('lies below the one before, which stays as it is, and is listed by whoever opens the workbook', async () => {
    const { history, reopened, valuesAt } = await desk()
    const [first, second] = [await result(), await result('2', FRIDAY + 7)]
    await history.keep(first, null)
    const block = `A1:G${heights(first)}`
    const before = await valuesAt('Kept results', block)
    expect(await history.keep(second, null)).toMatchObject({ sheet: 'Kept results', row: heights(first) })
    expect(await valuesAt('Kept results', block)).toEqual(before)
    const again = await reopened()
    expect(again.heads.map(({ id, dataDate }) => [id, dataDate])).toEqual([
      ['1', FRIDAY],
      ['2', FRIDAY + 7],
    ])
    expect(again.nextId).toBe('3')
    expect(await again.read('2')).toEqual(second)
    expect(again.unread).toBeNull()
  })

  test('is found after rows were inserted and sheets renamed', async () => {
    const { history, user, office, reopened, settle } = await desk()
    const first = await result()
    await history.keep(first, null)
    await office.Excel.run(async (context) => {
      const { worksheets } = context.workbook
      worksheets.getItem('Kept results').getRange('1:3').insert('Down')
      worksheets.getItem(RECORDS).getRange('1:2').insert('Down')
      worksheets.getItem('Kept results').name = 'What we had'
      worksheets.getItem(RECORDS).name = 'Old ones'
      await context.sync()
    })
    user.type('What we had', 'A1', [['Looked at by the committee']])
    await settle()
    const again = await reopened()
    expect(await again.read('1')).toEqual(first)
    const area = await again.keep(await result('2', FRIDAY + 7), null)
    expect(area).toMatchObject({ sheet: 'What we had', row: 3 + heights(first) })
    expect(await again.check()).toEqual([])
  })
})

describe('A result of the same data date', () => {
  test('is found, and takes the place of the other in the sheet, among the records and in the list', async () => {
    const { history, valuesAt, reopened, portrait } = await desk()
    const [first, second] = [await result(), await result('2', FRIDAY + 7)]
    const where = await history.keep(first, null)
    await history.keep(second, null)
    expect(history.sameDate(FRIDAY)?.id).toBe('1')
    expect(history.sameDate(FRIDAY - 7)).toBeNull()
    expect(history.sameDate(null)).toBeNull()
    const third = await result('3', FRIDAY, 'Once more')
    expect(await history.keep(third, '1')).toEqual(where)
    expect((await valuesAt('Kept results', 'A1'))[0]).toEqual(['Kept result 3: Harbour book'])
    const again = await reopened()
    expect(again.heads.map(({ id }) => id)).toEqual(['3', '2'])
    expect(await again.read('3')).toEqual(third)
    expect(await again.read('2')).toEqual(second)
    expect(await refusal(again.read('1'))).toMatchObject({ code: 'missing' })
    const { names } = portrait()
    expect(names?.map(([name]) => name)).toEqual([
      'Poise_1_kept_2',
      'Poise_1_kept_3',
      'Poise_1_record_2',
      'Poise_1_record_3',
    ])
  })

  test('goes below all others where it needs more room than the other had', async () => {
    const { history, valuesAt } = await desk()
    const first = await result()
    const height = heights(first)
    await history.keep(first, null)
    await history.keep(await result('2', FRIDAY + 7), null)
    const bigger = await resultOf(
      blocksOf(
        [...HOLDINGS, ['Hill shares', 'Shares', 0.1]],
        weekly([...RISKY, 'Hill shares'], 60),
        SETTINGS,
      ),
      { settings: SETTINGS, id: '3' },
    )
    const area = await history.keep(bigger, '1')
    expect(area.row).toBe(2 * height)
    expect((await valuesAt('Kept results', `A1:G${height}`)).flat().every((value) => value === '')).toBe(true)
    expect((await valuesAt('Kept results', `A${height + 1}`))[0]).toEqual(['Kept result 2: Harbour book'])
    expect(await history.read('3')).toEqual(bigger)
  })

  test('leaves a block standing that the user has typed into', async () => {
    const { history, typeAt, valuesAt, settle } = await desk()
    const first = await result()
    await history.keep(first, null)
    typeAt("'Kept results'!B4", [['Struck out by the chair']])
    await settle()
    const area = await history.keep(await result('2', FRIDAY, 'Once more'), '1')
    expect(area.row).toBe(heights(first))
    expect((await valuesAt('Kept results', 'B4'))[0]).toEqual(['Struck out by the chair'])
    expect(history.left).toMatch(/^What stands in .* is left there/)
    expect(history.heads.map(({ id }) => id)).toEqual(['2'])
  })
})

describe('Removing a result', () => {
  test('clears its block and its record and takes it off the list', async () => {
    const { history, valuesAt, reopened } = await desk()
    const first = await result()
    await history.keep(first, null)
    await history.keep(await result('2', FRIDAY + 7), null)
    const second = await history.read('2')
    await history.remove('1')
    expect(history.left).toBeNull()
    expect(
      (await valuesAt('Kept results', `A1:G${heights(first)}`)).flat().every((value) => value === ''),
    ).toBe(true)
    expect((await valuesAt(RECORDS, 'A1:H8')).flat().every((value) => value === '')).toBe(true)
    const again = await reopened()
    expect(again.heads.map(({ id }) => id)).toEqual(['2'])
    expect(await again.read('2')).toEqual(second)
    expect(again.nextId).toBe('3')
    expect(await again.check()).toEqual([])
    // an id is not used twice, not even that of the last one
    await again.remove('2')
    expect((await reopened()).nextId).toBe('3')
  })

  test('leaves what the user has typed beside it and between, and says so', async () => {
    const { history, typeAt, valuesAt, settle } = await desk()
    await history.keep(await result(), null)
    typeAt("'Kept results'!J2", [['beside']])
    typeAt("'Kept results'!A5", [['within']])
    await settle()
    await history.remove('1')
    expect(history.left).toMatch(
      /^What stands in 'Kept results'!A1:G\d+ of the result of “Harbour book” kept on 29 Nov 2026 \(data to 27 Nov 2026\) is left there: it is not as it was written\.$/,
    )
    expect((await valuesAt('Kept results', 'A1:J5')).flat()).toEqual(
      expect.arrayContaining(['Kept result 1: Harbour book', 'beside', 'within']),
    )
    expect(history.heads).toEqual([])
  })
})

describe('What has become of the sheets', () => {
  test('a deleted sheet of blocks is told, the results are still there, and the next goes to a new sheet', async () => {
    const { history, office, reopened } = await desk()
    const first = await result()
    await history.keep(first, null)
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.getItem('Kept results').delete()
      await context.sync()
    })
    const again = await reopened()
    expect(await again.check()).toEqual([
      'The result of “Harbour book” kept on 29 Nov 2026 (data to 27 Nov 2026): the rows on the sheet of kept results were deleted, or the sheet with them; what is compared lies elsewhere and is still there.',
    ])
    expect(await again.read('1')).toEqual(first)
    expect(await again.keep(await result('2', FRIDAY + 7), null)).toMatchObject({
      sheet: 'Kept results',
      row: 0,
    })
    await again.remove('1')
    expect(again.left).toBeNull()
  })

  test('a record with one digit changed is refused by name, not read', async () => {
    const { history, typeAt, settle } = await desk()
    const first = await result()
    await history.keep(first, null)
    typeAt(`'${RECORDS}'!D5`, [[0.5000001]])
    await settle()
    expect(await refusal(history.read('1'))).toMatchObject({
      code: 'changed',
      message: expect.stringContaining('kept on 29 Nov 2026 (data to 27 Nov 2026)'),
    })
  })

  test('a row inserted into a record, and a record that was deleted, are refused by name', async () => {
    const { history, office } = await desk()
    await history.keep(await result(), null)
    await history.keep(await result('2', FRIDAY + 7), null)
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.getItem(RECORDS).getRange('6:6').insert('Down')
      await context.sync()
    })
    expect(await refusal(history.read('1'))).toMatchObject({ code: 'changed' })
    await history.read('2')
    await office.Excel.run(async (context) => {
      const records = context.workbook.worksheets.getItem(RECORDS)
      records.visibility = 'Visible'
      records.delete()
      await context.sync()
    })
    expect(await refusal(history.read('2'))).toMatchObject({ code: 'missing' })
    const [sentence] = await history.check()
    expect(sentence).toMatch(/kept on 29 Nov 2026 .* the record is not in this workbook any more/)
    // and a result can be kept all the same
    const third = await result('3', FRIDAY + 14)
    await history.keep(third, null)
    expect(await history.read('3')).toEqual(third)
  })

  test('cells of the user below the last block stay where they are', async () => {
    const { history, typeAt, valuesAt, settle } = await desk()
    const first = await result()
    await history.keep(first, null)
    const below = heights(first) + 3
    typeAt(`'Kept results'!C${below}`, [['My own remark']])
    await settle()
    const area = await history.keep(await result('2', FRIDAY + 7), null)
    expect(area.row).toBeGreaterThanOrEqual(below)
    expect((await valuesAt('Kept results', `C${below}`))[0]).toEqual(['My own remark'])
  })

  test('two books keep their results on sheets of their own, and not on one of the user’s', async () => {
    const { history, book, office, typeAt, settle } = await desk()
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.add('Kept results')
      await context.sync()
    })
    typeAt("'Kept results'!A1", [['Of our house']])
    await settle()
    const other = new History(book, '2')
    other.open(undefined)
    expect(await history.keep(await result(), null)).toMatchObject({ sheet: 'Kept results 2', row: 0 })
    expect(await other.keep(await result(), null)).toMatchObject({ sheet: 'Kept results 3', row: 0 })
    expect(await other.read('1')).toEqual(await history.read('1'))
  })

  test('a protected sheet is refused and nothing is changed', async () => {
    const { history, office, portrait, settle } = await desk()
    await history.keep(await result(), null)
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.getItem('Kept results').protection.protect()
      await context.sync()
    })
    await settle()
    const before = portrait()
    expect(await refusal(history.keep(await result('2', FRIDAY + 7), null))).toMatchObject({
      code: 'protected',
    })
    expect(await refusal(history.remove('1'))).toMatchObject({ code: 'protected' })
    expect(portrait()).toEqual(before)
    expect(history.heads).toHaveLength(1)
  })

  test('a write that fails anywhere leaves the workbook and the list as they were', async () => {
    const { history, office, portrait, settle } = await desk()
    await history.keep(await result(), null)
    const start = office.counts.operations
    await history.keep(await result('2', FRIDAY + 7), null)
    const operations = office.counts.operations - start
    const [third, replacement] = [await result('3', FRIDAY + 14), await result('3', FRIDAY, 'Once more')]
    await settle()
    const before = portrait()
    for (const share of [0.1, 0.6, 0.8, 0.9, 1]) {
      office.faults.beforeOperation(Math.floor(share * operations))
      await refusal(share === 0.8 ? history.keep(third, null) : history.keep(replacement, '1'))
      await settle()
      expect(portrait()).toEqual(before)
    }
    office.faults.beforeOperation(null)
    expect(history.heads.map(({ id }) => id)).toEqual(['1', '2'])
    await history.keep(third, null)
    expect(await history.read('3')).toEqual(third)
  })

  test('a list edited by hand loses what does not read, and says so', () => {
    const history = new History({} as Workbook, '1')
    const good = { id: '4', title: 'A', note: '', keptOn: 1, dataDate: null, volatility: 0.1, trackingError: null, periodsPerYear: 52, positions: 2, inputsHash: 'x', hash: 'y' } // prettier-ignore
    const edited: Json[] = [good, { ...good, id: '5', volatility: 'high' }, 7]
    history.open({ next: 'soon', sheet: '', kept: edited })
    expect(history.heads.map(({ id }) => id)).toEqual(['4'])
    expect(history.nextId).toBe('5')
    expect(history.unread).toBe(
      '2 kept results of book 1 could not be read from the settings saved with this workbook and are left out of the list.',
    )
  })
})

describe('Forgetting a book', () => {
  test('takes records, names and the list away and leaves the blocks to be read', async () => {
    const { history, book, valuesAt, portrait, settle } = await desk()
    await history.keep(await result(), null)
    await book.write(await history.forget())
    await settle()
    expect((await valuesAt(RECORDS, 'A1:H8')).flat().every((value) => value === '')).toBe(true)
    expect((await valuesAt('Kept results', 'A1'))[0]).toEqual(['Kept result 1: Harbour book'])
    expect(portrait().names).toEqual([])
    expect(await book.recall()).toEqual({})
  })
})

test('A file of the workbook holds all that is kept, and the record stays out of sight', async () => {
  const { history, grid, office } = await desk()
  const kept = await result()
  await history.keep(kept, null)
  const bytes = await saveWorkbook(grid, office.settings)
  const elsewhere = await desk()
  await openWorkbook(elsewhere.grid, bytes, elsewhere.office.settings)
  const again = await elsewhere.reopened()
  expect(again.heads).toEqual(history.heads)
  expect(await again.read('1')).toEqual(kept)
  expect(await again.check()).toEqual([])
  expect(await elsewhere.book.sheets()).toEqual(['Sheet1', 'Kept results'])
  // and its block is known to be as it was written
  await again.remove('1')
  expect(again.left).toBeNull()
})

itInCalc(
  'A file that went through LibreOffice Calc still holds it, to the digits that program saves',
  async () => {
    const { history, grid, office } = await desk()
    const kept = await result()
    await history.keep(kept, null)
    const { parts } = await recalculated(new Uint8Array(await saveWorkbook(grid, office.settings)))
    const elsewhere = await desk()
    await openWorkbook(elsewhere.grid, await pack(parts), elsewhere.office.settings)
    const again = await (await elsewhere.reopened()).read('1')
    expect(again).toMatchObject({ volatility: kept.volatility, names: kept.names, settings: kept.settings })
    for (const key of ['weights', 'volatilities', 'contribution', 'correlations'] as const)
      kept[key]?.forEach((value, k) => {
        // 15 significant digits: within half a unit of the last
        expect(Math.abs(again[key]![k]! - value)).toBeLessThanOrEqual(5e-15 * Math.abs(value))
      })
  },
)

test('500 holdings are kept in few requests under 4 MB each, without correlations', async () => {
  const { history, office } = await desk({ payloadLimit: 4_000_000 })
  const kept = await large(500)
  expect(kept.correlations).toBeNull()
  await history.keep(kept, null)
  // one makes the sheet out of sight
  expect(office.counts.writes).toBeLessThanOrEqual(2)
  expect(office.counts.syncs).toBeLessThanOrEqual(12)
  expect(await history.read('1')).toEqual(kept)
})

test('An earlier result is not written again', async () => {
  const { history, office } = await desk()
  await history.keep(await result(), null)
  office.counts.reset()
  await history.keep(await result('2', FRIDAY + 7), null)
  const small = office.counts.operations
  office.counts.reset()
  await history.keep(await result('3', FRIDAY + 14), null)
  // one more result to look up
  expect(office.counts.operations - small).toBeLessThan(30)
  expect(office.counts.writes).toBe(1)
})

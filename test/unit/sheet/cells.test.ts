import { addressOf, parseAddress } from '../../../src/sheet'

const at = (sheet: string) => ({ sheet, row: 4, column: 1, rows: 2, columns: 1 })

test.each(['My book', "Anna's", 'A1', 'R1C1', 'R', 'c', 'R5', 'C12', 'rc', '2026', 'Δ risk'])(
  'a sheet called %s stands in quotes and is read back',
  (sheet) => {
    expect(addressOf(at(sheet))).toBe(`'${sheet.replace("'", "''")}'!B5:B6`)
    expect(parseAddress(addressOf(at(sheet)))).toEqual(at(sheet))
  },
)

test.each(['Book', 'Risk', 'Rates', 'ABCD1', '_x.y', 'Bücher'])(
  'a sheet called %s stands without quotes and is read back',
  (sheet) => {
    expect(addressOf(at(sheet))).toBe(`${sheet}!B5:B6`)
    expect(parseAddress(addressOf(at(sheet)))).toEqual(at(sheet))
  },
)

/** What another program makes of the files we save, and that the other program is really asked. */
import { Workbook } from '@cj-tech-master/excelts/browser'
import { itInCalc, pagesOf, recalculated } from '../calc'

describe('the harness', () => {
  itInCalc('calculates anew instead of trusting the results in the file', async () => {
    const workbook = new Workbook()
    const sheet = workbook.addWorksheet("It's")
    sheet.getCell('A1').value = 0.1
    sheet.getCell('A2').value = { formula: 'A1+1/3', result: 99 }
    sheet.getCell('A3').value = { formula: '1/0', result: 99 }
    sheet.getCell('A4').value = { formula: 'A1>0', result: false }
    sheet.getCell('A5').value = 45_000.5
    sheet.getCell('A5').numFmt = 'yyyy-mm-dd'
    sheet.getCell('A6').value = '=1+1'
    workbook.addWorksheet('Other').getCell('A1').value = 1
    const file = new Uint8Array(await workbook.xlsx.writeBuffer())
    const found = await recalculated(file)
    expect(found.sheets).toEqual(["It's", 'Other'])
    // 15 digits are written; 0.1 + 1/3 is computed here
    expect(found.value("It's", 'A2')).toBeCloseTo(0.1 + 1 / 3, 14)
    expect(found.formula("It's", 'A2')).toBe('A1+1/3')
    expect(found.value("It's", 'A3')).toEqual({ error: '#DIV/0!' })
    expect(found.value("It's", 'A4')).toBe(true)
    expect(found.value("It's", 'A5')).toBe(45_000.5)
    expect(found.value("It's", 'A6')).toBe('=1+1')
    expect(found.value("It's", 'A7')).toBeNull()
    expect((await pagesOf(file)).count).toBe(2)
    expect((await pagesOf(file, { sheet: "It's" })).count).toBe(1)
  })
})

import { addressOf, type Culture, type Workbook } from '../sheet'
import { look, rangeOf, readBlock, selection } from './reading'
import { openRequests } from './requests'
import { openEchoes, sheetNames, watch } from './watching'
import { openWriter } from './writing'

/**
 * The open workbook through the Office JavaScript API. To be called once the host is ready; nothing is asked of it before the first method is.
 *
 * @throws Fault from every method, and nothing else: "host", "editing", "missing", "protected", "occupied", "changed", "selection", "cancelled";
 * "not-a-number" where what is to be written holds one that is not finite, "twice" where it gives one cell two values
 */
export function excelWorkbook(): Workbook {
  const requests = openRequests()
  const names = sheetNames()
  const echoes = openEchoes()
  const writer = openWriter(requests, echoes.expect)
  return {
    ...writer,
    culture: () => requests.run('the settings of the language', culture),
    selection: () => requests.run('the selection', selection),
    read: (area, options) => requests.run(addressOf(area), (request) => readBlock(request, area, options)),
    look: (wants) => requests.run('the linked ranges', (request) => look(request, wants, names.note)),
    reveal: (area) =>
      requests.run(addressOf(area), async ({ context, sync }) => {
        context.workbook.worksheets.getItem(area.sheet).activate()
        rangeOf(context, area).select()
        await sync()
      }),
    sheets: () =>
      requests.run('the sheets of this workbook', async ({ context, sync }) => {
        const sheets = context.workbook.worksheets.load('items/name,items/visibility')
        await sync()
        return sheets.items.filter(({ visibility }) => visibility === 'Visible').map(({ name }) => name)
      }),
    watch: (listener) => watch(requests, names, echoes, listener),
  }
}

async function culture({ context, sync }: Parameters<typeof selection>[0]): Promise<Culture> {
  const { numberFormat, datetimeFormat } = context.application.cultureInfo
  numberFormat.load('numberDecimalSeparator,numberGroupSeparator')
  datetimeFormat.load('shortDatePattern')
  await sync()
  const first = /[dMy]/.exec(datetimeFormat.shortDatePattern)?.[0]
  return {
    decimal: numberFormat.numberDecimalSeparator,
    group: numberFormat.numberGroupSeparator,
    dateOrder: first === 'd' ? 'dmy' : first === 'M' ? 'mdy' : 'ymd',
  }
}

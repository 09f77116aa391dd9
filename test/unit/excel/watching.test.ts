import type { Requests } from '../../../src/excel/requests'
import { openEchoes, sheetNames, watch } from '../../../src/excel/watching'
import type { WorkbookEvent } from '../../../src/sheet'

type Handler = (args: object) => Promise<void>

/** As much of a host as a watch asks for: its handlers, by the event they were added to. */
function eventsOnly() {
  const handlers = new Map<string, Handler>()
  const worksheets = new Proxy(
    { load: () => ({ items: [{ id: 's1', name: 'Book' }] }) },
    {
      get: (own, name: string) =>
        name === 'load' ? own.load : { add: (handler: Handler) => void handlers.set(name, handler) },
    },
  )
  const request = { context: { workbook: { worksheets } }, sync: () => Promise.resolve() }
  const requests = {
    run: (_: string, batch: (request: unknown) => Promise<unknown>) => batch(request),
    onWaiting: () => () => undefined,
  } as unknown as Requests
  Object.assign(globalThis, { Office: { context: { requirements: { isSetSupported: () => true } } } })
  return { requests, handlers }
}

test('a listener that fails over one event is told the next ones', async () => {
  const { requests, handlers } = eventsOnly()
  const heard: WorkbookEvent[] = []
  await watch(requests, sheetNames(), openEchoes(), (event) => {
    heard.push(event)
    if (heard.length === 1) throw new Error('a mistake in a listener')
  })
  const changed = handlers.get('onChanged')
  const typed = (address: string) =>
    changed?.({ worksheetId: 's1', changeType: 'RangeEdited', address, triggerSource: 'Unknown' })
  await expect(typed('A1')).rejects.toThrow('a mistake in a listener')
  await typed('A2')
  expect(heard).toHaveLength(2)
})

/** The guard every worksheet function is associated through, and what is asked of the host around the workbook. */
import { Fault } from '../../src/core'
import { associateFunctions, hostTheme, loadOnOpen, onThemeChanged, whenReady } from '../../src/excel'
import { closeAll, open } from './workbook-fixture'

afterAll(closeAll)

class CellError {
  constructor(
    readonly code: string,
    readonly message?: string,
  ) {}
}

/** The functions as the host knows them after `associateFunctions`. */
function associated(table: Parameters<typeof associateFunctions>[0]) {
  const known: Record<string, (...args: unknown[]) => unknown> = {}
  Object.assign(globalThis, {
    CustomFunctions: {
      associate: (id: string, body: (...args: unknown[]) => unknown) => void (known[id] = body),
      Error: CellError,
      ErrorCode: { invalidValue: '#VALUE!', notAvailable: '#N/A' },
    },
  })
  associateFunctions(table)
  return (id: string) => {
    const body = known[id]
    if (!body) throw new Error(`${id} is not associated`)
    return body
  }
}

const raised = (body: () => unknown): unknown => {
  try {
    body()
  } catch (error) {
    return error
  }
  throw new Error('nothing was raised')
}

describe('A worksheet function', () => {
  test('is associated where only CustomFunctions.associate exists', () => {
    const ids: string[] = []
    Object.assign(globalThis, { CustomFunctions: { associate: (id: string) => ids.push(id) } })
    associateFunctions({ BETA: () => 1, RETURNS: () => 2 })
    expect(ids).toEqual(['BETA', 'RETURNS'])
  })

  test('hands arguments and results through, blanks as empty text', () => {
    const known = associated({
      SUM: (a: number, b: number | null) => a + (b ?? 0),
      TABLE: () => [
        ['a', null],
        [null, 2],
      ],
      NOTHING: () => null,
    })
    expect(known('SUM')(1, null)).toBe(1)
    expect(known('TABLE')()).toEqual([
      ['a', ''],
      ['', 2],
    ])
    expect(known('NOTHING')()).toBe('')
  })

  test('raises a Fault as #VALUE! with its sentence, a figure that does not exist as #N/A', () => {
    const known = associated({
      TEXT: () => {
        throw new Fault('text', 'found “abc”', 'a number is needed', {
          argument: 'weights',
          row: 2,
          column: 0,
        })
      },
      ZERO: () => {
        throw new Fault('zero-risk', 'the total risk is zero', 'shares need some risk')
      },
      GAPS: () => {
        throw new Fault('missing-data', 'found 12 zeros', 'fill them')
      },
    })
    expect(raised(() => known('TEXT')())).toEqual(
      new CellError('#VALUE!', 'weights, row 3, column 1: found “abc”; a number is needed.'),
    )
    expect(raised(() => known('ZERO')())).toEqual(
      new CellError('#N/A', 'The total risk is zero; shares need some risk.'),
    )
    expect(raised(() => known('GAPS')())).toMatchObject({ code: '#N/A' })
  })

  test('raises nothing but the host’s own error, in a promise too', async () => {
    const known = associated({
      BROKEN: () => {
        throw new TypeError('x is undefined')
      },
      LATE: () => Promise.reject(new Fault('shape', '2 rows', '3 are needed')),
      SOON: () => Promise.resolve([[null]]),
    })
    expect(raised(() => known('BROKEN')())).toBeInstanceOf(CellError)
    await expect(known('LATE')()).rejects.toEqual(new CellError('#VALUE!', '2 rows; 3 are needed.'))
    expect(await known('SOON')()).toEqual([['']])
  })
})

describe('The host', () => {
  test('is ready, says its theme or nothing, and can be told to start with the workbook', async () => {
    const { office } = open()
    expect(await whenReady()).toEqual({ host: 'Excel' })
    expect(hostTheme()).toBeNull()
    const colours = {
      bodyForegroundColor: '#FFFFFF',
      controlBackgroundColor: '#000000',
      controlForegroundColor: '#FFFFFF',
    }
    office.setOfficeTheme({ bodyBackgroundColor: '#262626', ...colours })
    expect(hostTheme()).toEqual({ dark: true })
    office.setOfficeTheme({ bodyBackgroundColor: '#F3F2F1', ...colours })
    expect(hostTheme()).toEqual({ dark: false })
    office.setOfficeTheme({ bodyBackgroundColor: '#F3F2F1', ...colours, isDarkTheme: true })
    expect(hostTheme()).toEqual({ dark: true })
    const told: unknown[] = []
    const end = onThemeChanged((theme) => told.push(theme))
    office.setOfficeTheme(undefined)
    end()
    office.setOfficeTheme({ bodyBackgroundColor: '#262626', ...colours })
    expect(told).toEqual([null])
    await loadOnOpen(true)
    expect(await office.Office.addin.getStartupBehavior()).toBe('load')
    await loadOnOpen(false)
    expect(await office.Office.addin.getStartupBehavior()).toBe('none')
  })
})

/**
 * Worksheet functions in the desk behave as the host documents them.
 *
 * Sources: Office Add-ins documentation (from memory), "Custom functions parameter options", "Handle and return errors from your custom
 * function", "Autogenerate JSON metadata" and the declarations of @types/custom-functions-runtime
 * (read). Where a test follows observed behaviour of
 * the host that the documentation leaves open, its name says "common practice". Numbers are exact: the functions only echo or add.
 */
import { readFileSync } from 'node:fs'
import { FormulaDataModel } from '@univerjs/engine-formula'
import {
  createCustomFunctions,
  type CustomFunctionsStandIn,
  type FunctionMetadata,
} from '../../src/desk/functions'
import { headlessGrid, type Grid } from '../../src/desk/grid'

const matrix = (name: string, optional = false) => ({ name, type: 'any', dimensionality: 'matrix', optional })
const scalar = (name: string, type = 'any', optional = false) => ({
  name,
  type,
  dimensionality: 'scalar',
  optional,
})
const described = (name: string, ...parameters: FunctionMetadata['parameters']): FunctionMetadata => ({
  id: name,
  name,
  parameters,
})

const METADATA = {
  functions: [
    described('SEEN', matrix('block', true), scalar('flag', 'any', true)),
    described('ONE', scalar('value')),
    described('NUMBER', scalar('value', 'number')),
    described('TEXT', scalar('value', 'string')),
    described('DOUBLED', matrix('block')),
    described('FAILS', scalar('how')),
    described('SLOW', matrix('block'), scalar('kind', 'any', true)),
    described('RAW', scalar('kind')),
    { ...described('WHERE', scalar('value', 'any', true)), options: { requiresAddress: true } },
    described('NOWHERE', scalar('value', 'any', true)),
    described('LATER', scalar('value')),
  ],
}

let grid: Grid
let host: CustomFunctionsStandIn
let calls: unknown[][]
/** Settles the promises of SLOW one by one, in the order they were asked for. */
let answers: { resolve(value: unknown): void; reject(fault: unknown): void; block: number[][] }[]

beforeEach(() => {
  grid = headlessGrid()
  host = createCustomFunctions(grid)
  calls = []
  answers = []
  associateAll()
})

afterEach(() => {
  host.dispose()
  grid.dispose()
})

function associateAll() {
  const spied =
    (body: (...args: never[]) => unknown) =>
    (...args: unknown[]) => {
      calls.push(args)
      return body(...(args as never[]))
    }
  host.associate({
    SEEN: spied((block: unknown, flag: unknown) => JSON.stringify([block, flag])),
    ONE: spied((value: unknown) => JSON.stringify(value)),
    NUMBER: spied((value: number) => value + 1),
    TEXT: spied((value: string) => `<${value}>`),
    DOUBLED: spied((block: number[][]) => block.map((row) => row.map((value) => value * 2))),
    FAILS: spied((how: string) => {
      if (how === 'value')
        throw new host.Error(host.ErrorCode.invalidValue, 'weights, row 3: found "abc", need a number')
      if (how === 'missing') throw new host.Error(host.ErrorCode.notAvailable, 'no history before March')
      if (how === 'name') throw new host.Error(host.ErrorCode.invalidName, 'never shown')
      if (how === 'cell') return [[1], [new host.Error(host.ErrorCode.notAvailable)], [3]]
      if (how === 'plain') throw new Error('a bug')
      return 'fine'
    }),
    SLOW: spied(
      (block: number[][]) => new Promise((resolve, reject) => answers.push({ resolve, reject, block })),
    ),
    RAW: spied(
      (kind: string) =>
        ({
          nothing: null,
          infinite: Infinity,
          ragged: [[1, 2], [3]],
          flat: [1, 2],
          empty: [],
          text: '12',
          yes: true,
          thing: {},
        })[kind],
    ),
    WHERE: spied((_value: unknown, invocation: { address?: string }) => String(invocation.address)),
    NOWHERE: spied((_value: unknown, invocation: { address?: string }) => String(invocation.address)),
  })
}

function sheetOf(cells: Record<string, unknown>, name = 'Sheet1') {
  grid.api.disposeUnit('workbook')
  grid.api.createWorkbook({
    id: 'book',
    name: 'Book',
    sheetOrder: ['s1'],
    sheets: { s1: { id: 's1', name, rowCount: 100, columnCount: 26 } },
  })
  for (const [address, value] of Object.entries(cells)) write(address, value)
}

const active = () => {
  const sheet = grid.api.getActiveWorkbook()?.getActiveSheet()
  if (!sheet) throw new Error('no sheet')
  return sheet
}

function write(address: string, value: unknown) {
  const formula = typeof value === 'string' && value.startsWith('=')
  active()
    .getRange(address)
    .setValue(formula ? { f: value, v: null } : (value as string))
}

const calculated = () => grid.api.getFormula().onCalculationResultApplied()
const value = (address: string) => active().getRange(address).getValue()

async function evaluate(formula: string, cells: Record<string, unknown> = {}, at = 'F1') {
  sheetOf({ ...cells, [at]: formula })
  await calculated()
  return value(at)
}

const messageAt = (address: string) => {
  const range = active().getRange(address)
  return host.messageAt('book', 's1', range.getRow(), range.getColumn())
}

describe('arguments', () => {
  beforeEach(() => host.register(METADATA, 'POISE'))

  it('hand a block over as rows of cells, with full doubles', async () => {
    await evaluate('=POISE.SEEN(A1:B2)', { A1: 0.1 + 0.2, B1: 'text', A2: true, B2: 1 / 3 })
    expect(calls[0]?.[0]).toEqual([
      [0.1 + 0.2, 'text'],
      [true, 1 / 3],
    ])
  })

  it('hand blanks inside a block over as 0', async () => {
    await evaluate('=POISE.SEEN(A1:A3)', { A1: 1, A3: 3 })
    expect(calls[0]?.[0]).toEqual([[1], [0], [3]])
  })

  it('hand an omitted optional argument over as null, at the end and in between', async () => {
    expect(await evaluate('=POISE.SEEN(A1:A1)', { A1: 1 })).toBe('[[[1]],null]')
    expect(await evaluate2('=POISE.SEEN(,5)')).toBe('[null,5]')
  })

  it('hand one cell, or a literal, to a block parameter as a block of one', async () => {
    expect(await evaluate('=POISE.SEEN(A1)', { A1: 7 })).toBe('[[[7]],null]')
    expect(await evaluate2('=POISE.SEEN(7)')).toBe('[[[7]],null]')
  })

  it('hand one cell to a single-value parameter as the value', async () => {
    expect(await evaluate('=POISE.ONE(A1)', { A1: 'abc' })).toBe('"abc"')
  })

  it('refuse a block for a single-value parameter', async () => {
    expect(await evaluate('=POISE.ONE(A1:A2)', { A1: 1, A2: 2 })).toBe('#VALUE!')
    expect(calls).toEqual([])
  })

  it('are converted to the declared type, or refused without a call', async () => {
    expect(await evaluate('=POISE.NUMBER("41")')).toBe(42)
    expect(await evaluate2('=POISE.TEXT(5)')).toBe('<5>')
    calls = []
    expect(await evaluate2('=POISE.NUMBER("abc")')).toBe('#VALUE!')
    expect(calls).toEqual([])
  })

  it.each(['#N/A', '#DIV/0!', '#REF!'])(
    'pass an input error %s on without calling the function',
    async (error) => {
      const source = { '#N/A': '=NA()', '#DIV/0!': '=1/0', '#REF!': '=#REF!' }[error]
      expect(await evaluate('=POISE.SEEN(A1:A3)', { A1: 1, A2: source })).toBe(error)
      expect(calls).toEqual([])
      expect(messageAt('F1')).toBeUndefined()
    },
  )

  it('too few or too many are #VALUE!, and the cell says which', async () => {
    expect(await evaluate('=POISE.ONE()')).toBe('#VALUE!')
    expect(messageAt('F1')).toBe('value: found nothing; this argument is needed.')
    expect(await evaluate2('=POISE.ONE(1,2)')).toBe('#VALUE!')
    expect(messageAt('H9')).toBe('found 2 arguments; at most 1 are taken.')
  })

  it('end with an invocation that knows the address only where the function asks for it', async () => {
    expect(await evaluate('=POISE.WHERE(1)', {}, 'B5')).toBe('Sheet1!B5')
    expect(await evaluate2('=POISE.NOWHERE(1)')).toBe('undefined')
  })

  it('that a function writes into are not spoilt for the other cells that share them', async () => {
    host.associate('DOUBLED', (block: number[][]) => {
      const [row] = block
      if (row) row[0] = 99
      return 1
    })
    sheetOf({ A1: 5, F1: '=POISE.DOUBLED(A1:A2)', G1: '=POISE.SEEN(A1:A2)' })
    await calculated()
    expect(value('F1')).toBe('#VALUE!')
    expect(value('G1')).toBe('[[[5],[0]],null]')
  })
})

/** The raw values of a column of cells: its own where it has any, else what is spilled into it. */
function spilled(address: string) {
  const range = active().getRange(address)
  const { startRow, endRow, startColumn } = range.getRange()
  const array = grid.univer.__getInjector().get(FormulaDataModel).getArrayFormulaCellData()['book']?.['s1']
  return Array.from({ length: endRow - startRow + 1 }, (_, i) => {
    const own = active()
      .getSheet()
      .getCellMatrix()
      .getValue(startRow + i, startColumn)?.v
    return own ?? array?.[startRow + i]?.[startColumn]?.v ?? undefined
  })
}

/** A further formula on the sheet that is there. */
async function evaluate2(formula: string, at = 'H9') {
  write(at, formula)
  await calculated()
  return value(at)
}

describe('results', () => {
  beforeEach(() => host.register(METADATA, 'POISE'))

  it('spill, and free their cells again when they shrink', async () => {
    sheetOf({ A1: 1, A2: 2, A3: 3, F1: '=POISE.DOUBLED(A1:A3)' })
    await calculated()
    expect(spilled('F1:F3')).toEqual([2, 4, 6])
    write('F1', '=POISE.DOUBLED(A1:A2)')
    await calculated()
    expect(spilled('F1:F3')).toEqual([2, 4, undefined])
  })

  it('are #SPILL! where a cell is in the way, and spill once it is cleared', async () => {
    sheetOf({ A1: 1, A2: 2, A3: 3, F2: 'mine', F1: '=POISE.DOUBLED(A1:A3)' })
    await calculated()
    expect(value('F1')).toBe('#SPILL!')
    expect(value('F2')).toBe('mine')
    active().getRange('F2').setValue({ v: null })
    await calculated()
    expect(spilled('F1:F3')).toEqual([2, 4, 6])
  })

  it('feed the formulas around them', async () => {
    expect(await evaluate('=SUM(POISE.DOUBLED(A1:A3))+POISE.NUMBER(1)', { A1: 1, A2: 2, A3: 3 })).toBe(14)
  })

  it('feed each other', async () => {
    expect(await evaluate('=SUM(POISE.DOUBLED(POISE.DOUBLED(A1:A3)))', { A1: 1, A2: 2, A3: 3 })).toBe(24)
  })

  it('follow their precedents', async () => {
    await evaluate('=SUM(POISE.DOUBLED(A1:A3))', { A1: 1, A2: 2, A3: 3 })
    write('A2', 10)
    await calculated()
    expect(value('F1')).toBe(28)
  })

  it('come whatever the case of the name', async () => {
    expect(await evaluate('=poise.Number(1)')).toBe(2)
  })

  it('keep their type: text that looks like a number stays text', async () => {
    await evaluate('=ISTEXT(POISE.RAW("text"))')
    expect(grid.api.getActiveWorkbook()?.getActiveSheet().getRange('F1').getCellData()?.v).toBe(1)
  })

  it.each([
    ['nothing', 0],
    ['infinite', '#NUM!'],
    ['ragged', '#VALUE!'],
    ['flat', '#VALUE!'],
    ['empty', '#VALUE!'],
    ['thing', '#VALUE!'],
  ])('that are %s show as %s', async (kind, shown) => {
    expect(await evaluate(`=POISE.RAW("${kind}")`)).toBe(shown)
  })
})

describe('failures', () => {
  beforeEach(() => host.register(METADATA, 'POISE'))

  it('show as #VALUE! with their sentence', async () => {
    expect(await evaluate('=POISE.FAILS("value")')).toBe('#VALUE!')
    expect(messageAt('F1')).toBe('weights, row 3: found "abc", need a number')
  })

  it('show as #N/A with their sentence', async () => {
    expect(await evaluate('=POISE.FAILS("missing")')).toBe('#N/A')
    expect(messageAt('F1')).toBe('no history before March')
  })

  it('lose their sentence once the call succeeds', async () => {
    await evaluate('=POISE.FAILS(A1)', { A1: 'value' })
    write('A1', 'good')
    await calculated()
    expect(value('F1')).toBe('fine')
    expect(messageAt('F1')).toBeUndefined()
  })

  it('are told by the formula that stands in the cell now, not by an earlier one', async () => {
    await evaluate('=IFERROR(POISE.FAILS("missing"),"none")')
    write('F1', '=POISE.ONE()')
    await calculated()
    expect(messageAt('F1')).toBe('value: found nothing; this argument is needed.')
    write('F1', '=1/0')
    await calculated()
    expect(messageAt('F1')).toBeUndefined()
  })

  it('with a code that functions may not return are #VALUE! without a sentence', async () => {
    expect(await evaluate('=POISE.FAILS("name")')).toBe('#VALUE!')
    expect(messageAt('F1')).toBeUndefined()
  })

  it('that are not CustomFunctions.Error are #VALUE! without a sentence', async () => {
    expect(await evaluate('=POISE.FAILS("plain")')).toBe('#VALUE!')
    expect(messageAt('F1')).toBeUndefined()
  })

  it('may stand in single cells of a block', async () => {
    await evaluate('=POISE.FAILS("cell")')
    expect(spilled('F1:F3')).toEqual([1, '#N/A', 3])
  })
})

describe('promises', () => {
  beforeEach(() => host.register(METADATA, 'POISE'))
  const settled = async () => {
    await Promise.resolve()
    await calculated()
  }

  it('show #BUSY! and then the value, with one call', async () => {
    expect(await evaluate('=POISE.SLOW(A1:A2)', { A1: 1, A2: 2 })).toBe('#BUSY!')
    answers[0]?.resolve([[10], [20]])
    await settled()
    expect(spilled('F1:F2')).toEqual([10, 20])
    expect(calls).toHaveLength(1)
  })

  it('hold back the formulas that read them', async () => {
    sheetOf({ A1: 1, F1: '=POISE.SLOW(A1)', G1: '=F1+1', H1: '=SUM(POISE.SLOW(A1))' })
    await calculated()
    expect([value('G1'), value('H1')]).toEqual(['#BUSY!', '#BUSY!'])
    for (const answer of answers) answer.resolve(5)
    await settled()
    expect([value('F1'), value('G1'), value('H1')]).toEqual([5, 6, 5])
  })

  it('of an outdated call do not overwrite the newer one', async () => {
    await evaluate('=POISE.SLOW(A1)', { A1: 1 })
    write('A1', 2)
    await calculated()
    answers[1]?.resolve('new')
    await settled()
    answers[0]?.resolve('old')
    await settled()
    expect(value('F1')).toBe('new')
  })

  it('that are rejected show the error with its sentence', async () => {
    await evaluate('=POISE.SLOW(A1)', { A1: 1 })
    answers[0]?.reject(new host.Error(host.ErrorCode.notAvailable, 'stopped'))
    await settled()
    expect(value('F1')).toBe('#N/A')
    expect(messageAt('F1')).toBe('stopped')
  })

  it('are asked for again when their precedents change', async () => {
    await evaluate('=POISE.SLOW(A1)', { A1: 1 })
    answers[0]?.resolve(1)
    await settled()
    write('A1', 2)
    await calculated()
    expect(answers[1]?.block).toEqual([[2]])
    answers[1]?.resolve(22)
    await settled()
    expect(value('F1')).toBe(22)
  })
})

describe('registration', () => {
  it('of the metadata alone makes cells wait for the code', async () => {
    host.register(METADATA, 'POISE')
    expect(await evaluate('=POISE.LATER(1)')).toBe('#BUSY!')
    host.associate('LATER', (value: number) => value + 1)
    await calculated()
    expect(value('F1')).toBe(2)
  })

  it('reaches formulas entered before it, in any case', async () => {
    sheetOf({ A1: 1, F1: '=POISE.NUMBER(A1)', F2: '=Poise.number(A1)+1', F3: '=SUM(poise.doubled(A1:A2))' })
    await calculated()
    expect(value('F1')).toBe('#NAME?')
    host.register(METADATA, 'POISE')
    await calculated()
    expect([value('F1'), value('F2'), value('F3')]).toEqual([2, 3, 2])
  })

  it('works before there is a workbook', async () => {
    grid.api.disposeUnit('workbook')
    host.register(METADATA, 'POISE')
    expect(await evaluate('=POISE.NUMBER(1)')).toBe(2)
  })

  it('again, of code already known, recalculates nothing', async () => {
    host.register(METADATA, 'POISE')
    await evaluate('=POISE.NUMBER(1)')
    calls = []
    associateAll()
    await new Promise((resolve) => setTimeout(resolve, 300))
    expect(calls).toEqual([])
  })

  it('refuses what the desk cannot do, by name', () => {
    const streaming = { functions: [{ ...described('FLOW'), options: { stream: true } }] }
    expect(() => host.register(streaming, 'POISE')).toThrow(
      'POISE.FLOW: the desk does not support streaming in worksheet functions',
    )
  })

  it('refuses what is not a function', () => {
    expect(() => host.associate('SEEN', undefined as never)).toThrow(
      'CustomFunctions.associate("SEEN"): expected a function, got undefined',
    )
  })
})

it('error codes are those of the host', () => {
  // Read from the declarations of custom-functions-runtime, so that a change there shows here.
  const declared = readFileSync(require.resolve('@types/custom-functions-runtime/index.d.ts'), 'utf8')
  const members = [...declared.matchAll(/^\s*(\w+) = "(#[^"]+)"/gm)].map(([, name, code]) => [name, code])
  expect(members).toHaveLength(7)
  expect(Object.fromEntries(members)).toEqual(host.ErrorCode)
})

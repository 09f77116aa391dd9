/**
 * Every write happens whole or not at all: a fault is put before each operation a write queues, after the last one (the answer is lost),
 * and again before each operation of putting things back. What the workbook holds is compared cell by cell with its looks, names and
 * settings. All numbers are the tests' own.
 */
import { excelWorkbook } from '../../src/excel'
import { parseAddress, type Area, type Table, type TableChart, type WritePlan } from '../../src/sheet'
import { formulaCell } from '../../src/sheet/table'
import {
  breakdown,
  closeAll,
  folding,
  number,
  open,
  refusal,
  tableOf,
  text,
  valuesOf,
} from './workbook-fixture'

jest.setTimeout(240_000)
afterEach(closeAll)

const area = (address: string): Area => {
  const found = parseAddress(address, 'Sheet1')
  if (!found) throw new Error(address)
  return found
}
const at = { sheet: 'Sheet1', row: 1, column: 1 }

type Opened = ReturnType<typeof open>

const hasFormulas = ({ cells }: Table) =>
  cells.some((row) => row.some(({ formula }) => formula !== undefined))

/** Formulas over E3:E4 with charts of them, on a page. */
function drawnTable(...charts: Partial<TableChart>[]): Table {
  const span = (row: number, column: number) => ({ row, column, rows: 2, columns: 1 })
  return {
    ...tableOf([
      [text('Largest', 'title'), { value: '', format: 'General' }],
      [text('Holding', 'head'), text('=Weight', 'head')],
      [text('Alder'), formulaCell('=Sheet1!$E$3/10', '0.0%')],
      [text('Beech'), formulaCell('=Sheet1!$E$4/10', '0.0%')],
      [text('Total', 'total'), number(1)],
    ]),
    charts: charts.map((chart) => ({
      kind: 'bars',
      title: 'Weights',
      alt: 'Bars.',
      over: { row: 0, column: 0, rows: 5, columns: 2 },
      categories: span(2, 0),
      series: [{ name: 'Weight', values: span(2, 1) }],
      format: '0%',
      ...chart,
    })),
    page: {
      paper: 'A4',
      orientation: 'landscape',
      onePage: true,
      repeatedRows: 2,
      header: { left: 'Alder & Beech', right: 'Data to 2024-05-31' },
      footer: 'An estimate.',
    },
  }
}

/** Workbooks to write to, with the plan for each. */
const cases: Record<string, (opened: Opened) => Promise<WritePlan> | WritePlan> = {
  'a first write with a new sheet, names and settings': ({ user }) => {
    user.type('Sheet1', 'A1', [['mine', '=LEN(A1)', "'=1+1"]])
    return {
      sheet: 'Risk',
      patches: [
        { at, table: breakdown(), over: 'blank' },
        {
          at: { ...at, sheet: 'Risk' },
          table: tableOf([[text('@name', 'title'), number(1)]]),
          over: 'blank',
        },
      ],
      keep: { table: area('B2:C7'), other: { ...area('B2:C7'), sheet: 'Risk' } },
      remember: { links: [1, 2] },
    }
  },
  'a write the user lets replace formulas, texts, errors and spilled results': async ({
    user,
    book,
    office,
    settle,
  }) => {
    user.type('Sheet1', 'A1', [
      ['mine', 1, '=B1*2'],
      ['', '=SEQUENCE(2,1)', "'=1+1"],
      ['', '', "'007"],
      ['', true, '=1/0'],
      ['', "'@name", 0.1 + 0.2],
    ])
    await office.Excel.run(async (context) => {
      const cell = context.workbook.worksheets.getItem('Sheet1').getRange('C5')
      cell.numberFormat = [['0.00%']]
      cell.format.font.italic = true
      cell.format.borders.getItem('EdgeTop').style = 'Double'
      cell.format.borders.getItem('EdgeBottom').color = '#00AA55'
      cell.format.borders.getItem('EdgeBottom').weight = 'Thick'
      await context.sync()
    })
    await book.write({ patches: [], keep: { table: area('A1:A2') }, remember: { links: 'old' } })
    await settle()
    return {
      patches: [{ at, table: breakdown(), over: 'replace' }],
      keep: { table: area('B2:C7'), fresh: area('B2') },
      remember: { links: 'new' },
    }
  },
  'a write that shrinks an earlier table and removes its name and setting': async ({ user, book }) => {
    user.type('Sheet1', 'B10', 'mine')
    await book.write({
      patches: [{ at, table: breakdown([0.5, 0.2, 0.2, 0.1]), over: 'blank' }],
      keep: { table: area('B2:C8') },
      remember: { links: 1 },
    })
    return {
      patches: [{ at, table: breakdown([1]), over: 'blank', ours: area('B2:C8') }],
      keep: { table: null },
      remember: { links: null },
    }
  },
  'a first write of links and groups, over links of the user’s': async ({ user, office }) => {
    user.type('Sheet1', 'B2', [
      ['', 1],
      ["'=mine", 2],
      ['=1+1', 3],
    ])
    await office.Excel.run(async (context) => {
      const sheet = context.workbook.worksheets.getItem('Sheet1')
      for (const address of ['B3', 'B4', 'C4']) {
        sheet.getRange(address).hyperlink = { address: 'https://example.org', screenTip: 'mine' }
        sheet.getRange(address).format.font.size = 14
      }
      sheet.getRange('B2').format.font.color = '#FF0000'
      await context.sync()
    })
    return {
      sheet: 'Risk',
      patches: [
        { at, table: folding(0, 1, 2, 0), over: 'replace' },
        { at: { ...at, sheet: 'Risk' }, table: folding(0, 1), over: 'blank' },
      ],
    }
  },
  'a write that folds otherwise than the earlier table and has fewer links': async ({ user, book }) => {
    user.type('Sheet1', 'B10', 'mine')
    await book.write({ patches: [{ at, table: folding(0, 1, 2, 2, 0, 1), over: 'blank' }] })
    const { cells, ...table } = folding(0, 1, 1)
    return {
      patches: [
        {
          at,
          table: { ...table, cells: [...cells.slice(0, 2), [text('no link'), number(1)]] },
          over: 'blank',
          ours: area('B2:C7'),
        },
      ],
    }
  },
  'a write whose bars and indents are others than the earlier table’s, beside a bar of the user’s': async ({
    book,
    office,
  }) => {
    const barred = (full: number, rows: number) => {
      const table = breakdown([0.5, 0.2, 0.3])
      const cells = table.cells.map((row, r) =>
        row.map((cell, c) => (c === 0 && r > 2 ? { ...cell, indent: rows } : cell)),
      )
      return { ...table, cells, bars: [{ column: 1, row: 2, rows, full }] }
    }
    await book.write({ patches: [{ at, table: barred(1, 3), over: 'blank' }] })
    await office.Excel.run(async (context) => {
      const { conditionalFormats } = context.workbook.worksheets.getItem('Sheet1').getRange('C7')
      conditionalFormats.add('DataBar').dataBar.positiveFormat.fillColor = '#00FF00'
      await context.sync()
    })
    return { patches: [{ at, table: barred(2, 2), over: 'blank', ours: area('B2:C7') }] }
  },
  'a write of formulas, one of which fills other cells, over an earlier one of that kind': async ({
    user,
    book,
  }) => {
    user.type('Sheet1', 'E3', [[2], [3]])
    const filling = (first: number) =>
      tableOf([
        [text('=Steps', 'head'), text('Twice', 'head')],
        [formulaCell(`=SEQUENCE(2,1,${first})`, '0'), formulaCell('=2*Sheet1!$E$3', '0.0')],
        [{ value: '', format: 'General' }, formulaCell(`=${first}*Sheet1!$E$4`, '0.0', 'total')],
      ])
    await book.write({ patches: [{ at, table: filling(1), over: 'blank' }] })
    return { patches: [{ at, table: filling(4), over: 'blank', ours: area('B2:C4') }] }
  },
  'a first write of formulas, charts and a page, with a sheet out of sight': ({ user }) => {
    user.type('Sheet1', 'E3', [[2], [3]])
    return {
      sheet: 'Records',
      outOfSight: true,
      patches: [
        { at, table: drawnTable({}), over: 'blank' },
        { at: { ...at, sheet: 'Records' }, table: tableOf([[text('kept'), number(1)]]), over: 'blank' },
      ],
      remember: { history: ['one'] },
    }
  },
  'a write that draws otherwise than the earlier table, on a page of the user’s, beside a chart of the user’s':
    async ({ book, office }) => {
      await book.write({
        patches: [{ at, table: drawnTable({}, { kind: 'columns', alt: 'Columns.' }), over: 'blank' }],
      })
      await office.Excel.run(async (context) => {
        const sheet = context.workbook.worksheets.getItem('Sheet1')
        sheet.charts.add('Line', sheet.getRange('C4:C5')).name = 'mine'
        sheet.pageLayout.setPrintArea('A1:Z9')
        sheet.pageLayout.setPrintTitleColumns('A:A')
        sheet.pageLayout.zoom = { scale: 80 }
        await context.sync()
      })
      return {
        patches: [
          {
            at,
            table: drawnTable({ alt: 'Bars of June.' }, { kind: 'line', alt: 'Columns.' }),
            over: 'blank',
            ours: area('B2:C6'),
          },
        ],
      }
    },
  'a refresh of values and a setting': async ({ user, book }) => {
    user.type('Sheet1', 'B10', '=SUM(C4:C6)')
    await book.write({ patches: [{ at, table: breakdown(), over: 'blank' }], remember: { seen: 1 } })
    user.type('Sheet1', 'C5', '=1/4')
    const [seen] = await book.look([{ at: area('B2:C7'), formulas: true }])
    return {
      patches: [
        {
          at,
          table: breakdown([0.2, 0.3, 0.5]),
          over: 'blank',
          ours: area('B2:C7'),
          seen: seen?.formulas ?? [],
        },
      ],
      remember: { seen: 2 },
    }
  },
}

/** How many operations a write takes, counted in a workbook of its own. */
async function operationsOf(prepared: () => Promise<Opened & { plan: WritePlan }>): Promise<number> {
  const { book, office, plan } = await prepared()
  office.counts.reset()
  await book.write(plan)
  closeAll()
  return office.counts.operations
}

describe.each(Object.entries(cases))('%s', (_, prepare) => {
  const prepared = async () => {
    const opened = open()
    const plan = await prepare(opened)
    await opened.settle()
    return { ...opened, plan, before: opened.portrait() }
  }

  test('leaves everything as it was when any one operation fails', async () => {
    const operations = await operationsOf(prepared)
    const { book, office, plan, before, portrait, settle } = await prepared()
    // the grid takes half a second to settle after each: a dozen of the operations have their turn, from the first change on more closely
    let operation = 0
    let stride = Math.max(6, Math.ceil(operations / 8))
    let changes = false
    for (;;) {
      office.faults.beforeOperation((operation += stride))
      const failed = await book.write(plan).then(
        () => null,
        (error: unknown) => error as { code: string; message: string },
      )
      if (!failed) break
      await settle()
      expect({ operation, failed: failed.code, holds: portrait() }).toEqual({
        operation,
        failed: 'host',
        holds: before,
      })
      expect(failed.message).toContain('a fault was injected')
      if (!changes && failed.message.includes('nothing was changed')) {
        changes = true
        operation = Math.max(0, operation - stride)
        stride = Math.max(1, Math.ceil((operations - operation) / 10))
      }
    }
    expect(changes).toBe(true)
    office.faults.beforeOperation(null)
    await settle()
    // a write queues at least the journal's beginning and end, formats and values
    expect(operation).toBeGreaterThan(5)
    expect(portrait()).not.toEqual(before)
    const { at: place, table } = plan.patches[0] ?? { at, table: breakdown() }
    const { values } = await book.read({ ...place, rows: table.cells.length, columns: 2 })
    if (!hasFormulas(table)) expect(values).toEqual(valuesOf(table))
  })

  test('leaves everything as it was, and says so, when all was done but the answer was lost', async () => {
    const { office, plan, before, portrait, settle } = await prepared()
    // the write's last request is the one whose answer is lost
    const probe = excelWorkbook()
    await probe.recall()
    office.counts.reset()
    await probe.write(plan)
    const requests = office.counts.syncs
    await settle()
    expect(portrait()).not.toEqual(before)
    closeAll()

    const again = await prepared()
    const port = excelWorkbook()
    await port.recall()
    const run = again.office.Excel.run.bind(again.office.Excel) as typeof Excel.run
    let left = requests
    // counts the requests down and loses the answer of the last
    Object.assign(again.office.Excel, {
      run: (options: Excel.RunOptions, batch: (context: Excel.RequestContext) => Promise<unknown>) =>
        run(options, (context) => {
          const sync = context.sync.bind(context)
          context.sync = ((...args: []) => {
            if (--left === 0) again.office.faults.loseAnswer()
            return sync(...args)
          }) as typeof context.sync
          return batch(context)
        }),
    })
    const fault = await refusal(port.write(again.plan))
    await again.settle()
    expect(fault.message).toContain('nothing was changed')
    expect(again.portrait()).toEqual(again.before)
    expect(again.before).toEqual(before)
  })

  test('is put right at the next start when putting things back fails as well', async () => {
    const probe = await prepared()
    const port = excelWorkbook()
    await port.recall()
    probe.office.counts.reset()
    await port.write(probe.plan)
    const operations = probe.office.counts.operations
    await probe.settle()
    const after = probe.portrait()
    closeAll()
    const step = Math.max(7, Math.ceil(operations / 5))

    const { office, plan, before, portrait, settle } = await prepared()
    let recovered = 0
    // in the middle of what it changes, near its end and before its very last operation; of the undoing a few, each time others
    for (const [offset, first] of [operations - 9, operations - 3, operations].entries()) {
      for (let second = 1 + 2 * offset; ; second += step) {
        const book = excelWorkbook()
        await book.recall()
        office.faults.beforeOperation(first, first + second)
        const fault = await refusal(book.write(plan))
        office.faults.beforeOperation(null)
        await settle()
        if (fault.message.includes('nothing was changed')) {
          expect(portrait()).toEqual(before)
          break
        }
        expect(fault.message).toContain('is put back then')
        // the workbook is opened again: a new port finds the journal
        const recovery = await excelWorkbook().recover()
        await settle()
        if (recovery) recovered++
        expect({ first, second, outcome: recovery?.outcome, holds: portrait() }).toEqual({
          first,
          second,
          // no journal is left when the fault came before it was saved: then nothing was changed either
          outcome: recovery ? 'restored' : undefined,
          holds: before,
        })
      }
    }
    expect(after).not.toEqual(before)
    expect(recovered).toBeGreaterThan(0)
  })
})

test('groups come out as they were or as they are to be, wherever changing them stops', async () => {
  const prepare = cases['a write that folds otherwise than the earlier table and has fewer links']
  const prepared = async () => {
    const opened = open()
    const plan = await prepare?.(opened)
    await opened.settle()
    if (!plan) throw new Error('no such case')
    return { ...opened, plan, before: opened.portrait() }
  }
  const probe = await prepared()
  probe.office.counts.reset()
  await probe.book.write(probe.plan)
  const { operations } = probe.office.counts
  await probe.settle()
  const after = probe.portrait()

  let failures = 0
  let opened = await prepared()
  // the last operations: three runs ungrouped, their rows shown, one run grouped, the journal taken away
  for (let operation = operations - 28; operation <= operations; operation += 4) {
    const { book, office, plan, portrait, settle, before } = opened
    office.faults.beforeOperation(operation)
    const failed = await book.write(plan).then(
      () => false,
      () => true,
    )
    await settle()
    expect({ operation, holds: portrait() }).toEqual({ operation, holds: failed ? before : after })
    if (failed) failures++
    else opened = await prepared()
  }
  // what stops ungrouping is taken for a host that finds nothing to ungroup, and goes on another way
  expect(failures).toBeGreaterThan(1)
  expect(failures).toBeLessThan(8)
})

describe('After an interrupted write', () => {
  /** A write that stopped half way and whose undoing failed: the journal is in the workbook. */
  const interrupted = async () => {
    const opened = open()
    const { book, office, user } = opened
    user.type('Sheet1', 'C4', 5)
    const before = opened.portrait()
    office.counts.reset()
    const plan: WritePlan = { patches: [{ at, table: breakdown(), over: 'replace' }] }
    await book.write(plan)
    const operations = office.counts.operations
    const other = open()
    other.user.type('Sheet1', 'C4', 5)
    other.office.faults.beforeOperation(operations - 1, operations)
    await refusal(other.book.write(plan))
    other.office.faults.beforeOperation(null)
    await other.settle()
    return { ...other, plan, before }
  }

  test('recovery tells where, and a second one has nothing to do', async () => {
    const { portrait, before } = await interrupted()
    expect(portrait()).not.toEqual(before)
    const port = excelWorkbook()
    expect(await port.recover()).toEqual({ outcome: 'restored', areas: [area('B2:C7')] })
    expect(portrait()).toEqual(before)
    expect(await port.recover()).toBeNull()
  })

  test('recovery leaves what the user typed since', async () => {
    const { user, cells } = await interrupted()
    user.type('Sheet1', 'C5', 'typed since')
    await excelWorkbook().recover()
    expect((await cells('Sheet1', 'B2:C7')).values).toEqual([
      ['', ''],
      ['', ''],
      ['', 5],
      ['', 'typed since'],
      ['', ''],
      ['', ''],
    ])
  })

  test('recovery that fails keeps the journal and says so', async () => {
    const { office, portrait, before } = await interrupted()
    office.protect('Sheet1', true)
    const port = excelWorkbook()
    expect(await port.recover()).toMatchObject({ outcome: 'failed' })
    expect(await refusal(port.write({ patches: [], remember: { a: 1 } }))).toMatchObject({ code: 'host' })
    office.protect('Sheet1', false)
    await port.write({ patches: [], remember: { a: 1 } })
    expect(portrait()).toEqual({ ...before, settings: { 'counterpoise.a': 1 } })
  })

  test('a journal that somebody has spoilt counts as one that could not be put back', async () => {
    const { office } = await interrupted()
    office.settings.set('counterpoise.journal', 'spoilt')
    expect(await excelWorkbook().recover()).toEqual({ outcome: 'failed', areas: [] })
  })

  test('recovery passes over a sheet that was deleted', async () => {
    const { user, office } = await interrupted()
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.add('Other')
      await context.sync()
    })
    user.deleteSheet('Sheet1')
    expect(await excelWorkbook().recover()).toMatchObject({ outcome: 'restored' })
    expect(office.settings.size).toBe(0)
  })

  test('the journal is no setting to be recalled', async () => {
    const { book, office } = await interrupted()
    expect([...office.settings.keys()]).toEqual(['counterpoise.journal'])
    expect(await book.recall()).toEqual({})
  })
})

describe('What the host refuses', () => {
  test('a sheet protected meanwhile stops a refresh with nothing changed', async () => {
    const { book, office, portrait } = open()
    await book.write({ patches: [{ at, table: breakdown(), over: 'blank' }] })
    const before = portrait()
    const seen = valuesOf(breakdown())
    office.protect('Sheet1', true)
    const patch = { at, table: breakdown([1, 0, 0]), over: 'blank' as const, ours: area('B2:C7'), seen }
    expect(await refusal(book.write({ patches: [patch] }))).toMatchObject({
      code: 'protected',
      message: expect.stringContaining('nothing was changed'),
    })
    expect(portrait()).toEqual(before)
  })

  test('a sheet deleted under a refresh is a missing place', async () => {
    const { book, office, user } = open()
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.add('Risk')
      await context.sync()
    })
    const there = { ...at, sheet: 'Risk' }
    await book.write({ patches: [{ at: there, table: breakdown(), over: 'blank' }] })
    user.deleteSheet('Risk')
    const seen = valuesOf(breakdown())
    const ours = { ...area('B2:C7'), sheet: 'Risk' }
    expect(
      await refusal(book.write({ patches: [{ at: there, table: breakdown(), over: 'blank', ours, seen }] })),
    ).toMatchObject({ code: 'missing', message: expect.stringContaining('Risk!B2:C7') })
    expect(office.settings.size).toBe(0)
  })
})

/**
 * The main job without a screen: a user's workbook, the add-in's own port over the stand-in for the host's API, and the books that
 * link holdings, returns and a written table. Numbers come from the small generator below and are for these tests alone.
 */
import type { CellValue } from '../../src/sheet'
import { closeBooks, desk, FRIDAY, returnsOf, NAMES, HOLDINGS, RETURNS } from './books-fixture'

/** The definition, loop by loop: the oracle for what the books show. */
function contributionsOf(returns: CellValue[][], weights: readonly number[], perYear: number): number[] {
  const rows = returns.slice(1).map((row) => row.slice(1).map(Number))
  const means = weights.map((_, i) => rows.reduce((sum, row) => sum + (row[i] ?? 0), 0) / rows.length)
  const covariance = (i: number, j: number): number =>
    rows.reduce(
      (sum, row) => sum + ((row[i] ?? 0) - (means[i] ?? 0)) * ((row[j] ?? 0) - (means[j] ?? 0)),
      0,
    ) /
    (rows.length - 1)
  const marginals = weights.map((_, i) => weights.reduce((sum, w, j) => sum + w * covariance(i, j), 0))
  const volatility = Math.sqrt(weights.reduce((sum, w, i) => sum + w * (marginals[i] ?? 0), 0))
  return weights.map((w, i) => (w * (marginals[i] ?? 0) * Math.sqrt(perYear)) / volatility)
}

afterEach(closeBooks)

describe('Compute', () => {
  test('selecting holdings and returns and computing gives the contributions of the definition', async () => {
    const { compute } = await desk()
    const state = await compute()
    expect(state.status).toEqual({ kind: 'up to date' })
    const expected = contributionsOf(RETURNS, [0.5, 0.3, 0.4, -0.2], 52)
    expected.forEach((contribution, i) => {
      expect(state.breakdown?.decomposition.contribution[i]).toBeCloseTo(contribution, 13)
    })
    expect(state.breakdown?.byGroup.map(({ header, labels }) => [header, labels])).toEqual([
      ['Class', ['Shares', 'Bonds']],
    ])
  })

  test('computing without a block says which is missing, at its field', async () => {
    const { books, select } = await desk()
    await books.compute()
    expect(books.state().faults.holdings).toBe(
      'No holdings are selected; select the holdings block and use the selection.',
    )
    select('Sheet1', 'A3:C7')
    await books.takeSelection('holdings')
    await books.compute()
    expect(books.state().faults.returns).toBe(
      'No returns are selected; select the returns block and use the selection.',
    )
  })

  test.each<[string, string[], RegExp]>([
    ['two areas', ['A3:A7', 'C3:C7'], /several areas|two areas|2 areas/i],
    ['one cell', ['B4'], /^Found one cell; a block is needed/],
  ])('a selection of %s is refused in one sentence', async (_, areas, sentence) => {
    const { books, select } = await desk()
    select('Sheet1', ...areas)
    await books.takeSelection('holdings')
    expect(books.state().faults.holdings).toMatch(sentence)
    expect(books.state().holdings).toBeNull()
  })

  test('one cell inside a block offers the block around it', async () => {
    const { books, select } = await desk()
    select('Sheet1', 'B5')
    await books.takeSelection('holdings')
    const [offer] = books.state().offers
    expect(offer?.sentence).toBe('Use the filled cells around it, Sheet1!A3:C7, as the holdings?')
    await offer?.accept()
    expect(books.state().holdings?.holdings).toHaveLength(4)
    expect(books.state().offers).toEqual([])
    expect(books.state().faults.holdings).toBeUndefined()
  })

  test('whole columns are read as far as they are used', async () => {
    const { books, select } = await desk()
    select('Sheet1', 'A:C')
    await books.takeSelection('holdings')
    expect(books.state().holdings?.holdings.map(({ name }) => name)).toEqual(NAMES)
  })

  test('every holding without returns is among the findings before anything is computed', async () => {
    const { books, select } = await desk({
      holdings: [...HOLDINGS, ['Cash', 'Cash', 0.1], ['Loan', 'Cash', -0.1]],
    })
    select('Sheet1', 'A3:C9')
    await books.takeSelection('holdings')
    select('Returns', 'A1:E61')
    await books.takeSelection('returns')
    const stops = (): string[] =>
      (books.state().holdings?.findings ?? [])
        .filter(({ weight }) => weight === 'stops')
        .map(({ sentence }) => sentence)
    expect(stops().map((sentence) => sentence.slice(0, 39))).toEqual([
      'Sheet1!C8: found no returns for “Cash” ',
      'Sheet1!C9: found no returns for “Loan” ',
    ])
    await books.markRiskless('Cash', true)
    expect(stops()).toHaveLength(1)
  })

  test('a holding without returns is named with its cell until it is marked riskless', async () => {
    const { books, compute } = await desk({ holdings: [...HOLDINGS, ['Cash', 'Cash', 0.1]] })
    await compute()
    expect(books.state().faults.holdings).toBe(
      'Sheet1!C8: found no returns for “Cash” in Returns!A1:E61; a series of that name is needed, or mark the holding as riskless.',
    )
    await books.markRiskless('Cash', true)
    await books.compute()
    const { breakdown, status } = books.state()
    expect(status.kind).toBe('up to date')
    expect(breakdown?.decomposition.contribution[4]).toBe(0)
  })
})

/**
 * Roncalli, T., Introduction to Risk Parity and Budgeting, CRC 2013, Table 2.2 (p. 81); author's chapter-2 slides. Weights and outputs in
 * percent read in the slides' text; volatilities and correlations from memory, they reproduce every printed figure. Tolerance: half a
 * unit of the last printed digit.
 */
const RONCALLI = {
  weights: [0.5, 0.2, 0.3],
  volatilities: [0.3, 0.2, 0.15],
  correlations: [
    [1, 0.8, 0.5],
    [0.8, 1, 0.3],
    [0.5, 0.3, 1],
  ],
  risk: 20.87,
  marginal: [29.4, 16.63, 9.49],
  contribution: [14.7, 3.33, 2.85],
  percent: [70.43, 15.93, 13.64],
}

describe('A covariance matrix in place of returns', () => {
  test('gives the published figures, in pane and table', async () => {
    const names = ['A', 'B', 'C']
    const { volatilities, correlations } = RONCALLI
    const { compute, writeTable, valuesAt } = await desk({
      holdings: [
        ['Holding', 'Class', 'Weight'],
        ...names.map((name, i) => [name, 'Shares', RONCALLI.weights[i] ?? 0]),
      ],
      returns: [
        ['', ...names],
        ...correlations.map((row, i) => [
          names[i] ?? '',
          ...row.map((rho, j) => rho * (volatilities[i] ?? 0) * (volatilities[j] ?? 0)),
        ]),
      ],
    })
    const { breakdown, returns } = await compute()
    expect(returns?.content).toBe('covariance')
    const d = breakdown?.decomposition
    expect(Math.abs((d?.volatility ?? NaN) * 100 - RONCALLI.risk)).toBeLessThan(0.005)
    await writeTable()
    const rows = await valuesAt('Risk', 'C7:G9')
    rows.forEach(([, , marginal, contribution, share], i) => {
      expect(Math.abs(Number(marginal) * 100 - (RONCALLI.marginal[i] ?? NaN))).toBeLessThanOrEqual(0.005)
      expect(Math.abs(Number(contribution) * 100 - (RONCALLI.contribution[i] ?? NaN))).toBeLessThanOrEqual(
        0.005,
      )
      expect(Math.abs(Number(share) * 100 - (RONCALLI.percent[i] ?? NaN))).toBeLessThanOrEqual(0.005)
    })
  })
})

describe('The written table', () => {
  test('it follows a new weight with one request that reads and one that writes', async () => {
    const { books, compute, writeTable, user, office, quiet, valuesAt } = await desk()
    await compute()
    const { table } = await writeTable()
    expect(table).toMatchObject({ sheet: 'Risk', row: 0, column: 0 })
    office.counts.reset()
    user.type('Sheet1', 'C4', 0.8)
    const state = await quiet()
    expect([office.counts.syncs, office.counts.reads, office.counts.writes]).toEqual([2, 1, 1])
    expect(state.status).toEqual({ kind: 'up to date' })
    const expected = contributionsOf(RETURNS, [0.8, 0.3, 0.4, -0.2], 52)
    const written = await valuesAt('Risk', 'A7:F10')
    written.forEach((row, i) => {
      expect(row[0]).toBe(NAMES[i])
      expect(row[5]).toBeCloseTo(expected[i] ?? NaN, 13)
    })
    expect(books.state().breakdown?.net).toBeCloseTo(1.3, 14)
  })

  test('with 500 holdings of 1260 returns a new weight reads no returns again', async () => {
    const names = Array.from({ length: 500 }, (_, i) => `Holding ${i + 1}`)
    const holdings = [
      ['Holding', 'Class', 'Weight'],
      ...names.map((name, i) => [name, i % 2 ? 'Shares' : 'Bonds', 1 / 500]),
    ]
    const { books, select, writeTable, user, office, quiet, valuesAt } = await desk({
      holdings,
      returns: returnsOf(names, 1260),
    })
    select('Sheet1', 'A3:C503')
    await books.takeSelection('holdings')
    select('Returns', 'A1:SG1261')
    await books.takeSelection('returns')
    await books.compute()
    await writeTable()
    const before = books.state().returns
    office.counts.reset()
    user.type('Sheet1', 'C4', 0.1)
    const state = await quiet()
    expect([office.counts.syncs, office.counts.reads, office.counts.writes]).toEqual([2, 1, 1])
    expect(state.returns).toBe(before)
    expect(state.status).toEqual({ kind: 'up to date' })
    expect(await valuesAt('Risk', 'C7')).toEqual([[0.1]])
  }, 180_000)

  test('parts, total, sum and difference stand in it, and the parts add up', async () => {
    const { compute, writeTable, valuesAt } = await desk()
    await compute()
    await writeTable()
    const rows = await valuesAt('Risk', 'A6:N13')
    expect(rows[0]).toEqual([
      'Holding', 'Class', 'Weight', 'Stand-alone risk', 'Marginal contribution to risk', 'Contribution to risk',
      '95% band, from', '95% band, to', 'Share of risk', '95% band, from', '95% band, to', 'Beta to portfolio', 'Correlation with portfolio', 'Note',
    ]) // prettier-ignore
    const sum = rows.slice(1, 5).reduce((total, row) => total + Number(row[5]), 0)
    const total = Number(rows[5]?.[5])
    expect(rows.slice(5).map((row) => row[0])).toEqual(['Total', 'Sum of parts', 'Difference'])
    expect(Math.abs(sum - total)).toBeLessThan(1e-12 * total)
    expect(Number(rows[6]?.[5])).toBeCloseTo(total, 14)
    expect(rows[4]?.[13]).toBe('Risk-reducing position')
    // the band stands around its figure
    for (const row of rows.slice(1, 6)) {
      expect(Number(row[6])).toBeLessThan(Number(row[5]))
      expect(Number(row[7])).toBeGreaterThan(Number(row[5]))
    }
  })

  test('nothing is written while its values do not change', async () => {
    const { compute, writeTable, user, office, quiet } = await desk()
    await compute()
    await writeTable()
    office.counts.reset()
    user.type('Sheet1', 'C4', 0.5)
    await quiet()
    expect(office.counts.writes).toBe(0)
  })

  test('foreign cells in the way are asked for first and kept unless the user agrees', async () => {
    const { books, compute, user, select, valuesAt, quiet } = await desk()
    await compute()
    user.type('Sheet1', 'F9', 'mine')
    await quiet()
    select('Sheet1', 'E3')
    await books.writeTable({ kind: 'selection' })
    expect(books.state().faults.table).toMatch(/Sheet1!F9/)
    expect(await valuesAt('Sheet1', 'F9')).toEqual([['mine']])
    expect(await valuesAt('Sheet1', 'E3')).toEqual([['']])
    const [offer] = books.state().offers
    expect(offer?.button).toBe('Write over it')
    await offer?.accept()
    expect(books.state().table).toMatchObject({ sheet: 'Sheet1', row: 2, column: 4 })
    expect(await valuesAt('Sheet1', 'E3')).toEqual([['Contributions to risk: Sheet1']])
  })

  test('over the blocks it is computed from it is not written, nor offered', async () => {
    const { compute, writeTable, select, books, quiet, valuesAt } = await desk()
    await compute()
    await writeTable()
    const before = await valuesAt('Sheet1', 'A1:C7')
    select('Sheet1', 'B1')
    await books.writeTable({ kind: 'selection' })
    const state = await quiet()
    expect(state.faults.table).toMatch(
      /^The table would fill Sheet1!B1:O\d+ and cover the holdings in Sheet1!A3:C7, which it is computed from; choose another place\.$/,
    )
    expect(state.offers).toEqual([])
    expect(state.status).toEqual({ kind: 'up to date' })
    expect(await valuesAt('Sheet1', 'A1:C7')).toEqual(before)
  })

  test('a table that has to grow over foreign cells says so and asks', async () => {
    const { books, compute, writeTable, user, quiet, valuesAt } = await desk({
      returns: returnsOf([...NAMES, 'Timber'], 60),
    })
    await compute()
    const { table } = await writeTable()
    const below = `A${(table?.rows ?? 0) + 1}`
    user.type('Risk', below, 'mine')
    user.insertRows('Sheet1', 7, 1)
    user.type('Sheet1', 'A7', [['Timber', 'Real assets', 0.05]])
    const state = await quiet()
    expect(state.status).toMatchObject({
      kind: 'stale',
      sentence: expect.stringMatching(
        /^The table in Risk!A1:N\d+ has to grow and cannot\. Risk!A\d+ is in the way/,
      ) as string,
    })
    expect(await valuesAt('Risk', below)).toEqual([['mine']])
    expect(await valuesAt('Risk', 'A10')).toEqual([['Index hedge']])
    await state.offers[0]?.accept()
    expect(books.state().status).toEqual({ kind: 'up to date' })
    expect(await valuesAt('Risk', 'A10')).toEqual([['Timber']])
  })

  test('written elsewhere, the earlier table stays as it is and no longer follows', async () => {
    const { books, compute, writeTable, user, quiet, valuesAt } = await desk()
    await compute()
    await writeTable()
    await writeTable()
    expect(books.state().notice).toEqual(
      expect.stringMatching(
        /^Table written to 'Risk 2'!A1:N\d+\. It follows the weights\. The earlier one in Risk!A1:N\d+ stays as it is and no longer follows\.$/,
      ),
    )
    user.type('Sheet1', 'C4', 0.8)
    await quiet()
    expect(await valuesAt('Risk', 'C7')).toEqual([[0.5]])
    expect(await valuesAt('Risk 2', 'C7')).toEqual([[0.8]])
  })

  test('a protected sheet is named and left as it is', async () => {
    const { books, compute, writeTable, office, user, quiet, valuesAt } = await desk()
    await compute()
    await writeTable()
    office.protect('Risk', true)
    user.type('Sheet1', 'C4', 0.8)
    const state = await quiet()
    expect(state.status).toMatchObject({
      kind: 'failed',
      sentence: expect.stringMatching(/Risk.*protected/) as string,
    })
    expect(await valuesAt('Risk', 'C7')).toEqual([[0.5]])
    office.protect('Risk', false)
    await books.compute()
    expect(await valuesAt('Risk', 'C7')).toEqual([[0.8]])
  })

  test('while a cell is being edited the pane says what it waits for, and goes on by itself', async () => {
    const { books, compute, office, quiet } = await desk()
    await compute()
    office.editing = true
    const written = books.writeTable({ kind: 'new sheet' })
    await new Promise((resolve) => setTimeout(resolve, 700))
    expect(books.state().notice).toBe(
      'Waiting for the workbook. If a cell is being edited, finish it with Enter or Escape.',
    )
    office.editing = false
    await written
    expect((await quiet()).table).toMatchObject({ sheet: 'Risk' })
  })

  test('a write that fails half way leaves the workbook as it was and the figures up to date', async () => {
    const { books, compute, office, portrait, settle } = await desk()
    await compute()
    const before = portrait()
    office.faults.beforeOperation(25)
    await books.writeTable({ kind: 'new sheet' })
    await settle()
    expect(portrait()).toEqual(before)
    expect(books.state().faults.table).toMatch(/\.$/)
    expect(books.state().table).toBeNull()
    expect(books.state().status.kind).toBe('up to date')
  })

  test('labels that begin like formulas are text in it, before and after a refresh', async () => {
    const odd = ['=1+1', '@name', '+B', '-C']
    const { compute, writeTable, user, quiet, cells } = await desk({
      holdings: HOLDINGS.map((row, k) => (k === 0 ? row : [`'${odd[k - 1] ?? ''}`, ...row.slice(1)])),
      returns: RETURNS.map((row, k) => (k === 0 ? [row[0] ?? '', ...odd.map((name) => `'${name}`)] : row)),
    })
    await compute()
    await writeTable()
    user.type('Sheet1', 'C4', 0.45)
    await quiet()
    expect((await cells('Risk', 'A7:A10'))['values']).toEqual(odd.map((name) => [name]))
  })

  test('a holding added within the block makes it one row longer', async () => {
    const { compute, writeTable, user, quiet, valuesAt } = await desk({
      returns: returnsOf([...NAMES, 'Timber'], 60),
    })
    await compute()
    await writeTable()
    user.insertRows('Sheet1', 7, 1)
    user.type('Sheet1', 'A7', [['Timber', 'Real assets', 0.05]])
    const state = await quiet()
    expect(state.status).toEqual({ kind: 'up to date' })
    expect((await valuesAt('Risk', 'A7:A12')).flat()).toEqual([
      'Northern shares', 'Southern shares', 'Harbour bonds', 'Timber', 'Index hedge', 'Total',
    ]) // prettier-ignore
    expect(state.table?.rows).toBeGreaterThan(20)
  })
})

describe('The link', () => {
  test('it survives closing and opening again, and opening writes nothing', async () => {
    const { books, compute, writeTable, user, office, quiet, reopen, valuesAt } = await desk()
    await compute()
    await writeTable()
    await books.close()
    office.counts.reset()
    const again = await reopen()
    expect(again.state()).toMatchObject({ linked: true, status: { kind: 'stale' }, working: { share: null } })
    while (again.state().working) await new Promise((resolve) => setTimeout(resolve, 10))
    expect(again.state().status).toEqual({ kind: 'up to date' })
    expect(again.state().holdings?.holdings).toHaveLength(4)
    expect(office.counts.writes).toBe(0)
    user.type('Sheet1', 'C4', 0.9)
    await quiet()
    await new Promise((resolve) => setTimeout(resolve, 200))
    const [row] = await valuesAt('Risk', 'A7:C7')
    expect(row?.[2]).toBe(0.9)
  })

  test('rows inserted above the blocks move it along', async () => {
    const { compute, user, quiet } = await desk()
    await compute()
    user.insertRows('Sheet1', 1, 3)
    const state = await quiet()
    expect(state.holdings?.area.row).toBe(5)
    user.type('Sheet1', 'C7', 0.6)
    expect((await quiet()).breakdown?.decomposition.weights[0]).toBe(0.6)
  })

  test('a sheet deleted under it fails in one sentence, and nothing is lost', async () => {
    const { compute, user, quiet, valuesAt } = await desk()
    await compute()
    user.deleteSheet('Returns')
    const state = await quiet()
    expect(state.status).toMatchObject({
      kind: 'failed',
      sentence:
        'The range of the returns is gone: its cells or its sheet were deleted; select the returns again and use the selection.',
    })
    expect(await valuesAt('Sheet1', 'A4:C4')).toEqual([['Northern shares', 'Shares', 0.5]])
  })

  test('a written table whose sheet is deleted is told to be gone', async () => {
    const { compute, writeTable, user, quiet } = await desk()
    await compute()
    const { table } = await writeTable()
    user.deleteSheet('Risk')
    const state = await quiet()
    expect(state.table).toBeNull()
    expect(state.status).toEqual({ kind: 'up to date' })
    expect(state.notice).toBe(
      `The table written to Risk!A1:N${table?.rows} is gone: its cells or its sheet were deleted. Report writes it anew.`,
    )
  })

  test('a weight that is no number fails with its cell, and a number there mends it', async () => {
    const { compute, user, quiet } = await desk()
    await compute()
    user.type('Sheet1', 'C5', 'lots')
    expect((await quiet()).status).toEqual({
      kind: 'failed',
      sentence: 'Sheet1!C5: found “lots”; a weight is needed.',
      area: { sheet: 'Sheet1', row: 4, column: 2, rows: 1, columns: 1 },
    })
    user.type('Sheet1', 'C5', 0.3)
    expect((await quiet()).status).toEqual({ kind: 'up to date' })
  })

  test('an edit among the returns marks it stale at once and recomputes', async () => {
    const { books, compute, user, quiet, settle } = await desk()
    const before = (await compute()).breakdown?.decomposition.volatility
    user.type('Returns', 'B30', 0.15)
    await settle()
    expect(books.state().status).toMatchObject({
      kind: 'stale',
      sentence: 'Stale since Returns!B30 was edited.',
    })
    const after = await quiet()
    expect(after.status).toEqual({ kind: 'up to date' })
    expect(after.breakdown?.decomposition.volatility).toBeGreaterThan(before ?? Infinity)
  })

  test('newer dates below the returns are offered, then included', async () => {
    const { compute, user, quiet } = await desk()
    await compute()
    user.type('Returns', 'A62', [
      [FRIDAY + 7, 0.01, 0.01, 0, -0.01],
      [FRIDAY + 14, -0.01, 0.02, 0.001, 0],
    ])
    const state = await quiet()
    expect(state.offers.map(({ sentence }) => sentence)).toEqual([
      '2 newer dates to 11 Dec 2026 found beside Returns!A1:E61.',
    ])
    await state.offers[0]?.accept()
    const after = await quiet()
    expect(after.returns?.rows).toBe(62)
    expect(after.offers).toEqual([])
    expect(after.status).toEqual({ kind: 'up to date' })
  })

  test('holdings below the block are offered by name; a total there is not', async () => {
    const { compute, user, quiet } = await desk({ returns: returnsOf([...NAMES, 'Timber'], 60) })
    await compute()
    user.type('Sheet1', 'A8', [['Total', '', 1]])
    expect((await quiet()).offers).toEqual([])
    user.type('Sheet1', 'A8', [['Timber', 'Real assets', 0.05]])
    const state = await quiet()
    expect(state.offers.map(({ sentence }) => sentence)).toEqual([
      '1 further holding found below Sheet1!A3:C7: “Timber”.',
    ])
    state.offers[0]?.decline()
    user.type('Sheet1', 'C4', 0.55)
    expect((await quiet()).offers).toEqual([])
  })

  test('weights that are formulas are followed when what they rest on changes', async () => {
    const holdings = HOLDINGS.map((row, k) => (k === 1 ? ['Northern shares', 'Shares', '=H1/100'] : row))
    const { compute, user, quiet } = await desk({ holdings })
    user.type('Sheet1', 'H1', 50)
    await quiet()
    expect((await compute()).breakdown?.decomposition.weights[0]).toBe(0.5)
    user.type('Sheet1', 'H1', 70)
    expect((await quiet()).breakdown?.decomposition.weights[0]).toBe(0.7)
  })

  test('a table that feeds its own weights is found out after three refreshes', async () => {
    const holdings = HOLDINGS.map((row, k) => (k === 1 ? ['Northern shares', 'Shares', '=0.2+H1'] : row))
    const { books, compute, writeTable, user, quiet } = await desk({ holdings })
    await compute()
    await writeTable()
    user.type('Sheet1', 'H1', '=Risk!F7*3')
    for (let k = 0; k < 8 && books.state().status.kind !== 'failed'; k++) await quiet()
    expect(books.state().status).toMatchObject({
      kind: 'failed',
      sentence: expect.stringMatching(
        /the written table feeds its own weights\. Refreshing has stopped/,
      ) as string,
    })
  })

  test('two books in one workbook keep apart', async () => {
    const { books, compute, select, user, quiet } = await desk()
    await compute()
    user.type('Sheet1', 'A20', [
      ['Holding', 'Weight'],
      ['Harbour bonds', 0.5],
      ['Northern shares', 0.5],
    ])
    await quiet()
    await books.addBook()
    expect(books.state()).toMatchObject({ current: '2', breakdown: null, status: { kind: 'nothing linked' } })
    select('Sheet1', 'A20:B22')
    await books.takeSelection('holdings')
    select('Returns', 'A1:E61')
    await books.takeSelection('returns')
    await books.compute()
    expect(books.state().breakdown?.names).toEqual(['Harbour bonds', 'Northern shares'])
    await books.rename('Small book')
    user.type('Sheet1', 'C4', 0.9)
    await quiet()
    expect(books.state().breakdown?.decomposition.weights[1]).toBe(0.5)
    await books.switchTo('1')
    expect(books.state().breakdown?.decomposition.weights[0]).toBe(0.9)
    expect(books.state().books.map(({ title }) => title)).toEqual(['Sheet1', 'Small book'])
    await books.removeBook()
    expect(books.state().books).toHaveLength(1)
  })
})

describe('Settings', () => {
  test('the look-back and the estimator change the figures and are printed', async () => {
    const { books, compute, writeTable, valuesAt, quiet } = await desk()
    await compute()
    const { table } = await writeTable()
    await books.choose({ lookBack: { kind: 'last', dates: 30 } })
    await books.choose({ estimator: { kind: 'exponential', decay: 0.9 } })
    const state = await quiet()
    expect(state.breakdown?.dates?.used).toBe(30)
    const printed = (await valuesAt('Risk', `A1:C${table?.rows ?? 1}`)).map((row) =>
      row.filter((v) => v !== '').join(' '),
    )
    expect(printed).toContain('Look-back Last 30 dates')
    expect(printed.find((line) => line.startsWith('Estimator'))).toMatch(/decay factor 0\.9 /)
    const late = contributionsOf([RETURNS[0] ?? [], ...RETURNS.slice(31)], [0.5, 0.3, 0.4, -0.2], 52)
    await books.choose({ estimator: { kind: 'sample' } })
    late.forEach((contribution, i) => {
      expect(books.state().breakdown?.decomposition.contribution[i]).toBeCloseTo(contribution, 13)
    })
  })

  test('gaps leave dates out, with their number and the series that has most of them', async () => {
    const returns = RETURNS.map((row, t) =>
      t > 0 && t < 21 ? [...row.slice(0, 2), '', ...row.slice(3)] : row,
    )
    const { compute } = await desk({ returns })
    const state = await compute()
    expect(state.breakdown?.dates).toMatchObject({ used: 40, dropped: 20 })
    expect(state.breakdown?.findings.map(({ sentence }) => sentence)).toContain(
      '20 of 60 dates left out, where a holding has no return; “Southern shares” has the most gaps: 20 of 60 dates.',
    )
  })

  test('fewer than two common dates and returns that never move fail in one sentence', async () => {
    const apart = RETURNS.slice(0, 8).map((row, t) =>
      t === 0 ? row : row.map((v, i) => (i > 0 && (t + i) % 2 ? '' : v)),
    )
    const first = await desk({ returns: apart })
    await first.compute()
    expect(first.books.state().faults.returns).toMatch(
      /^Found 0 dates with a return for every holding .*; at least 2 are needed\.$/,
    )
    const flat = RETURNS.map((row, t) => (t === 0 ? row : [row[0] ?? '', 0, 0, 0, 0]))
    const second = await desk({ returns: flat })
    await second.compute()
    expect(second.books.state().faults.returns).toBe(
      'Found returns that never change in any series; at least one series that moves is needed.',
    )
  })
})

describe('Trades', () => {
  const wide = HOLDINGS.map((row) => [...row])

  test('applied in one step are followed by figures and table, and Undo puts back weights and formulas as they were', async () => {
    const { books, compute, writeTable, quiet, valuesAt, user, settle, cells } = await desk({
      holdings: wide,
    })
    user.type('Sheet1', 'C7', [['=-C4*0.4']])
    await settle()
    await compute()
    await writeTable()
    const before = await cells('Sheet1', 'A3:C7')
    books.trade({ line: { key: 'Northern shares', entry: 'new weight', text: '40%' } })
    books.trade({ line: { key: 'Harbour bonds', entry: 'change', text: '-5%' } })
    await books.applyTrades({ replaceFormulas: false })
    const after = await quiet()
    expect(after.status).toEqual({ kind: 'up to date' })
    expect(await valuesAt('Sheet1', 'C4:C7')).toEqual([[0.4], [0.3], [0.35], [expect.closeTo(-0.16, 12)]])
    // the formula follows the weight it names, and the figures follow both
    const expected = contributionsOf(RETURNS, [0.4, 0.3, 0.35, -0.16], 52)
    expected.forEach((contribution, i) => {
      expect(after.breakdown?.decomposition.contribution[i]).toBeCloseTo(contribution, 12)
    })
    const written = (await valuesAt('Risk', 'A1:H40')).find(([name]) => name === 'Northern shares')
    expect(written?.some((value) => Math.abs(Number(value) - (expected[0] ?? 0)) < 1e-12)).toBe(true)

    await books.undoTrades()
    await quiet()
    expect(await cells('Sheet1', 'A3:C7')).toEqual(before)
  })

  test('are refused by a protected sheet, and nothing has moved', async () => {
    const { books, compute, quiet, valuesAt, office } = await desk()
    await compute()
    await office.Excel.run(async (context) => {
      context.workbook.worksheets.getItem('Sheet1').protection.protect()
      await context.sync()
    })
    books.trade({ line: { key: 'Northern shares', entry: 'new weight', text: '40%' } })
    await books.applyTrades({ replaceFormulas: false })
    const { faults, trades, status } = await quiet()
    expect(faults.trades).toMatch(/protected/)
    expect(trades?.lines[0]?.typed?.text).toBe('40%')
    expect(status).toEqual({ kind: 'up to date' })
    expect(await valuesAt('Sheet1', 'C4:C7')).toEqual([[0.5], [0.3], [0.4], [-0.2]])
  })

  test('are refused where a weight was edited at the same moment, and the edit stands', async () => {
    const { books, compute, quiet, valuesAt, user } = await desk()
    await compute()
    books.trade({ line: { key: 'Northern shares', entry: 'new weight', text: '40%' } })
    // the edit has not been read when Apply is pressed
    user.type('Sheet1', 'C4', [[0.55]])
    await books.applyTrades({ replaceFormulas: false })
    const { faults } = await quiet()
    expect(faults.trades).toMatch(/Sheet1!C4|behind the sheet/)
    expect((await valuesAt('Sheet1', 'C4'))[0]).toEqual([0.55])
  })

  test('in cells of another book bring that one along too', async () => {
    const { books, compute, quiet, select } = await desk()
    await compute()
    await books.addBook()
    select('Sheet1', 'A3:C7')
    await books.takeSelection('holdings')
    select('Returns', `A1:E${RETURNS.length}`)
    await books.takeSelection('returns')
    await books.compute()
    await quiet()
    await books.switchTo('1')
    books.trade({ line: { key: 'Northern shares', entry: 'new weight', text: '40%' } })
    await books.applyTrades({ replaceFormulas: false })
    await quiet()
    await books.switchTo('2')
    const { breakdown, status } = await quiet()
    expect(status).toEqual({ kind: 'up to date' })
    expect(breakdown?.decomposition.weights[0]).toBe(0.4)
  })
})

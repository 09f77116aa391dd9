/** LEASTRISKWEIGHT and BUDGETWEIGHTS as a host calls them; figures by hand, as beside each. Tolerance: 12 digits. */
import * as core from '../../../src/core'
import { absoluteGap } from '../../closeness'
import { call, refusal } from './function-calls'

jest.mock('../../../src/core', () => {
  const actual = jest.requireActual<typeof core>('../../../src/core')
  return { ...actual, riskBudgetWeights: jest.fn(actual.riskBudgetWeights) }
})

const flat = (result: unknown): number[] => (result as number[][]).flat()
const near = (found: unknown, expected: number[]) =>
  expect(absoluteGap(flat(found), expected)).toBeLessThan(1e-12)

const C = [
  [0.04, 0.01],
  [0.01, 0.09],
]
const uncorrelated = [
  [0.04, 0],
  [0, 0.01],
]
/** Twelve dates of two positions whose deviations are the same columns of -1 and 1 times .02 and .03: uncorrelated. */
const R = Array.from({ length: 12 }, (_, t) => [t % 2 ? 0.02 : -0.02, t % 4 < 2 ? 0.03 : -0.03])

describe('LEASTRISKWEIGHT', () => {
  it('is w - Cw / C_ii, lying as the weights do', () => {
    // Cw = (.025, .05): .5 - .025/.04 and .5 - .05/.09
    const expected = [-0.125, 0.5 - 5 / 9]
    near(call('LEASTRISKWEIGHT', [[0.5], [0.5]], C), expected)
    const across = call('LEASTRISKWEIGHT', [[0.5, 0.5]], C) as number[][]
    expect(across).toHaveLength(1)
    near(across, expected)
  })

  it('takes returns and an estimator, which changes nothing where nothing correlates', () => {
    near(call('LEASTRISKWEIGHT', [[0.5], [0.5]], R), [0, 0])
    near(call('LEASTRISKWEIGHT', [[0.5], [0.5]], R, 'shrink identity'), [0, 0])
  })

  it('leaves a position blank that never moves, and is not available where none does', () => {
    expect(call('LEASTRISKWEIGHT', [[0.5], [0.5]], [[0.04, 0], [0, 0]])).toEqual([[0], ['']]) // prettier-ignore
    expect(
      refusal(
        'LEASTRISKWEIGHT',
        [[0.5], [0.5]],
        [
          [0, 0],
          [0, 0],
        ],
      ),
    ).toEqual({
      // prettier-ignore
      code: 'zero-risk',
      sentence: 'risk: found no position that moves; a volatility above 0 is needed.',
    })
  })
})

describe('BUDGETWEIGHTS', () => {
  it('is equal risk contribution in a column where no budgets are given, whatever stands for nothing', () => {
    // two positions: inverse volatility, whatever the correlation (Maillard, Roncalli & Teiletche 2010)
    for (const nothing of [undefined, null]) {
      const weights = call('BUDGETWEIGHTS', C, nothing) as number[][]
      expect(weights).toHaveLength(2)
      near(weights, [0.6, 0.4])
    }
    near(call('BUDGETWEIGHTS', [[0.04]]), [1])
  })

  it('lies as the budgets do', () => {
    // uncorrelated: w_i goes by sqrt(b_i) / s_i = sqrt(.8)/.2 : sqrt(.2)/.1 = 1 : 1
    near(call('BUDGETWEIGHTS', uncorrelated, [[0.8], [0.2]]), [0.5, 0.5])
    const across = call('BUDGETWEIGHTS', uncorrelated, [[0.8, 0.2]]) as number[][]
    expect(across).toHaveLength(1)
    near(across, [0.5, 0.5])
  })

  it('takes returns under names and dates, and the estimators', () => {
    const dated = [['Date', 'A', 'B'], ...R.map((row, t) => [45_000 + t, ...row])]
    near(call('BUDGETWEIGHTS', dated), [0.6, 0.4])
    near(call('BUDGETWEIGHTS', dated, null, 'shrink correlation'), [0.6, 0.4])
  })

  it('gives the shares of risk that were asked for', () => {
    const budgets = [[0.1], [0.9]]
    near(call('RISKSHARE', call('BUDGETWEIGHTS', C, budgets) as number[][], C), [0.1, 0.9])
  })

  it('searches once for a block and budgets, and anew for other ones', () => {
    const search = core.riskBudgetWeights as jest.MockedFunction<typeof core.riskBudgetWeights>
    search.mockClear()
    const block = () => R.map((row) => row.map((r) => r * 1.5))
    for (let k = 0; k < 20; k++) call('BUDGETWEIGHTS', block(), [[0.3], [0.7]])
    expect(search).toHaveBeenCalledTimes(1)
    call('BUDGETWEIGHTS', block(), [[0.4], [0.6]])
    call('BUDGETWEIGHTS', block(), [[0.4], [0.6]], 'exponential')
    expect(search).toHaveBeenCalledTimes(3)
  })

  it.each<[string, unknown[], string, string]>([
    [
      'a sum of 0.9',
      [C, [[0.4], [0.5]]],
      'out-of-range',
      'budgets: they add up to 0.9; shares of risk that add up to 1 are needed.',
    ],
    [
      'a negative budget, down',
      [C, [[1.5], [-0.5]]],
      'out-of-range',
      'budgets, row 2, column 1: -0.5; shares of 0 or more are needed.',
    ],
    [
      'a negative budget, across',
      [C, [[1.5, -0.5]]],
      'out-of-range',
      'budgets, row 1, column 2: -0.5; shares of 0 or more are needed.',
    ],
    [
      'text among them',
      [C, [[0.5], ['half']]],
      'text',
      'budgets, row 2, column 1: found “half”; a number is needed.',
    ],
    [
      'too many',
      [C, [[0.5], [0.25], [0.25]]],
      'shape',
      'budgets: found 3 budgets for 2 columns of risk; one budget for each column is needed.',
    ],
    [
      'a column that never moves, below names and beside dates',
      [[['Date', 'A', 'B'], ...R.map(([a], t) => [45_000 + t, a, 0.001])]],
      'zero-risk',
      'risk, row 2, column 3: column 2 never moves and cannot have a share of the risk; a budget of 0 is needed for it, or returns that move.',
    ],
    [
      'two that offset each other',
      [
        [
          [0.04, -0.06],
          [-0.06, 0.09],
        ],
      ],
      'zero-risk',
      'risk: found a long-only mix with hardly any risk, beside which no shares of risk can be held to a budget; positions that do not offset each other so closely are needed.',
    ],
  ])('says what is wrong with %s', (_, args, code, sentence) => {
    expect(refusal('BUDGETWEIGHTS', ...args)).toEqual({ code, sentence })
  })
})

/**
 * The worksheet functions as a host calls them. Expected figures are worked by hand on two positions, weights (.5, .5) and
 * C = diag(.04, .01), unless a line says otherwise: w'C w = .0125, s = sqrt(.0125) = .1118033988749895.
 */
import { Fault } from '../../../src/core'
import { attempt, explain } from '../../../src/sheet/explain'
import { call, refusal } from './function-calls'

const C = [
  [0.04, 0],
  [0, 0.01],
]
const half = [[0.5], [0.5]]
const s = Math.sqrt(0.0125)

/** Four dates of two positions; the second row of each pair of tests reorders them. */
const R = [
  [0.01, 0.02],
  [0.03, -0.02],
  [-0.02, 0.01],
  [0.02, 0.03],
]
// var(r1) = .0014/3, var(r2) = .0014/3, cov = -.0004/3 (means .01, .01; deviations 0 .02 -.03 .01 and .01 -.03 0 .02), by hand
const C_R = [
  [0.0014 / 3, -0.0004 / 3],
  [-0.0004 / 3, 0.0014 / 3],
]

const flat = (result: unknown): number[] => (result as number[][]).flat()

function expectClose(result: unknown, expected: number[], digits = 14) {
  const found = flat(result)
  expect(found).toHaveLength(expected.length)
  expected.forEach((value, k) => expect(found[k]).toBeCloseTo(value, digits))
}

describe('each function', () => {
  it('COVARIANCE divides by one less than the dates, and scales with periods_per_year', () => {
    expectClose(call('COVARIANCE', R), C_R.flat(), 16)
    expectClose(
      call('COVARIANCE', R, 12),
      C_R.flat().map((c) => 12 * c),
      15,
    )
  })

  it('CORRELATION has ones on its diagonal and a blank where a position never moves', () => {
    expectClose(call('CORRELATION', R), [1, -2 / 7, -2 / 7, 1])
    const withCash = R.map((row) => [...row, 0.001])
    expect((call('CORRELATION', withCash) as unknown[][])[2]).toEqual(['', '', ''])
    expect((call('CORRELATION', withCash) as unknown[][])[0]?.[2]).toBe('')
  })

  it('VOLATILITY is the root of w’Cw', () => {
    expect(call('VOLATILITY', half, C)).toBeCloseTo(s, 15)
    expect(call('VOLATILITY', half, C, 4)).toBeCloseTo(2 * s, 15)
  })

  it('STANDALONE takes absolute weights', () => {
    expectClose(call('STANDALONE', [[0.5], [-0.5]], C), [0.1, 0.05])
  })

  it('MARGINAL is Cw over the volatility', () => {
    expectClose(call('MARGINAL', half, C), [0.02 / s, 0.005 / s])
  })

  it('CONTRIBUTION sums to the volatility, by the year as well', () => {
    expectClose(call('CONTRIBUTION', half, C), [0.01 / s, 0.0025 / s])
    const yearly = flat(call('CONTRIBUTION', half, C, 252))
    expect(yearly.reduce((a, b) => a + b)).toBeCloseTo(call('VOLATILITY', half, C, 252) as number, 14)
  })

  it('RISKSHARE and BETA divide by the variance', () => {
    expectClose(call('RISKSHARE', half, C), [0.8, 0.2])
    expectClose(call('BETA', half, C), [1.6, 0.4])
  })

  it('DIVERSIFICATION and EFFECTIVE are one number', () => {
    expect(call('DIVERSIFICATION', half, C)).toBeCloseTo(0.15 / s, 14)
    expect(call('EFFECTIVE', half, C)).toBeCloseTo(1 / (0.64 + 0.04), 14)
  })

  it('RETURNS are simple unless log is asked for', () => {
    expectClose(call('RETURNS', [[100], [110], [99]]), [0.1, -0.1])
    expectClose(call('RETURNS', [[100], [110], [99]], 'Log'), [Math.log(1.1), Math.log(0.9)])
  })

  it('BREAKDOWN lays the figures out under headings, with a total', () => {
    const table = call('BREAKDOWN', [['=1+1'], ['@beta']], half, C) as unknown[][]
    expect(table[0]).toEqual([
      'Holding',
      'Weight',
      'Stand-alone risk',
      'Marginal contribution to risk',
      'Contribution to risk',
      'Share of risk',
      'Beta to portfolio',
      'Correlation with portfolio',
    ])
    expect(table.map((row) => row[0])).toEqual(['Holding', '=1+1', '@beta', 'Total'])
    expectClose([table[1]!.slice(1)], [0.5, 0.1, 0.02 / s, 0.01 / s, 0.8, 1.6, 0.1 / s])
    expectClose([table[2]!.slice(1)], [0.5, 0.05, 0.005 / s, 0.0025 / s, 0.2, 0.4, 0.05 / s])
    expectClose([[table[3]![1], table[3]![2], table[3]![4], table[3]![5]] as number[]], [1, 0.15, s, 1])
    expect([table[3]![3], table[3]![6], table[3]![7]]).toEqual(['', '', ''])
  })

  it('GROUPED adds positions up by group in the order of their first position', () => {
    const risk = [
      [0.04, 0, 0.01],
      [0, 0.01, 0],
      [0.01, 0, 0.09],
    ]
    // by hand: w = (.5, .3, .2), Cw = (.022, .003, .023), w'Cw = .011 + .0009 + .0046 = .0165
    const total = Math.sqrt(0.0165)
    const table = call(
      'GROUPED',
      [['Shares'], ['Bonds'], [' shares ']],
      [[0.5, 0.3, 0.2]],
      risk,
    ) as unknown[][]
    expect(table.map((row) => row[0])).toEqual(['Group', 'Shares', 'Bonds', 'Total'])
    // the group of positions 1 and 3 alone: .25*.04 + 2*.5*.2*.01 + .04*.09 = .0156
    expectClose([table[1]!.slice(1)], [0.7, Math.sqrt(0.0156), 0.0156 / total, 0.0156 / 0.0165])
    expectClose([table[2]!.slice(1)], [0.3, 0.03, 0.0009 / total, 0.0009 / 0.0165])
    expectClose([table[3]!.slice(1)], [1, Math.sqrt(0.0156) + 0.03, total, 1])
  })
})

describe('arguments as a host hands them over', () => {
  it('left-out optional ones are null or undefined', () => {
    expect(call('VOLATILITY', half, C, null, null)).toBe(call('VOLATILITY', half, C))
    expect(call('VOLATILITY', half, C, undefined, undefined)).toBe(call('VOLATILITY', half, C, 1, 'sample'))
    expect(call('RETURNS', [[1], [2]], null)).toEqual([[1]])
  })

  it('vectors come back in the orientation of weights', () => {
    const column = flat(call('CONTRIBUTION', half, C))
    expect(call('CONTRIBUTION', half, C)).toEqual(column.map((c) => [c]))
    expect(call('CONTRIBUTION', [[0.5, 0.5]], C)).toEqual([column])
  })

  it('one cell is a block of one, bare or in rows', () => {
    expect(call('VOLATILITY', [[2]], [[0.04]])).toBeCloseTo(0.4, 15)
    expect(call('VOLATILITY', 2, 0.04)).toBeCloseTo(0.4, 15)
    expect(call('VOLATILITY', half, C, [[4]], [['sample']])).toBeCloseTo(2 * s, 15)
  })

  it('estimators are read whatever their case and spacing, with a point or a comma', () => {
    const exponential = call('VOLATILITY', half, R, 1, 'exponential 0.94')
    expect(call('VOLATILITY', half, R, 1, ' Exponential ')).toBe(exponential)
    expect(call('VOLATILITY', half, R, 1, 'EXPONENTIAL  0,94')).toBe(exponential)
    expect(call('VOLATILITY', half, R, 1, 'exponential .97')).not.toBe(exponential)
  })

  it('the newest row counts most under exponential weighting', () => {
    // by hand, decay 1/2 on two dates: weights 1/3 and 2/3, mean .02/3 + ... = variance omega1 omega2 (r1 - r2)^2
    expect(call('COVARIANCE', [[0.03], [0]], 1, 'exponential 0.5')).toEqual([
      [expect.closeTo((2 / 9) * 0.0009, 15)],
    ])
    const newestCalm = call(
      'VOLATILITY',
      [[1]],
      [[0.05], [-0.05], [0.01], [0]],
      1,
      'exponential 0.5',
    ) as number
    const newestWild = call(
      'VOLATILITY',
      [[1]],
      [[0.01], [0], [0.05], [-0.05]],
      1,
      'exponential 0.5',
    ) as number
    expect(newestWild).toBeGreaterThan(1.5 * newestCalm)
  })

  it('nothing given is changed', () => {
    const weights = [[0.5], [0.5]]
    const risk = [['When', 'A', 'B'], ...R.map((row, t) => [46003 - t, ...row])]
    const before = JSON.stringify([weights, risk])
    call('BREAKDOWN', [['B'], ['A']], weights, risk)
    expect(JSON.stringify([weights, risk])).toBe(before)
  })
})

describe('names and dates around a block', () => {
  const dated = (days: unknown[], corner: unknown = 'Date') => [
    [corner, 'A', 'B'],
    ...R.map((row, t) => [days[t], ...row]),
  ]
  const plain = call('VOLATILITY', half, R, 1, 'exponential')

  it('a first row of names is set aside', () => {
    expect(call('VOLATILITY', half, [['A', 'B'], ...R], 1, 'exponential')).toBe(plain)
  })

  it.each([
    ['serial numbers', [46000, 46001, 46004, 46005]],
    ['ISO text', ['2026-01-05', '2026-01-06', '2026-01-12', '2026-02-01']],
    ['both', [46000, '2025-12-20', 46024, '2026-02-01']],
  ])('a first column of dates is set aside: %s', (_, days) => {
    expect(call('VOLATILITY', half, dated(days), 1, 'exponential')).toBe(plain)
  })

  it.each([
    ['a blank of the desktop', 0],
    ['a blank of the web', null],
    ['a blank', ''],
    ['any word', 'As of'],
  ])('the corner above dates may be %s', (_, corner) => {
    expect(call('VOLATILITY', half, dated([46000, 46001, 46004, 46005], corner), 1, 'exponential')).toBe(
      plain,
    )
  })

  it('dated rows are put in order, oldest first', () => {
    const days = [46000, 46001, 46004, 46005]
    const [head, ...rows] = dated(days)
    expect(call('VOLATILITY', half, [head, ...[...rows].reverse()], 1, 'exponential')).toBe(plain)
    expect(call('VOLATILITY', half, [...R].reverse(), 1, 'exponential')).not.toBe(plain)
  })

  it('a square block under dates is returns whatever its numbers', () => {
    const square = [
      ['Date', 'A', 'B'],
      [46000, 0.04, 0],
      [46001, 0, 0.01],
    ]
    expect(call('COVARIANCE', square)).toEqual([
      [expect.closeTo(0.0008, 16), expect.closeTo(-0.0002, 16)],
      [expect.closeTo(-0.0002, 16), expect.closeTo(0.00005, 16)],
    ])
  })

  it('a covariance matrix may carry its names, above and at the side', () => {
    expect(call('VOLATILITY', half, [['A', 'B'], ...C])).toBeCloseTo(s, 15)
    expect(
      call('VOLATILITY', half, [
        ['', 'A', 'B'],
        ['a', ...C[0]!],
        ['b', ...C[1]!],
      ]),
    ).toBeCloseTo(s, 15)
  })

  it('prices that read as serial numbers stay prices unless they run like dates', () => {
    const levels = [
      ['Index', 'A'],
      [41000, 100],
      [40500, 110],
      [42000, 121],
    ]
    expectClose(call('RETURNS', levels), [-500 / 41000, 0.1, 1500 / 40500, 0.1])
    const days = [
      ['Index', 'A'],
      [46000, 100],
      [46007, 110],
      [46014, 121],
    ]
    expectClose(call('RETURNS', days), [0.1, 0.1])
    const headed = [
      ['Date', 'A'],
      [46014, 121],
      [46000, 100],
      [46007, 110],
    ]
    expectClose(call('RETURNS', headed), [0.1, 0.1])
  })

  it('BREAKDOWN finds columns by name, whatever the case and spacing, and leaves out what is not held', () => {
    const risk = [['Gamma', 'beta  two', 'ALPHA'], ...R.map((row, t) => [0.01 * (t % 2), row[1], row[0]])]
    const named = call('BREAKDOWN', [['Alpha', 'Beta Two']], half, risk) as unknown[][]
    const byPlace = call('BREAKDOWN', [['Alpha', 'Beta Two']], half, R) as unknown[][]
    expect(named).toHaveLength(4)
    named
      .slice(1)
      .forEach((row, k) =>
        row.forEach((value, c) =>
          expect(value).toEqual(
            typeof value === 'number' ? expect.closeTo(byPlace[k + 1]![c] as number, 14) : byPlace[k + 1]![c],
          ),
        ),
      )
  })

  it('a name found to the letter goes before one that only resembles it', () => {
    const risk = [['a', 'A'], ...R]
    const table = call('BREAKDOWN', [['A'], ['a']], [[0.7], [0.3]], risk) as unknown[][]
    const swapped = call('BREAKDOWN', [['x'], ['y']], [[0.3], [0.7]], R) as unknown[][]
    expect(table[1]!.slice(1)).toEqual(swapped[2]!.slice(1))
  })
})

describe('refusals name the argument, the place, what was found and what is needed', () => {
  const blankRow = [
    [0.01, 0.02],
    [null, 0.01],
    [0.01, 0.03],
  ]
  it.each([
    [
      'text among weights',
      ['VOLATILITY', [[0.5], [0.2], ['abc']], C],
      'text',
      'weights, row 3, column 1: found “abc”; a number is needed.',
    ],
    [
      'text among the first row of numbers',
      [
        'VOLATILITY',
        half,
        [
          [0.01, 'abc'],
          [0.02, 0.03],
        ],
      ],
      'text',
      'risk, row 1, column 2: found “abc”; a number is needed.',
    ],
    [
      'text that looks like a number',
      ['VOLATILITY', [['12.5%', 0.5]], C],
      'text',
      'weights, row 1, column 1: found “12.5%”; a number is needed, and this cell holds text that only looks like one.',
    ],
    [
      'a blank weight',
      ['VOLATILITY', [[0.5], [null]], C],
      'blank',
      'weights, row 2, column 1: found a blank cell; a number is needed.',
    ],
    [
      'a truth value',
      ['VOLATILITY', [[0.5], [true]], C],
      'text',
      'weights, row 2, column 1: found TRUE; a number is needed.',
    ],
    [
      'a blank return',
      ['VOLATILITY', half, blankRow],
      'blank',
      'risk, row 2, column 1: found a blank cell; a number is needed.',
    ],
    [
      'a place counted from the corner of a block with names and dates, in its own order',
      [
        'VOLATILITY',
        half,
        [
          ['Date', 'A', 'B'],
          [46002, 'n/a', 0.1],
          [46001, 0.1, 0.1],
          [46000, 0.1, 0.2],
        ],
      ],
      'text',
      'risk, row 2, column 2: found “n/a”; a number is needed.',
    ],
    [
      'weights in a rectangle',
      ['VOLATILITY', C, C],
      'shape',
      'weights: found 2 rows and 2 columns; one row or one column is needed.',
    ],
    [
      'nothing for weights',
      ['VOLATILITY', null, C],
      'blank',
      'weights: found nothing; a block of cells is needed.',
    ],
    [
      'ragged rows',
      ['VOLATILITY', half, [[1, 2], [3]]],
      'shape',
      'risk: found rows of unequal length; a rectangle of cells is needed.',
    ],
    [
      'more weights than columns',
      ['VOLATILITY', [[1], [1], [1]], R],
      'shape',
      'risk: found 2 columns for 3 weights; one column for each weight is needed.',
    ],
    [
      'dates across instead of down',
      [
        'VOLATILITY',
        half,
        [
          [0.01, 0.02, 0.03],
          [0.03, 0.01, 0.02],
        ],
      ],
      'shape',
      'risk: found 3 columns for 2 weights; one column for each weight is needed (its rows are as many: TRANSPOSE turns it).',
    ],
    [
      'one row of returns',
      ['VOLATILITY', half, [[0.1, 0.2]]],
      'too-few',
      'risk: found 1 row of returns; at least 2 are needed.',
    ],
    [
      'one row of prices',
      ['RETURNS', [[100, 20]]],
      'too-few',
      'prices: found 1 row of prices; at least 2 are needed.',
    ],
    [
      'names alone',
      ['COVARIANCE', [['A', 'B']]],
      'too-few',
      'returns: found names without numbers below; rows of numbers are needed.',
    ],
    [
      'a price of 0',
      ['RETURNS', [['A'], [100], [0], [90]]],
      'out-of-range',
      'prices, row 3, column 1: found 0, which is how a blank cell may arrive here; a price above 0 is needed.',
    ],
    [
      'a heading that is missing',
      [
        'COVARIANCE',
        [
          ['A', 'B', 0],
          [0.1, 0.2, 0.3],
          [0.2, 0.1, 0.1],
        ],
      ],
      'not-a-number',
      'returns, row 1, column 3: found 0; a name is needed, as in the rest of this row.',
    ],
    [
      'a cell among the dates that is none',
      [
        'COVARIANCE',
        [
          ['Date', 'A'],
          [46000, 0.2],
          ['soon', 0.1],
          [46002, 0.3],
        ],
      ],
      'text',
      'returns, row 3, column 1: found “soon”; a date is needed, as in the rest of this column.',
    ],
    [
      'a date that comes twice',
      [
        'COVARIANCE',
        [
          ['Date', 'A'],
          [46001, 0.2],
          [46000, 0.1],
          [46001, 0.3],
        ],
      ],
      'twice',
      'returns, row 4, column 1: found the same date a second time; each date once is needed.',
    ],
    [
      'dates without a row of names, as text',
      [
        'COVARIANCE',
        [
          ['2026-01-05', 0.2],
          ['2026-01-06', 0.1],
        ],
      ],
      'text',
      'returns, row 1, column 1: found “2026-01-05”; a number is needed; a first column of dates needs a first row of names above it.',
    ],
    [
      'dates without a row of names, as serial numbers',
      ['COVARIANCE', [46000, 46001, 46002, 46003, 46004].map((day, t) => [day, 0.01 * t])],
      'shape',
      'returns, row 1, column 1: found what looks like a column of dates without a heading; a first row of names above dates and numbers is needed.',
    ],
    [
      'an estimator not known here',
      ['VOLATILITY', half, R, 1, 'Shrink everything'],
      'unknown-choice',
      'estimator: found “shrink everything”; “sample”, “exponential 0.97”, “shrink identity”, “shrink correlation”, “shrink oas” or “lagged 2” is needed.',
    ],
    [
      'a decay factor of 1',
      ['VOLATILITY', half, R, 1, 'exponential 1'],
      'out-of-range',
      'estimator: found a decay factor of 1; a number between 0 and 1 is needed, such as 0.94.',
    ],
    [
      'an estimator that is a number',
      ['VOLATILITY', half, R, 1, 0.97],
      'unknown-choice',
      'estimator: found 0.97; “sample”, “exponential 0.97”, “shrink identity”, “shrink correlation”, “shrink oas” or “lagged 2” is needed.',
    ],
    [
      'an estimator for a covariance matrix',
      ['VOLATILITY', half, C, 1, 'exponential'],
      'unknown-choice',
      'estimator: found an estimator for a covariance matrix, which is taken as given; no estimator is needed.',
    ],
    [
      'no periods',
      ['VOLATILITY', half, C, 0],
      'out-of-range',
      'periods_per_year: found 0; a number above 0 is needed, such as 52 or 252.',
    ],
    [
      'periods in words',
      ['VOLATILITY', half, C, 'weekly'],
      'text',
      'periods_per_year: found “weekly”; a number is needed.',
    ],
    [
      'several periods',
      ['VOLATILITY', half, C, [[1], [2]]],
      'shape',
      'periods_per_year: found 2 x 1 cells; one value is needed.',
    ],
    [
      'an unknown kind',
      ['RETURNS', [[1], [2]], 'daily'],
      'unknown-choice',
      'kind: found “daily”; “simple” or “log” is needed.',
    ],
    [
      'a correlation matrix',
      [
        'VOLATILITY',
        half,
        [
          ['A', 'B'],
          [1, 0.5],
          [0.5, 1],
        ],
      ],
      'correlation-matrix',
      'risk, row 2, column 1: found ones all down the diagonal, which looks like a correlation matrix; ' +
        'covariances (correlation times both volatilities) are needed.',
    ],
    [
      'a matrix that only fails symmetry',
      [
        'VOLATILITY',
        half,
        [
          [0.04, 0.01],
          [0.011, 0.01],
        ],
      ],
      'not-symmetric',
      'risk, row 2, column 1: found 0.011 here but 0.01 in row 1, column 2 of the matrix; the same covariance is needed in both places, ' +
        'or a first row of names and a first column of dates if these are returns.',
    ],
    [
      'a covariance beyond its bound',
      [
        'VOLATILITY',
        half,
        [
          [0.04, 0.03],
          [0.03, 0.01],
        ],
      ],
      'out-of-range',
      'risk, row 2, column 1: found a covariance of 0.03 between variances of 0.04 and 0.01; ' +
        'a covariance within the product of both volatilities is needed.',
    ],
    [
      'a name that no column has',
      ['BREAKDOWN', [['A', 'C']], half, [['A', 'B'], ...R]],
      'unmatched',
      'names, row 1, column 2: found “C”, which is no heading of risk; a name in its first row is needed.',
    ],
    [
      'a name over two columns',
      ['BREAKDOWN', [['A'], ['b']], half, [['A', 'B', 'B '], ...R.map((row) => [...row, 0.01 * row[0]!])]],
      'twice',
      'names, row 2, column 1: found “b” over 2 columns of risk; each name once in its first row is needed.',
    ],
    [
      'a name given twice',
      ['BREAKDOWN', [['A'], ['a ']], half, [['A', 'B'], ...R]],
      'twice',
      'names, row 2, column 1: found “a” a second time; each name once is needed.',
    ],
    [
      'a blank name',
      ['BREAKDOWN', [['A'], [0]], half, R],
      'blank',
      'names, row 2, column 1: found a blank cell; a name is needed.',
    ],
    [
      'too few names',
      ['BREAKDOWN', [['A']], half, R],
      'shape',
      'names: found 1 name for 2 weights; one name for each weight is needed.',
    ],
    [
      'too few groups',
      ['GROUPED', [['A']], half, R],
      'shape',
      'groups: found 1 group for 2 weights; one group for each weight is needed.',
    ],
    [
      'results too large for a cell',
      ['COVARIANCE', [[1e200], [-1e200]]],
      'out-of-range',
      'Found a result too large for a cell; numbers small enough for their squares to be held are needed.',
    ],
  ] as [string, [string, ...unknown[]], string, string][])('%s', (_, [id, ...args], code, sentence) => {
    expect(refusal(id, ...args)).toEqual({ code, sentence })
  })

  it('a matrix that gives these weights a negative variance', () => {
    // each pair is within its bound, all three together are not: by hand w'Cw = 3 - 6*.9 < 0
    const risk = [
      [2, -1.8, -1.8],
      [-1.8, 2, -1.8],
      [-1.8, -1.8, 2],
    ]
    expect(refusal('VOLATILITY', [[1], [1], [1]], risk).code).toBe('negative-variance')
  })
})

describe('blanks that arrive as zeros', () => {
  const history = (zeros: number, at: 'start' | 'end', dates = 40) =>
    Array.from({ length: dates }, (_, t) => {
      const age = at === 'start' ? t : dates - 1 - t
      return [0.01 * (t % 3) - 0.01, age < zeros ? 0 : 0.02 - 0.01 * (t % 4) + 0.001]
    })

  it.each(['start', 'end'] as const)(
    'more than ten in a row at the %s of a column that moves are refused as missing data',
    (at) => {
      expect(refusal('VOLATILITY', half, history(11, at))).toEqual({
        code: 'missing-data',
        sentence:
          `risk, row ${at === 'start' ? 1 : 30}, column 2: found 11 zeros in a row at the ${at}, which is how blanks arrive here; ` +
          'returns for every date are needed.',
      })
      expect(refusal('COVARIANCE', history(11, at)).code).toBe('missing-data')
      expect(call('VOLATILITY', half, history(10, at))).toBeGreaterThan(0)
    },
  )

  it('the column is named where it has a name, and dates decide what is the start', () => {
    const rows = history(12, 'start')
    const newestFirst = [['Date', 'Old', 'Young'], ...rows.map((row, t) => [46000 + t, ...row]).reverse()]
    expect(refusal('CORRELATION', newestFirst).sentence).toBe(
      'returns, row 41, column 3: found 12 zeros in a row at the start of “Young”, which is how blanks arrive here; ' +
        'returns for every date are needed.',
    )
  })

  it('a column of zeros throughout is a riskless position', () => {
    const rows = history(0, 'start').map(([r]) => [r, 0])
    expectClose(call('CONTRIBUTION', half, rows), [call('VOLATILITY', half, rows) as number, 0])
  })

  it('a column that BREAKDOWN does not use may hold them', () => {
    const risk = [['Old', 'Young'], ...history(20, 'start')]
    expect(call('BREAKDOWN', 'Old', 1, risk)).toHaveLength(3)
    expect(refusal('BREAKDOWN', 'Young', 1, risk).code).toBe('missing-data')
  })
})

describe('a portfolio without risk', () => {
  const none = [[0], [0]]

  it('has volatility and contributions of 0', () => {
    expect(call('VOLATILITY', none, C)).toBe(0)
    expect(call('CONTRIBUTION', none, C)).toEqual([[0], [0]])
    expect(
      call(
        'VOLATILITY',
        [[1], [-1]],
        R.map(([r]) => [r, r]),
      ),
    ).toBe(0)
  })

  it.each(['MARGINAL', 'RISKSHARE', 'BETA', 'DIVERSIFICATION', 'EFFECTIVE'])(
    '%s has nothing to divide by',
    (id) => {
      expect(refusal(id, none, C)).toEqual({
        code: 'zero-risk',
        sentence: 'risk: found a portfolio without risk; a volatility above 0 is needed to divide by.',
      })
    },
  )

  it('its tables say what is not defined', () => {
    expect((call('BREAKDOWN', [['A'], ['B']], none, C) as unknown[][]).slice(1)).toEqual([
      ['A', 0, 0, 'not defined', 0, 'not defined', 'not defined', 'not defined'],
      ['B', 0, 0, 'not defined', 0, 'not defined', 'not defined', 'not defined'],
      ['Total', 0, 0, '', 0, 'not defined', '', ''],
    ])
    expect((call('GROUPED', [['A'], ['B']], none, C) as unknown[][])[3]).toEqual([
      'Total',
      0,
      0,
      0,
      'not defined',
    ])
  })
})

describe('labels of groups', () => {
  const labels = (groups: unknown) =>
    (
      call(
        'GROUPED',
        groups,
        [[0.4, 0.3, 0.3]],
        [
          [0.04, 0, 0],
          [0, 0.01, 0],
          [0, 0, 0.02],
        ],
      ) as unknown[][]
    ).map((row) => row[0])

  it.each([
    ['of the web', null],
    ['of the desktop', 0],
    ['of text', ''],
  ])('a blank %s stands for no group', (_, blank) => {
    expect(labels([['A'], [blank], [blank]])).toEqual(['Group', 'A', 'Unassigned', 'Total'])
  })

  it('numbers may be groups, 0 among them', () => {
    expect(labels([[2, 0, 2]])).toEqual(['Group', '2', '0', 'Total'])
  })
})

it('errors that are no Fault are not swallowed', () => {
  expect(() =>
    attempt(() => {
      throw new RangeError('a mistake')
    }),
  ).toThrow(RangeError)
})

it('a sentence takes the address of the cell where the pane knows it', () => {
  const fault = new Fault('text', 'found “abc”', 'a number is needed', {
    argument: 'weights',
    row: 2,
    column: 0,
  })
  expect(explain(fault, ({ row }) => `Book!B${row! + 5}`)).toBe('Book!B7: found “abc”; a number is needed.')
  expect(explain(fault, () => null)).toBe('weights, row 3, column 1: found “abc”; a number is needed.')
  expect(explain(new Fault('host', 'the host gave up', 'another try is needed'))).toBe(
    'The host gave up; another try is needed.',
  )

  const numerical = new Fault('too-few', 'returns: 1 date', 'at least 2 dates are needed', {
    argument: 'returns',
  })
  expect(explain(numerical)).toBe('returns: 1 date; at least 2 dates are needed.')
})

import {
  annualise,
  decompose,
  Fault,
  groupDecomposition,
  logReturns,
  matrixModel,
  returnsModel,
  simpleReturns,
} from '../../../src/core'
import { faultOf } from '../../fault-of'

const model = matrixModel(Float64Array.of(0.04, 0, 0, 0.01), 2)
const split = decompose(model, Float64Array.of(0.5, 0.5))

const cases: [string, () => unknown, Partial<Fault>][] = [
  [
    'too few numbers for the shape',
    () => returnsModel(Float64Array.of(1, 2, 3), 2, 2),
    {
      code: 'shape',
      message: 'returns: 3 numbers; 2 rows of 2 are needed (4 numbers)',
      where: { argument: 'returns' },
    },
  ],
  [
    'a shape without columns',
    () => returnsModel(Float64Array.of(), 2, 0),
    { code: 'shape', found: 'returns: 2 rows and 0 columns' },
  ],
  [
    'NaN in the returns, with its row and column',
    () => returnsModel(Float64Array.of(1, 2, 3, NaN, 5, 6), 3, 2),
    { code: 'not-a-number', found: 'returns: NaN', where: { argument: 'returns', row: 1, column: 1 } },
  ],
  [
    'an infinite return',
    () => returnsModel(Float64Array.of(1, -Infinity), 2, 1),
    { code: 'not-a-number', found: 'returns: -Infinity', where: { argument: 'returns', row: 1, column: 0 } },
  ],
  [
    'a single date',
    () => returnsModel(Float64Array.of(1, 2), 1, 2),
    { code: 'too-few', found: 'returns: 1 date' },
  ],
  ...[0, 1, -0.5, 1.5, NaN].map((decay): (typeof cases)[number] => [
    `a decay factor of ${decay}`,
    () => returnsModel(Float64Array.of(1, 2), 2, 1, { kind: 'exponential', decay }),
    { code: 'out-of-range', found: `decay factor ${decay}`, where: { argument: 'decay' } },
  ]),
  [
    'weights of another number than positions',
    () => decompose(model, Float64Array.of(1, 2, 3)),
    { code: 'shape', message: 'weights: 3 numbers; 2 are needed, one for each position' },
  ],
  [
    'a weight that is not a number',
    () => decompose(model, Float64Array.of(1, NaN)),
    { code: 'not-a-number', where: { argument: 'weights', row: 1, column: 0 } },
  ],
  [
    'a weight that is not a number, for a model of returns',
    () => returnsModel(Float64Array.of(1, 2), 2, 1).portfolioReturns(Float64Array.of(NaN)),
    { code: 'not-a-number', where: { argument: 'weights', row: 0, column: 0 } },
  ],
  [
    'numbers of dates of which there is one too few',
    () => returnsModel(Float64Array.of(1, 2), 2, 1).weigh(Float64Array.of(1)),
    { code: 'shape', found: 'numbers of dates: 1 numbers' },
  ],
  [
    'a number of a date that is not a number',
    () => returnsModel(Float64Array.of(1, 2), 2, 1).squares(Float64Array.of(1, 2), Float64Array.of(1, NaN)),
    { code: 'not-a-number', found: 'numbers of dates: NaN' },
  ],
  [
    'an asymmetric matrix, naming the pair',
    () => matrixModel(Float64Array.of(0.04, 0.01, 0.011, 0.09), 2),
    {
      code: 'not-symmetric',
      found: 'risk: 0.011 below the diagonal but 0.01 above it',
      where: { argument: 'risk', row: 1, column: 0 },
    },
  ],
  [
    'a covariance with a riskless position on one side only',
    () => matrixModel(Float64Array.of(0, 1e-9, 0, 0.09), 2),
    { code: 'not-symmetric' },
  ],
  [
    'a negative variance on the diagonal',
    () => matrixModel(Float64Array.of(0.04, 0, 0, -0.01), 2),
    { code: 'negative-variance', where: { argument: 'risk', row: 1, column: 1 } },
  ],
  [
    'weights that meet a negative eigenvalue',
    // eigenvalue 0.04 - 0.05 along (1, -1): variance -0.02
    () => decompose(matrixModel(Float64Array.of(0.04, 0.05, 0.05, 0.04), 2), Float64Array.of(1, -1)),
    { code: 'negative-variance', found: 'risk: these weights would have a variance of -0.0200' },
  ],
  [
    'figures too large to be squared',
    () => decompose(returnsModel(Float64Array.of(1e200, -1e200), 2, 1), Float64Array.of(1)),
    { code: 'out-of-range' },
  ],
  ...[0, -12, NaN, Infinity].map((periods): (typeof cases)[number] => [
    `${periods} periods per year`,
    () => annualise(split, periods),
    { code: 'out-of-range', found: `periods per year: ${periods}`, where: { argument: 'periods_per_year' } },
  ]),
  [
    'a group number beyond the groups',
    () => groupDecomposition(model, split, Int32Array.of(0, 2), 2),
    { code: 'out-of-range', found: 'groups: number 2', where: { argument: 'groups', row: 1 } },
  ],
  [
    'a position without a group',
    () => groupDecomposition(model, split, Int32Array.of(-1, 0), 2),
    { code: 'out-of-range', where: { argument: 'groups', row: 0 } },
  ],
  [
    'groups of another number than positions',
    () => groupDecomposition(model, split, Int32Array.of(0), 1),
    { code: 'shape', where: { argument: 'groups' } },
  ],
  [
    'a decomposition of another model',
    () => groupDecomposition(matrixModel(Float64Array.of(1), 1), split, Int32Array.of(0), 1),
    { code: 'shape', where: { argument: 'weights' } },
  ],
  [
    'a price of zero, with its row and column',
    () => simpleReturns(Float64Array.of(1, 2, 3, 0), 2, 2),
    { code: 'out-of-range', found: 'prices: 0', where: { argument: 'prices', row: 1, column: 1 } },
  ],
  [
    'a negative price',
    () => logReturns(Float64Array.of(1, -2), 2, 1),
    { code: 'out-of-range', found: 'prices: -2' },
  ],
  ['a single date of prices', () => logReturns(Float64Array.of(1, 2), 1, 2), { code: 'too-few' }],
]

describe('a fault is raised for', () => {
  it.each(cases)('%s', (_name, work, expected) => {
    expect(faultOf(work)).toMatchObject(expected)
  })

  it('nothing that is merely unusual: shorts, leverage, no weights at all', () => {
    expect(decompose(model, Float64Array.of(-3, 7)).volatility).toBeGreaterThan(0)
    expect(decompose(model, Float64Array.of(0, 0)).volatility).toBe(0)
  })
})

describe('a fault', () => {
  it('says what was found, then what is needed', () => {
    const fault = new Fault(
      'unmatched',
      'Holdings!A4: no returns for "Larch"',
      'a column of that name is needed',
    )
    expect(fault.message).toBe('Holdings!A4: no returns for "Larch"; a column of that name is needed')
    expect(fault).toBeInstanceOf(Error)
    expect(fault.name).toBe('Fault')
    expect(fault.where).toEqual({})
  })
})

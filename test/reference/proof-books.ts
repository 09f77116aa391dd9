/**
 * Books as users have them, for the proof: every estimator, every way a block may lie, and the sets that were computed elsewhere or printed in
 * books. The data of the awkward ones come from the integer generator described in data/lcg60.json and stand for nothing.
 */
import type { CellValue } from '../../src/sheet/cells'
import type { EstimatorChoice, Settings, TailChoice } from '../../src/sheet/settings'
import type { BookCells } from '../recalculation'
import { generatedReturns, readCsv, readJson } from './data'

type Row = readonly CellValue[]

const NAMES = ['Alder', 'Beech', 'Cedar', 'Dogwood', 'Elm', 'Fir', 'Gorse', 'Hazel']
const LONG = [0.35, 0.1, 0.25, 0.2, 0.1]
const LONG_SHORT = [0.9, -0.4, 0.7, -0.35, 0.05]
/** a Friday in 2020 */
const FIRST_DAY = 43833

const holdingsOf = (weights: readonly CellValue[], names: readonly string[] = NAMES): Row[] => [
  ['Holding', 'Weight'],
  ...weights.map((weight, i) => [names[i] ?? `Tree ${i + 1}`, weight]),
]

/** Weekly returns with their dates, oldest first. */
function weekly(names: readonly string[], weeks: number, seed = 20240601): Row[] {
  const n = names.length
  const { returns } = generatedReturns(seed, n, weeks)
  return [
    ['Date', ...names],
    ...Array.from({ length: weeks }, (_, t) => [FIRST_DAY + 7 * t, ...returns.subarray(t * n, t * n + n)]),
  ]
}

const five = NAMES.slice(0, 5)
const FIVE = weekly(five, 120)

const turned = (rows: readonly Row[]): Row[] =>
  (rows[0] ?? []).map((_, column) => rows.map((row) => row[column] ?? ''))
const newestFirst = ([head = [], ...rows]: readonly Row[]): Row[] => [head, ...rows.reverse()]
/** Rows of which every twentieth stands after the two that follow it. */
const outOfOrder = ([head = [], ...rows]: readonly Row[]): Row[] => [
  head,
  ...rows.map((row, k) => (k % 20 < 3 ? (rows[k - (k % 20) + (((k % 20) + 1) % 3)] ?? row) : row)),
]
const without = (rows: readonly Row[], gaps: readonly (readonly [number, number])[]): Row[] =>
  rows.map((row, r) => row.map((value, c) => (gaps.some(([a, b]) => a === r && b === c) ? '' : value)))
const columns = (rows: readonly Row[], order: readonly number[]): Row[] =>
  rows.map((row) => order.map((column) => row[column] ?? ''))
/** Levels that the returns lead to, from 100 on. */
function levels([head = [], ...rows]: readonly Row[]): Row[] {
  let now = head.slice(1).map(() => 100)
  const first = [FIRST_DAY - 7, ...now]
  return [
    head,
    first,
    ...rows.map(([day = '', ...moves]) => {
      now = now.map((level, i) => level * (1 + Number(moves[i])))
      return [day, ...now]
    }),
  ]
}

const estimators: readonly (readonly [string, EstimatorChoice])[] = [
  ['sample', { kind: 'sample' }],
  ['decay 0.94', { kind: 'exponential', decay: 0.94 }],
  ['decay 0.99', { kind: 'exponential', decay: 0.99 }],
  ['identity', { kind: 'shrinkage', target: 'identity' }],
  ['correlation', { kind: 'shrinkage', target: 'correlation' }],
  ['oas', { kind: 'shrinkage', target: 'oas' }],
  ['lag 1', { kind: 'lagged', lags: 1 }],
  ['lag 5', { kind: 'lagged', lags: 5 }],
]

const tails: readonly (readonly [string, TailChoice])[] = [
  ['historical 95', { method: { kind: 'historical' }, confidence: 0.95, periods: 1 }],
  ['historical 97.5', { method: { kind: 'historical' }, confidence: 0.975, periods: 1 }],
  ['normal 99', { method: { kind: 'normal' }, confidence: 0.99, periods: 10 }],
  ['student', { method: { kind: 'student', degrees: null }, confidence: 0.99, periods: 1 }],
  ['student 5', { method: { kind: 'student', degrees: 5 }, confidence: 0.975, periods: 2 }],
  ['student 4.3', { method: { kind: 'student', degrees: 4.3 }, confidence: 0.99, periods: 1 }],
  ['cornish-fisher', { method: { kind: 'cornish-fisher' }, confidence: 0.99, periods: 1 }],
]

const COVARIANCE: readonly (readonly number[])[] = [
  [0.04, 0.006, -0.003],
  [0.006, 0.0225, 0.0045],
  [-0.003, 0.0045, 0.01],
]

/** Books that lie as books may lie. */
export function awkwardBooks(): BookCells[] {
  const book = (name: string, holdings: Row[], returns: Row[], settings?: Partial<Settings>): BookCells => ({
    name,
    holdings,
    returns,
    ...(settings && { settings }),
  })
  const eight = weekly(NAMES, 90)
  const series = eight.map((row) => row.slice(0, 6))
  return [
    ...estimators.flatMap(([name, estimator]) => [
      book(`long ${name}`, holdingsOf(LONG), FIVE, { estimator }),
      book(`short ${name}`, holdingsOf(LONG_SHORT), newestFirst(FIVE), { estimator }),
    ]),
    ...tails.flatMap(([name, choice]) => [
      book(`tail ${name}`, holdingsOf(LONG), FIVE, { tails: choice }),
      book(`tails ${name}`, holdingsOf(LONG_SHORT), FIVE, {
        tails: choice,
        estimator: { kind: 'exponential', decay: 0.97 },
      }),
    ]),

    // where the weights come from
    book(
      "O'Hara's",
      [['Name', 'Market value'], ...LONG.map((weight, i) => [five[i] ?? '', 2e6 * weight])],
      FIVE,
    ),
    book(
      'Capital',
      [['Name', 'Amount'], ...LONG_SHORT.map((weight, i) => [five[i] ?? '', 1e6 * weight])],
      FIVE,
      { capital: 1.25e6 },
    ),
    book('Text weights', holdingsOf(['35 %', '10%', '0.25', 0.2, '10.0%']), FIVE),
    book(
      'Exposures',
      [
        ['Name', 'Market value', 'Exposure'],
        ...LONG.map((weight, i) => [five[i] ?? '', 1e6 * weight, i === 2 ? -3e5 : '']),
      ],
      FIVE,
    ),
    book(
      'Total row',
      [...holdingsOf([0.35, 0.1]), ['', ''], ['Cedar', 0.25], ['Dogwood', 0.2], ['Elm', 0.1], ['Total', 1]],
      FIVE,
    ),
    book('Other order', holdingsOf([0.2, 0.3, 0.5], ['Elm', 'Alder', 'Cedar']), FIVE),
    book('Case', holdingsOf([0.5, 0.5], ['ALDER', ' beech ']), FIVE),
    book('Zero weight', holdingsOf([0.5, 0, 0.5, 0, 0]), FIVE),
    book('Riskless', holdingsOf([0.5, 0.3, 0.2], ['Alder', 'Beech', 'Cash']), FIVE, { riskless: ['Cash'] }),
    book('One', holdingsOf([1.3]), FIVE),

    // how the returns lie
    book('Dates across', holdingsOf(LONG), turned(FIVE)),
    book('Across, newest', holdingsOf(LONG_SHORT), turned(newestFirst(FIVE)), {
      estimator: { kind: 'exponential', decay: 0.95 },
    }),
    book('Unsorted', holdingsOf(LONG), outOfOrder(FIVE), { estimator: { kind: 'lagged', lags: 2 } }),
    book('No dates', holdingsOf(LONG), columns(FIVE, [1, 2, 3, 4, 5]), { periodsPerYear: 52 }),
    book('No names', holdingsOf(LONG), columns(FIVE, [1, 2, 3, 4, 5]).slice(1), { periodsPerYear: 12 }),
    book('Prices', holdingsOf(LONG), levels(FIVE)),
    book('Prices, log', holdingsOf(LONG_SHORT), levels(FIVE), { returnKind: 'log' }),
    book('Prices across', holdingsOf(LONG), turned(newestFirst(levels(FIVE))), {
      estimator: { kind: 'shrinkage', target: 'identity' },
    }),
    book('Gaps', holdingsOf(LONG), without(FIVE, [[4, 2], [5, 2], [60, 4], [120, 1]])), // prettier-ignore
    book('Gaps elsewhere', holdingsOf(LONG.slice(0, 3)), without(FIVE, [[4, 5], [7, 5], [9, 2]]), {
      estimator: { kind: 'exponential', decay: 0.94 },
    }), // prettier-ignore
    book('Gaps, lags', holdingsOf(LONG), without(FIVE, [[30, 2], [31, 2]]), {
      estimator: { kind: 'lagged', lags: 3 },
    }), // prettier-ignore
    book('Gap in prices', holdingsOf(LONG), without(levels(FIVE), [[30, 2], [80, 5]])), // prettier-ignore
    book('Last dates', holdingsOf(LONG), newestFirst(FIVE), { lookBack: { kind: 'last', dates: 52 } }),
    book('Since', holdingsOf(LONG), FIVE, {
      lookBack: { kind: 'since', date: FIRST_DAY + 7 * 40 },
      estimator: { kind: 'shrinkage', target: 'correlation' },
    }),
    book('Text returns', holdingsOf(LONG), FIVE.map((row, r) => row.map((v, c) => (r % 17 === 3 && c === 2 ? `${(100 * Number(v)).toFixed(4)}%` : v)))), // prettier-ignore
    book('Titles', holdingsOf(LONG), [
      ['Weekly returns', '', '', '', '', ''],
      ['', '', '', '', '', ''],
      ...FIVE,
    ]),
    book('Few dates', holdingsOf(LONG), FIVE.slice(0, 5)),
    book(
      'Still',
      holdingsOf([0.5, 0.3, 0.2], ['Alder', 'Beech', 'Cedar']),
      FIVE.map((row, r) => row.map((v, c) => (c === 3 && r > 0 ? 0.001 : v))),
      { estimator: { kind: 'shrinkage', target: 'identity' } },
    ),
    book('Daily', holdingsOf(LONG), FIVE.map(([day = '', ...row], r) => [r === 0 ? day : FIRST_DAY + r + 2 * Math.floor(r / 5), ...row])), // prettier-ignore

    // groups, benchmark
    book(
      'Groups',
      [
        ['Name', 'Class', 'Region', 'Weight', 'Benchmark weight'],
        ...[...LONG, -0.15, 0.1, 0.05].map((weight, i) => [
          NAMES[i] ?? '',
          ['Leaf', 'Needle', ''][i % 3] ?? '',
          i < 4 ? 'North, "far"' : 'South',
          weight,
          [0.2, 0.2, 0.2, 0.1, 0.1, 0.1, 0.1, ''][i] ?? '',
        ]),
      ],
      eight,
    ),
    book(
      'Groups shrunk',
      [
        ['Name', 'Class', 'Weight'],
        ...LONG_SHORT.map((weight, i) => [five[i] ?? '', i < 2 ? 'Leaf' : 'Needle', weight]),
      ],
      FIVE,
      { estimator: { kind: 'shrinkage', target: 'correlation' } },
    ),
    book(
      'Groups lagged',
      [
        ['Name', 'Class', 'Weight', 'Benchmark weight'],
        ...LONG_SHORT.map((weight, i) => [five[i] ?? '', i < 2 ? 'Leaf' : 'Needle', weight, 0.2]),
      ],
      FIVE,
      { estimator: { kind: 'lagged', lags: 2 } },
    ),
    book('Series benchmark', holdingsOf(LONG.slice(0, 4)), FIVE, {
      benchmark: { kind: 'series', name: 'Elm' },
    }),
    book('Hardly any risk', holdingsOf([1, -1], ['Alder', 'Twin']), [
      ['Date', 'Alder', 'Twin'],
      ...series.slice(1).map(([day = '', a = 0], k) => [day, a, Number(a) + 1e-6 * ((k * 7) % 5)]),
    ]),

    // a covariance matrix
    book('Matrix', holdingsOf([0.5, 0.3, 0.2]), [...COVARIANCE], { periodsPerYear: 1 }),
    book(
      'Matrix, names',
      holdingsOf([0.2, -0.5, 0.8], ['Cedar', 'Alder', 'Beech']),
      [
        ['', 'Alder', 'Beech', 'Cedar'],
        ...COVARIANCE.map((row, i) => [NAMES[i] ?? '', ...row.map((c) => c / 52)]),
      ],
      { periodsPerYear: 52, tails: { method: { kind: 'normal' }, confidence: 0.99, periods: 4 } },
    ),
    book(
      'Matrix, groups',
      [
        ['Name', 'Class', 'Weight', 'Benchmark weight'],
        ['Cedar', 'X', 0.2, 0.3],
        ['Alder', 'Y', 0.5, 0.4],
        ['Cash', '', 0.3, 0.3],
      ],
      [['Alder', 'Beech', 'Cedar'], ...COVARIANCE],
      {
        riskless: ['Cash'],
        tails: { method: { kind: 'student', degrees: 5 }, confidence: 0.99, periods: 1 },
      },
    ),
  ]
}

/** Books whose covariances the sheet takes over as constants, and must say so: what follows from them is recomputed all the same. */
export function takenOverBooks(): BookCells[] {
  const gaps = without(FIVE, [[4, 2], [5, 2], [60, 4], [120, 1]]) // prettier-ignore
  const late = FIVE.map((row, r) => row.map((value, c) => (c === 5 && r > 0 && r < 50 ? '' : value)))
  return [
    {
      name: 'Own overlap',
      holdings: holdingsOf(LONG_SHORT),
      returns: gaps,
      settings: { gaps: 'own overlap' },
    },
    { name: 'Completed', holdings: holdingsOf(LONG), returns: late, settings: { gaps: 'completed' } },
    {
      name: 'Factors',
      holdings: holdingsOf(LONG_SHORT),
      returns: FIVE,
      factors: weekly(['Market', 'Rates'], 120, 7),
      settings: { estimator: { kind: 'factors' } },
    },
  ]
}

// ---- figures from elsewhere

/** A figure of someone else's, by the name it has in `Figures`. */
export type Expected = { readonly [figure: string]: number | readonly number[] }

export interface ReferenceBook {
  readonly book: BookCells
  readonly expected: Expected
  /** relative to the largest entry, or absolute where the source prints so many digits */
  readonly tolerance: number | { readonly [figure: string]: number }
  readonly source: string
}

interface ComputedSet {
  readonly about: {
    readonly weights: Record<'long' | 'longshort', number[]>
    readonly groups: string[]
    readonly benchmark: number[]
    readonly generator?: { readonly seed: number; readonly n: number; readonly T: number }
  }
  readonly portfolios: Record<
    'long' | 'longshort',
    {
      readonly decomposition: Record<string, { readonly value: number & number[] }>
      readonly by_estimator: Record<string, { readonly value: number & number[] }>
      readonly groups: Record<string, { readonly value: number[] }>
      readonly active: Record<string, { readonly value: number & number[] }>
      readonly var_es: Record<string, Record<string, { readonly value: number & number[] }>>
    }
  >
}

/** Which cases are tried: hundreds of dates take an engine a while, and each kind of figure is there once or twice. */
const TRIED: Record<string, readonly string[]> = {
  'eu_s long': [],
  'eu_s short': ['hist'],
  'eu_l long': ['correlation'],
  'eu_l short': [],
  'lcg6 long': ['hist', 'normal', 'student', 'moments'],
  'lcg6 short': ['hist', 'decay', 'identity', 'correlation'],
}

/** The sets computed with numpy 1.24.2, scipy 1.10.1, scikit-learn 1.2.1 and a second time with R 4.2.2 (README.md beside this file). */
export function computedBooks(): ReferenceBook[] {
  return ['eu_simple.json', 'eu_log.json', 'lcg60.json'].flatMap((file) => {
    const set = readJson<ComputedSet>(file)
    const short = file.slice(0, 4)
    const { about } = set
    const { names, returns, settings } = dataOf(file, about)
    return (['long', 'longshort'] as const).flatMap((kind) => {
      const p = set.portfolios[kind]
      const place = `${short} ${kind === 'long' ? 'long' : 'short'}`
      /** the case with groups and a benchmark */
      const whole = place === 'lcg6 short' ? 'hist' : null
      const cells = (name: string, more: Partial<Settings> = {}): BookCells => ({
        name: `${place} ${name}`,
        data: short,
        holdings: [
          ['Name', 'Weight', ...(name === whole ? ['Class', 'Benchmark weight'] : [])],
          ...about.weights[kind].map((w, i) => [
            names[i] ?? '',
            w,
            ...(name === whole ? [about.groups[i] ?? '', about.benchmark[i] ?? 0] : []),
          ]),
        ],
        returns,
        settings: { periodsPerYear: 1, ...settings, ...more },
      })
      const byGroup = [...new Set(about.groups)].map((label) =>
        [...new Set(about.groups)].sort().indexOf(label),
      )
      const inOrder = (values: readonly number[]): number[] => byGroup.map((k) => values[k] ?? NaN)
      const d = p.decomposition
      const tail = p.var_es['0.99'] ?? {}
      const source = `${file}: numpy 1.24.2, scipy 1.10.1, scikit-learn 1.2.1; R 4.2.2`
      const of = (figure: string): number & number[] => d[figure]?.value ?? (NaN as number & number[])
      const tailOf = (figure: string): number & number[] => tail[figure]?.value ?? (NaN as number & number[])
      const under = (named: string, name: string, estimator: EstimatorChoice): ReferenceBook[] => {
        const volatility = p.by_estimator[`vol__${name}`]
        const contribution = p.by_estimator[`rc__${name}`]
        if (!volatility || !contribution) return []
        return [
          {
            book: cells(named, { estimator }),
            expected: { volatility: volatility.value, contribution: contribution.value },
            tolerance: 1e-10,
            source,
          },
        ]
      }
      const all: ReferenceBook[] = [
        {
          book: cells('hist', { tails: { method: { kind: 'historical' }, confidence: 0.99, periods: 1 } }),
          expected: {
            volatility: of('vol'),
            marginal: of('marginal'),
            contribution: of('rc'),
            share: of('pct'),
            beta: of('beta_to_portfolio'),
            standAlone: of('standalone'),
            ...(whole !== null && {
              groupContribution: inOrder(p.groups['group_rc']?.value ?? []),
              groupShare: inOrder(p.groups['group_pct']?.value ?? []),
              groupStandAlone: inOrder(p.groups['group_standalone']?.value ?? []),
              trackingError: p.active['tracking_error']?.value ?? NaN,
              trackingErrorParts: p.active['active_rc']?.value ?? NaN,
            }),
            valueAtRisk: tailOf('hist_var_sort_ceil'),
            shortfall: tailOf('hist_es_AT'),
            shortfallParts: tailOf('hist_es_AT_comp'),
          },
          tolerance: 1e-10,
          source,
        },
        {
          book: cells('normal', {
            periodsPerYear: 252,
            tails: { method: { kind: 'normal' }, confidence: 0.99, periods: 1 },
          }),
          expected: {
            volatility: of('vol_ann252'),
            contribution: of('rc_ann252'),
            valueAtRisk: tailOf('normal_var_zero_mean'),
            shortfall: tailOf('normal_es_zero_mean'),
          },
          tolerance: 1e-10,
          source,
        },
        {
          book: cells('student', {
            tails: { method: { kind: 'student', degrees: 5 }, confidence: 0.99, periods: 1 },
          }),
          // theirs take off the mean, which ours takes as 0: the multiples of the volatility are the same
          expected: {
            valueAtRisk: tailOf('t_fixed_kvar') * of('vol'),
            shortfall: tailOf('t_fixed_kes') * of('vol'),
          },
          tolerance: 1e-10,
          source,
        },
        {
          book: cells('moments', {
            tails: { method: { kind: 'cornish-fisher' }, confidence: 0.99, periods: 1 },
          }),
          expected: { valueAtRisk: -tailOf('cf_z') * of('vol') },
          tolerance: 1e-10,
          source,
        },
        ...under('decay', 'ewma_0.94_demeaned_ml', { kind: 'exponential', decay: 0.94 }),
        ...under('identity', 'lw_identity_cov', { kind: 'shrinkage', target: 'identity' }),
        ...under('correlation', 'lw_constcorr_cov', { kind: 'shrinkage', target: 'correlation' }),
      ]
      return all.filter(({ book }) => TRIED[place]?.includes(book.name.slice(place.length + 1)))
    })
  })
}

function dataOf(
  file: string,
  { generator }: ComputedSet['about'],
): { names: string[]; returns: Row[]; settings: Partial<Settings> } {
  if (generator) {
    const { seed, n, T } = generator
    const { returns } = generatedReturns(seed, n, T)
    const names = Array.from({ length: n }, (_, i) => `Asset ${i + 1}`)
    return {
      names,
      returns: [names, ...Array.from({ length: T }, (_, t) => [...returns.subarray(t * n, t * n + n)])],
      settings: {},
    }
  }
  const { names, rows } = readCsv('eustockmarkets_close.csv')
  const first = names.indexOf('DAX')
  return {
    names: names.slice(first, first + 4),
    returns: [names.slice(first, first + 4), ...rows.map((row) => row.slice(first, first + 4))],
    settings: { content: 'prices', returnKind: file.includes('log') ? 'log' : 'simple' },
  }
}

interface Printed {
  readonly id: string
  readonly citation: string
  readonly status: 'read' | 'memory'
  readonly inputs: {
    readonly weights?: number[]
    readonly values?: number[]
    readonly vol?: number[]
    readonly corr?: number[][]
    readonly confidence?: number
  }
  readonly outputs: Record<string, number | number[]>
  readonly tolerance: Record<string, number>
}

/** What the printed examples call their figures, and in which unit they print them. */
const PRINTED: Record<string, Record<string, readonly [figure: string, unit: number]>> = {
  'roncalli-t2.2-vol': { risk: ['volatility', 100], marginal: ['marginal', 100], contribution: ['contribution', 100], percent: ['share', 100] },
  'roncalli-es-derived': { risk: ['shortfall', 100], contribution: ['shortfallParts', 100] },
  'mrt-ew': { risk: ['volatility', 1], percent: ['share', 1], marginal: ['marginal', 1], contribution: ['contribution', 1] },
  'qian-6040': { percent: ['share', 1], risk: ['volatility', 1] },
  'tasche-inequalities': { euler: ['contribution', 1], standAlone: ['standAlone', 1] },
  'menchero-davis-identity': { product: ['contribution', 1] },
  'negative-contribution': { risk: ['volatility', 1], contribution: ['contribution', 1], share: ['share', 1] },
  // amounts of money: figures of the book are fractions of their sum
  'jorion-2ccy-printed': { portfolioStdDev: ['volatility', 3e6], marginalVaR: ['marginal', 1.65], componentVaR: ['contribution', 1.65 * 3e6], percent: ['share', 1] },
  'jorion-2ccy-exact-z': { portfolioVaR: ['valueAtRisk', 3000] },
  'frm-50-50-individual': { portfolioVol: ['volatility', 1], portfolioVaR: ['valueAtRisk', 100] },
} // prettier-ignore

/** The published worked examples that give weights and a covariance matrix. */
export function publishedBooks(): ReferenceBook[] {
  const { checks } = readJson<{ readonly checks: readonly Printed[] }>('published.json')
  return checks.flatMap(({ id, citation, status, inputs, outputs, tolerance }) => {
    const told = PRINTED[id]
    const { weights, values, vol = [], corr = [], confidence } = inputs
    if (!told) return []
    const names = vol.map((_, i) => NAMES[i] ?? '')
    const figures = Object.entries(told)
    return [
      {
        book: {
          name: id,
          holdings: [
            ['Name', values ? 'Amount' : 'Weight'],
            ...(values ?? weights ?? []).map((weight, i) => [names[i] ?? '', weight]),
          ],
          returns: [names, ...vol.map((a, i) => vol.map((b, j) => a * b * (corr[i]?.[j] ?? NaN)))],
          settings: {
            content: 'covariance' as const,
            periodsPerYear: 1,
            tails: { method: { kind: 'normal' as const }, confidence: confidence ?? 0.95, periods: 1 },
          },
        },
        expected: Object.fromEntries(
          figures.map(([printed, [figure, unit]]) => {
            const value = outputs[printed] ?? NaN
            return [figure, typeof value === 'number' ? value / unit : value.map((one) => one / unit)]
          }),
        ),
        tolerance: Object.fromEntries(
          figures.map(([printed, [figure, unit]]) => [figure, ((tolerance[printed] ?? 0) + 1e-12) / unit]),
        ),
        source: `${citation} (${status})`,
      },
    ]
  })
}

/** A book of any size, long and short. */
export function largeBook(size: number, dates: number): BookCells {
  const names = Array.from({ length: size }, (_, i) => `Tree ${i + 1}`)
  return {
    name: `Book of ${size}`,
    holdings: [
      ['Holding', 'Class', 'Weight', 'Benchmark weight'],
      ...names.map((name, i) => [
        name,
        `Class ${1 + (i % 7)}`,
        (3 + (i % 11) - (i % 5 === 0 ? 9 : 0)) / (6 * size),
        1 / size,
      ]),
    ],
    returns: weekly(names, dates),
  }
}

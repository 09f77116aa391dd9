import { backtestGiven, BOOTSTRAP_GENERATOR, Fault } from '../core'
import type { Backtest, BootstrapChoice, BootstrapResult, Decomposition } from '../core'
import type { Bands } from './bands'
import type { BookModel } from './book-model'
import type { Calculator, Work } from './calculator'
import type { ReturnsReading } from './returns'
import { estimatorText } from './setting-lines'
import type { Settings } from './settings'
import { confidenceText, countOf, numberText, percentText, quote } from './wording'

/** Long computations a user asks for: they stand beside the figures they belong to and go with them. */
export interface Studies {
  readonly bootstrap: ErrorStudy | null
  readonly backtest: BacktestStudy | null
  /** which of them were there and went because the figures changed */
  readonly outdated: { readonly bootstrap: boolean; readonly backtest: boolean }
}

export const NO_STUDIES: Studies = {
  bootstrap: null,
  backtest: null,
  outdated: { bootstrap: false, backtest: false },
}

/** What is left once the figures have changed: forecasts made elsewhere, which do not rest on them, and the word that there was more. */
export function afterChange({ bootstrap, backtest, outdated }: Studies): Studies {
  const elsewhere = backtest?.of === 'selection' ? backtest : null
  return {
    bootstrap: null,
    backtest: elsewhere,
    outdated: {
      bootstrap: outdated.bootstrap || bootstrap !== null,
      backtest: elsewhere === null && (outdated.backtest || backtest !== null),
    },
  }
}

/** The errors of the figures found by drawing dates anew, beside those in closed form. */
export interface ErrorStudy {
  /** volatility and contributions scaled as the other figures are */
  readonly result: BootstrapResult
  /** how it was done, so that it can be done again */
  readonly method: string
  /** how well it agrees with the closed form, or why nothing can be compared */
  readonly agreement: string
}

/** What a back-test may be asked. */
export interface BacktestChoice {
  /** dates each forecast looks back on; null: all before it */
  readonly window: number | null
  readonly confidence: number
  readonly method: 'normal' | 'historical'
}

/** Forecasts against what happened, with what the tests say in plain words. */
export interface BacktestStudy {
  /** whose forecasts: of this book's own past, or made elsewhere and selected */
  readonly of: 'this book' | 'selection'
  readonly result: Backtest
  /** serial numbers of the dates forecast, one for each entry of the result; null where there are none */
  readonly dates: readonly number[] | null
  /** what was forecast how */
  readonly method: string
  /** label, figure, and the sentence that says what it means */
  readonly lines: readonly (readonly [label: string, figure: string, meaning: string])[]
}

/** Blocks a history must hold for drawing them anew to say much. Our own convention. */
const FEWEST_BLOCKS = 5

/**
 * Draws the history anew and compares the errors with the closed form.
 *
 * @throws Fault "missing-data" where the model does not rest on common dates; those of the bootstrap; "cancelled"
 */
export async function bootstrapStudy(
  book: BookModel,
  d: Decomposition,
  bands: Bands | string,
  choice: BootstrapChoice,
  calculator: Calculator,
  work: Work,
): Promise<ErrorStudy> {
  const { data, precision } = book
  if (data === null || typeof precision === 'string')
    throw new Fault(
      'missing-data',
      'the figures do not rest on returns common to all holdings',
      'choose the dates common to all holdings',
      { argument: 'study' },
    )
  const result = await calculator.run(
    'bootstrap',
    {
      returns: data.values,
      dates: data.rows.length,
      size: data.size,
      weighting: precision.model.weighting,
      weights: d.weights,
      choice,
    },
    work,
  )
  const scale = Math.sqrt(d.periodsPerYear)
  const scaled = (values: Float64Array): Float64Array => values.map((value) => value * scale)
  const { volatility, contribution } = result
  // what is said beside the bands is that they are not those of the figures themselves
  const plain = precision.note === null && precision.lags === 0
  return {
    result: {
      ...result,
      volatility: {
        deviation: volatility.deviation * scale,
        lower: volatility.lower * scale,
        upper: volatility.upper * scale,
      },
      contribution: {
        deviation: scaled(contribution.deviation),
        lower: scaled(contribution.lower),
        upper: scaled(contribution.upper),
      },
    },
    method: `${countOf(choice.replicates, 'replication')} of ${countOf(data.rows.length, 'date')}, drawn ${choice.blockLength === 1 ? 'date by date' : `in circular blocks of ${countOf(choice.blockLength, 'date')}`} with replacement${plain ? '' : '; figures drawn are those without shrinkage, factors or lagged terms'}; ${BOOTSTRAP_GENERATOR}, seed ${choice.seed}`,
    agreement:
      data.rows.length < FEWEST_BLOCKS * choice.blockLength
        ? `No errors to go by: of blocks of ${countOf(choice.blockLength, 'date')} fewer than ${FEWEST_BLOCKS} make a history of ${data.rows.length}, and all histories are much the same. Take shorter blocks.`
        : typeof bands === 'string'
          ? bands
          : bands.volatility === 0
            ? `Standard error of the volatility: ${percentText(volatility.deviation * scale, 3)} by the bootstrap; by the closed form there is none, from ${countOf(data.rows.length, 'date')}.`
            : `Standard error of the volatility: ${percentText(volatility.deviation * scale, 3)} by the bootstrap, ${percentText(bands.volatility, 3)} in closed form (ratio ${numberText((volatility.deviation * scale) / bands.volatility, 2)}).${blocksNote(precision.lags, choice.blockLength)}`,
  }
}

/** What parts a bootstrap from the closed form where one of them looks at neighbouring dates and the other does not. */
const blocksNote = (lags: number, blockLength: number): string =>
  lags > 0 && blockLength === 1
    ? ' Dates drawn one by one know nothing of lagged terms: take blocks.'
    : lags === 0 && blockLength > 1
      ? ' Blocks keep what neighbouring dates have to do with each other; the closed form takes dates as independent, so the two part where they are not.'
      : ''

/**
 * Forecasts the past of the book at today's weights, each date from those before it, and tests the record.
 *
 * @throws Fault "missing-data", "too-few"; those of the back-test; "cancelled"
 */
export async function backtestStudy(
  book: BookModel,
  d: Decomposition,
  choice: BacktestChoice,
  settings: Pick<Settings, 'estimator'>,
  calculator: Calculator,
  work: Work,
): Promise<BacktestStudy> {
  const { data } = book
  const { estimator } = settings
  if (data === null)
    throw new Fault(
      'missing-data',
      'the figures do not rest on returns common to all holdings',
      'choose the dates common to all holdings',
      { argument: 'study' },
    )
  if (estimator.kind === 'factors')
    throw new Fault(
      'unknown-choice',
      'a factor model is not run through time',
      'choose another estimator for the back-test',
      { argument: 'study' },
    )
  const dates = data.rows.length
  // without a window the first forecast needs some dates to rest on
  const first = choice.window ?? Math.min(Math.floor(dates / 2), Math.max(20, Math.ceil(dates / 5)))
  if (dates - first < 2)
    throw new Fault(
      'too-few',
      `found ${countOf(dates, 'date')} for a window of ${first}`,
      'at least 2 dates more than the window are needed',
      { argument: 'study' },
    )
  // the largest of N losses is beaten with a probability of 1 / (N + 1) already
  const tooFew =
    choice.method === 'historical' && Number((first * (1 - choice.confidence)).toFixed(8)) < 1
      ? ` (${choice.window === null ? 'at first ' : ''}fewer than the ${Math.ceil(Number((1 / (1 - choice.confidence)).toFixed(8)))} dates that ${percentText(choice.confidence, 1)} confidence needs: the largest loss stands for it, which is exceeded oftener)`
      : ''
  // an intensity moves slowly, and each costs a set-up of its own
  const every = estimator.kind === 'shrinkage' ? 20 : 1
  const result = await calculator.run(
    'back-test',
    {
      returns: data.values,
      dates,
      size: data.size,
      weights: d.weights,
      choice: { estimator, ...choice, first, every },
    },
    work,
  )
  return {
    of: 'this book',
    result,
    dates: data.serials?.slice(first) ?? null,
    method: `Forecasts at today’s weights from the ${choice.window === null ? `dates before (first after ${first})` : `${choice.window} dates before`}; ${estimatorText(estimator)}${every > 1 ? `, estimated anew every ${every} dates` : ''}${estimator.kind === 'lagged' ? ', which makes a volatility for many dates rather than for the next' : ''}; value at risk ${choice.method === 'normal' ? 'from a normal distribution with mean zero' : `from the losses of ${choice.window === null ? 'these dates' : 'the window'}${tooFew}`}${book.rule === 'common dates' ? '' : `; run on the ${countOf(dates, 'date')} common to all holdings, whatever the rule for gaps`}`,
    lines: backtestLines(result),
  }
}

/**
 * Tests forecasts that were made elsewhere: a block with the portfolio's returns, and beside them the forecast volatility or value at
 * risk of the same dates, told by its heading.
 *
 * @throws Fault "shape" for a block of other columns; "out-of-range" for values at risk that are all below 0; those of the tests
 */
export function givenBacktest(reading: ReturnsReading, confidence: number): BacktestStudy {
  const { columns, rows, values, names } = reading
  if (columns !== 2 || names === null)
    throw new Fault(
      'shape',
      `found ${countOf(columns, 'column')} of numbers${names === null ? ' without headings' : ''}`,
      'two columns under headings are needed: the portfolio’s returns, then “Value at risk” or “Volatility” forecast for the same dates',
      { argument: 'study' },
    )
  const column = (k: number): Float64Array =>
    Float64Array.from({ length: rows }, (_, t) => values[t * 2 + k]!)
  const isVolatility = /volatil|deviation/i.test(names[1] ?? '')
  const forecasts = column(1)
  if (!isVolatility && forecasts.some((loss) => loss < 0) && !forecasts.some((loss) => loss > 0))
    throw new Fault(
      'out-of-range',
      `found no number above 0 under ${quote(names[1] ?? '')}`,
      'values at risk as positive losses are needed, such as 0.02',
      { argument: 'study' },
    )
  const result = backtestGiven(
    column(0),
    isVolatility
      ? { volatility: forecasts, valueAtRisk: null }
      : { volatility: null, valueAtRisk: forecasts },
    confidence,
  )
  return {
    of: 'selection',
    result,
    dates: reading.dates,
    method: `Returns ${quote(names[0] ?? '')} against the ${isVolatility ? 'volatility' : 'value at risk'} ${quote(names[1] ?? '')} of the same dates, as given`,
    lines: backtestLines(result),
  }
}

const probability = (p: number): string => (p < 0.001 ? 'below 0.001' : numberText(p, 3))

/** Tests are read at this level. Common practice, no source. */
const LEVEL = 0.05

const ZONES = { green: 'Green', amber: 'Amber', red: 'Red' } as const

function backtestLines({ tests, bias, confidence, missing }: Backtest): BacktestStudy['lines'] {
  const { exceptions, expected, dates, coverage, independence, conditionalCoverage, accepted, power, zone } =
    tests
  const sure = confidenceText(confidence)
  const { quietToQuiet, quietToException, exceptionToQuiet, exceptionToException } = tests.steps
  const [fromQuiet, fromException] = [
    quietToQuiet + quietToException,
    exceptionToQuiet + exceptionToException,
  ]
  const stepsFromBoth = fromQuiet > 0 && fromException > 0
  const bringsTheNext = exceptionToException * fromQuiet > quietToException * fromException
  const lines: (readonly [string, string, string])[] = [
    [
      'Exceptions',
      `${exceptions} of ${countOf(dates, 'date')}`,
      `${numberText(expected, 1)} are expected at ${sure} confidence.${missing.length > 0 ? ` ${countOf(missing.length, 'date')} without a return or a forecast ${missing.length === 1 ? 'counts' : 'count'} as ${missing.length === 1 ? 'an exception' : 'exceptions'}.` : ''}`,
    ],
    [
      'Unconditional coverage (Kupiec)',
      `p ${probability(coverage.pValue)}`,
      `${
        coverage.pValue < LEVEL
          ? exceptions > expected
            ? 'Too many: losses went beyond the forecast more often than it says.'
            : 'Too few: the forecast was too cautious.'
          : `Agrees with ${sure} confidence: ${accepted.fewest} to ${accepted.most} would.`
      } With ${countOf(dates, 'date')} the test lets forecasts pass whose exceptions are twice as frequent as stated in ${percentText(power.missed, 0)} of records.`,
    ],
    [
      'Independence (Christoffersen)',
      stepsFromBoth ? `p ${probability(independence.pValue)}` : 'not tested',
      !stepsFromBoth
        ? `No date follows ${fromQuiet === 0 ? 'a quiet one' : 'an exception'}: whether one exception brings the next cannot be seen.`
        : independence.pValue >= LEVEL
          ? 'No sign that one exception brings the next; with few exceptions the test sees little.'
          : bringsTheNext
            ? 'Exceptions come in clusters, as where a forecast follows changes of volatility too slowly.'
            : 'Exceptions follow one another more seldom than chance would have it.',
    ],
    [
      'Conditional coverage (Christoffersen)',
      stepsFromBoth ? `p ${probability(conditionalCoverage.pValue)}` : 'not tested',
      !stepsFromBoth
        ? 'The number of exceptions alone can be tested.'
        : conditionalCoverage.pValue < LEVEL
          ? 'The record speaks against the forecast.'
          : 'The record does not speak against the forecast.',
    ],
    [
      'Zone (Basel Committee, MAR32)',
      ZONES[zone.zone],
      `Amber from ${zone.amberFrom}, red from ${zone.redFrom} exceptions${zone.addOn === null ? ': the same probabilities for this number of dates and this confidence; the standard itself speaks of 250 dates at 99%' : `; ${numberText(zone.addOn, 2)} is added to the multiplier`}.`,
    ],
  ]
  if (bias) {
    const [from, to] = bias.robustBand ?? bias.band
    lines.push([
      'Bias statistic',
      numberText(bias.value, 2),
      `Standard deviation of returns over their forecast volatility: 1 where it is right, ${numberText(from, 2)} to ${numberText(to, 2)} by chance (95%). ${
        bias.value > to
          ? 'Risk was forecast too low.'
          : bias.value < from
            ? 'Risk was forecast too high.'
            : 'No sign that risk was forecast too low or too high.'
      }`,
    ])
  }
  return lines
}

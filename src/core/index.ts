export { activeRisk, activeWeights, type ActiveConvention, type ActiveRisk } from './active'
export { RISK_BAND } from './band'
export {
  backtest,
  backtestGiven,
  biasStatistic,
  exceptionTests,
  type Backtest,
  type BacktestSettings,
  type Band,
  type BaselZone,
  type BiasStatistic,
  type ExceptionTests,
  type GivenForecasts,
  type MissingDates,
} from './backtest'
export { riskBudgetWeights, type BudgetWeights } from './budget'
export {
  LIMIT_MARGIN,
  type ChangeFinancing,
  type ChangeLimit,
  type ChangeProblem,
  type LimitMeasure,
  type LimitResidual,
} from './change-limits'
export { joinStates, splitChange, type JoinedStates, type RiskChangeSplit, type RiskState } from './change'
export { currencySplit, type CurrencyPart, type CurrencySplit } from './currency'
export { estimateModel, type EstimatedModel, type Estimator } from './estimate'
export { factorModel, type FactorModel, type FactorSplit } from './factor-model'
export {
  BOOTSTRAP_GENERATOR,
  bootstrap,
  type BootstrapChoice,
  type BootstrapResult,
  type Spread,
} from './bootstrap'
export { Fault, type FaultCode, type Where } from './fault'
export { impliedReturns, returnPerMarginal, type ImpliedChoice, type ImpliedReturns } from './implied'
export { kernelForm, type KernelForm, type Sums } from './kernel/block'
export { momentsOf, type Moments } from './moments'
export { jarqueBera, mardia, NORMALITY_LEVEL, type BlockNormality, type SeriesNormality } from './normality'
export {
  correlation,
  covariance,
  matrixModel,
  returnsModel,
  type Applied,
  type ReturnsModel,
  type RiskModel,
  type Weighting,
} from './risk-model'
export {
  annualise,
  decompose,
  groupDecomposition,
  type Decomposition,
  type GroupDecomposition,
} from './decomposition'
export { MOST_LAGS, shareBroughtBack, usualLags } from './lagged'
export { leastRiskWeights } from './least-risk'
export { leastVariance, type LeastVariance, type WeightBounds } from './least-variance'
export { roundToLots, type LotsResult } from './lots'
export { logReturns, simpleReturns } from './returns'
export { longestRun, rhythm, shareInRuns, withoutRuns, type Run } from './runs'
export {
  groupErrors,
  shareDifferences,
  standAloneErrors,
  standardErrors,
  type StandardErrors,
} from './sampling-error'
export {
  autocorrelation,
  carefulError,
  frequencySteps,
  jointLimit,
  laggedCrossCorrelation,
  ljungBox,
  outliers,
  robustScale,
  scalingFactor,
  splitRatio,
  unsmoothedReturns,
  unsmoothedVolatility,
  unsmoothingFactor,
  type Frequency,
  type FrequencySteps,
  type Outliers,
  type RobustScale,
  type SerialCorrelation,
  type SplitRatio,
  type TestResult,
  type UnsmoothedVolatility,
} from './series'
export { shrinkageOf, type Shrinkage, type ShrinkageTarget } from './shrinkage'
export { smallestChange, type ChangeResult } from './smallest-change'
export { conditionOf, type Condition } from './spectrum'
export { inOneGo, partOf } from './steps'
export {
  moveCorrelations,
  replay,
  scaleVolatilities,
  worstStretch,
  type Fall,
  type Replay,
  type Stretch,
} from './stress'
export {
  cornishFisherQuantile,
  fitStudent,
  inCornishFisherDomain,
  tailRisk,
  type StudentFit,
  type TailChoice,
  type TailMethod,
  type TailRisk,
} from './tails'
export {
  courseOf,
  financed,
  firstOrder,
  LEAST_NET_SHARE,
  loweringPairs,
  loweringTrades,
  removals,
  turnover,
  type Course,
  type Financed,
  type Financing,
  type FirstOrder,
  type LoweringTrade,
  type Reach,
  type Removals,
  type Shorting,
} from './trade'
export {
  completedMoments,
  historyLengths,
  pairwiseCovariance,
  type CompletedMoments,
  type HistoryGroup,
  type HistoryLengths,
  type PairwiseCovariance,
} from './incomplete'
export {
  nearestCorrelation,
  repairCovariance,
  shrinkToDefinite,
  smallestEigenvalue,
  type CovarianceRepair,
  type NearestOptions,
  type Repair,
  type ShrunkCorrelation,
} from './nearest-correlation'

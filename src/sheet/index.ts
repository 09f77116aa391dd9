export * from './cells'
export type * from './workbook'
export type * from './table'
export { attempt, explain } from './explain'
export { worksheetFunctions } from './functions'
export { DEFAULT_SETTINGS, GAP_RULES, REPAIRS, ROLES } from './settings'
export type {
  BenchmarkChoice,
  CurrencyChoice,
  EstimatorChoice,
  GapRule,
  LookBack,
  RepairRule,
  Role,
  Settings,
  TailChoice,
} from './settings'
export type { Finding } from './findings'
export { readHoldings } from './holdings'
export type { Holding, HoldingsColumn, HoldingsReading } from './holdings'
export { readReturns } from './returns'
export type { ReturnsReading } from './returns'
export { matchHoldings } from './matching'
export {
  columnLimits,
  judgeLimits,
  LIMIT_MEASURES,
  LIMIT_STATUS,
  limitOn,
  limitsOf,
  limitsSummary,
  limitText,
  readLimits,
} from './limits'
export type { Limit, LimitMeasure, LimitScope, LimitsReading, LimitState, LimitStatus } from './limits'
export { modelChoices, modelOf } from './book-model'
export type { Blocks, BookModel } from './book-model'
export { cancelledFault, jobWords, startJob, steppingCalculator } from './calculator'
export type { Calculator, JobInput, JobKind, JobResult, Work } from './calculator'
export type { Bands } from './bands'
export { sharesWithheldOf } from './benchmark'
export type { Active } from './benchmark'
export { CURRENCY_READING } from './currency'
export type { CurrencyParts, CurrencyRisk } from './currency'
export type { Check, CheckKind } from './checks'
export type { CheckLine, CorrectedVolatility } from './inspection'
export type { NestedGroup } from './nesting'
export { withColumn } from './nesting'
export { impliedReturnsOf } from './implied'
export type { ImpliedReturns, ImpliedRow } from './implied'
export { financingText, LOWERING_READING, riskLowering, sizingOf, TURNOVER_READING } from './sizing'
export type { RiskLowering, RiskLowerings, Sizing, SizingInputs, SizingMark, SizingPoint } from './sizing'
export { scalesWithTime } from './tail-section'
export type { Tails } from './tail-section'
export { breakDown } from './breakdown'
export type { Breakdown, GroupSection } from './breakdown'
export { breakdownTable } from './breakdown-table'
export { changeSteps, changeTable } from './change-table'
export type { ChangeStep } from './change-table'
export { scenarioName } from './stress'
export type { Scenario, StressCase, StressComparison, StressFigures, VolatilityFactor } from './stress'
export { openBooks } from './books'
export type { Books, BooksState, Offer, Working } from './books'
export type { Field, Status } from './linked-book'
export { NOW } from './reporting'
export type { CommitteeChoice, ProofState, ReportingState } from './reporting'
export type { ChangeLine, ChangeParts, RiskChange } from './risk-change'
export type { Snapshot, SnapshotHead } from './snapshot'
export type { BacktestChoice, BacktestStudy, ErrorStudy, Studies } from './studies'
export { RULE_FUNCTIONS, RULE_NAMES } from './expression'
export type { GroupProfile, Profile } from './profile'
export type { Proposal, ShareOf, Target } from './targets'
export type {
  Comparison,
  Entry,
  Financing,
  TextFault,
  TradeChange,
  TradeLine,
  TradesState,
  WriteLine,
  WritePreview,
} from './trades'
export * from './wording'

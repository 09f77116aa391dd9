export { activeRisk, type ActiveConvention, type ActiveRisk } from './active'
export { estimateModel, type EstimatedModel, type Estimator } from './estimate'
export { Fault, type FaultCode, type Where } from './fault'
export { kernelForm, type KernelForm } from './kernel/block'
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
export { logReturns, simpleReturns } from './returns'
export { RISK_BAND, shareDifferences, standardErrors, type StandardErrors } from './sampling-error'
export { shrinkageOf, type Shrinkage, type ShrinkageTarget } from './shrinkage'
export { conditionOf, type Condition } from './spectrum'
export {
  cornishFisherQuantile,
  fitStudent,
  tailRisk,
  type StudentFit,
  type TailChoice,
  type TailMethod,
  type TailRisk,
} from './tails'

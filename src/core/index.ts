export { activeRisk, type ActiveConvention, type ActiveRisk } from './active'
export { Fault, type FaultCode, type Where } from './fault'
export { kernelForm, type KernelForm } from './kernel/block'
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

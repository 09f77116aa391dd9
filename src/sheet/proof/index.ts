export { proofTable } from './proof-table'
export type { ProofInput } from './proof-table'

export type { ProofInput } from './proof-sheet'
export { proofTable } from './proof-table'

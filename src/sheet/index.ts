export * from './cells'
export type * from './workbook'
export type * from './table'

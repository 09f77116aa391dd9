export { excelWorkbook } from './workbook'
export { associateFunctions, type FunctionBody } from './functions'
export { hostTheme, loadOnOpen, whenReady, type HostTheme } from './host'

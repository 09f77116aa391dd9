export { excelWorkbook } from './workbook'
export { associateFunctions, type FunctionBody } from './functions'
export { hostTheme, loadOnOpen, onThemeChanged, whenReady, type HostTheme } from './host'

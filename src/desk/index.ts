/** The embedded local workbook. */
export { openDesk, type DeskOptions } from './page'

import { excelWorkbook } from '../excel'
import { openBooks, type Books } from '../sheet'
import { workerCalculator } from './worker-calculator'

/** Everything that reads, computes and writes, wired together. */
export const openWorkbook = (): Promise<Books> => openBooks(excelWorkbook(), workerCalculator())

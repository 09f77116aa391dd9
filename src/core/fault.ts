/**
 * Why something could not be done: one closed list for the whole program, so that every place that shows or
 * raises a fault can tell the kinds apart.
 */
export type FaultCode =
  // numbers
  | 'shape'
  | 'not-a-number'
  | 'out-of-range'
  | 'too-few'
  | 'not-symmetric'
  | 'correlation-matrix'
  | 'negative-variance'
  | 'zero-risk'
  | 'collinear'
  | 'unknown-choice'
  // cells
  | 'text'
  | 'blank'
  | 'missing-data'
  | 'cell-error'
  | 'unmatched'
  | 'twice'
  | 'selection'
  // a typed rule; the column counts characters
  | 'expression'
  // the host
  | 'occupied'
  | 'changed'
  | 'protected'
  | 'missing'
  | 'editing'
  | 'host'
  | 'cancelled'

/** The place a fault speaks of; row and column count from 0 within the argument. */
export interface Where {
  readonly argument?: string
  readonly row?: number
  readonly column?: number
}

/**
 * The only error this program throws on purpose: what was found, what is needed instead, and where.
 *
 * @example new Fault('shape', 'weights hold 3 numbers', '2 are needed').message // "weights hold 3 numbers; 2 are needed"
 */
export class Fault extends Error {
  override readonly name = 'Fault'

  constructor(
    readonly code: FaultCode,
    readonly found: string,
    readonly needed: string,
    readonly where: Where = {},
  ) {
    super(`${found}; ${needed}`)
  }
}

/**
 * The check at a numerical door: a row-major block must have the size it claims and hold finite numbers only.
 *
 * @throws Fault "shape" | "not-a-number", the latter with row and column
 */
export function checkBlock(values: Float64Array, rows: number, columns: number, argument: string): void {
  if (!Number.isInteger(rows) || !Number.isInteger(columns) || rows < 1 || columns < 1) {
    throw new Fault(
      'shape',
      `${argument}: ${rows} rows and ${columns} columns`,
      'at least one row and one column are needed, in whole numbers',
      { argument },
    )
  }
  if (values.length !== rows * columns) {
    throw new Fault(
      'shape',
      `${argument}: ${values.length} numbers`,
      columns === 1
        ? `${rows} are needed, one for each position`
        : `${rows} rows of ${columns} are needed (${rows * columns} numbers)`,
      { argument },
    )
  }
  // findIndex would call a function for each of what may be millions of numbers
  for (let k = 0; k < values.length; k++) {
    const value = values[k]!
    if (!Number.isFinite(value)) {
      const row = Math.floor(k / columns)
      throw new Fault('not-a-number', `${argument}: ${value}`, 'a finite number is needed', {
        argument,
        row,
        column: k - row * columns,
      })
    }
  }
}

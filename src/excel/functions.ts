import { Fault, type FaultCode } from '../core'
import { explain } from '../sheet'

/** The body of a worksheet function: arguments as the host passes them, null for one that was left out. */
export type FunctionBody = (...args: never[]) => unknown

/** Faults that say "there is no such figure" rather than "the input is wrong". */
const NOT_AVAILABLE: readonly FaultCode[] = ['zero-risk', 'missing-data']

/**
 * Gives the host the bodies of worksheet functions, by id. Each goes through one guard: a Fault becomes the cell's error with its
 * sentence, null an empty cell (the host would show 0), and nothing else is ever thrown. Needs only `CustomFunctions` to be there.
 */
export function associateFunctions(table: { readonly [id: string]: FunctionBody }): void {
  for (const [id, body] of Object.entries(table)) CustomFunctions.associate(id, guarded(body))
}

const guarded =
  (body: FunctionBody): FunctionBody =>
  (...args) => {
    try {
      const result = body(...args)
      return result instanceof Promise ? result.then(forCells, raise) : forCells(result)
    } catch (error) {
      return raise(error)
    }
  }

const forCells = (result: unknown): unknown => (Array.isArray(result) ? result.map(forCells) : (result ?? ''))

function raise(error: unknown): never {
  const { ErrorCode, Error: CellError } = CustomFunctions
  if (error instanceof Fault) {
    const code = NOT_AVAILABLE.includes(error.code) ? ErrorCode.notAvailable : ErrorCode.invalidValue
    throw new CellError(code, explain(error))
  }
  // a mistake of the program: an error that is not the host's own would show in the cell without any words
  const message = error instanceof Error ? error.message : String(error)
  throw new CellError(
    ErrorCode.invalidValue,
    `This function failed unexpectedly (${message}); please report it.`,
  )
}

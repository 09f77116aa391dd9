import { attempt, explain } from '../../../src/sheet/explain'
import { worksheetFunctions } from '../../../src/sheet/functions'

/** Calls a worksheet function as a cell does, with whatever arguments. */
export const call = (id: string, ...args: unknown[]): unknown =>
  (worksheetFunctions[id] as (...given: unknown[]) => unknown)(...args)

/** The sentence a cell would show, and the kind of fault; fails where there is none. */
export function refusal(id: string, ...args: unknown[]): { sentence: string; code: string } {
  const { fault } = attempt(() => call(id, ...args))
  if (!fault) throw new Error(`${id} found nothing wrong`)
  return { sentence: explain(fault), code: fault.code }
}

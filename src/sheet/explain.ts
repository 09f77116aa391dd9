import { Fault, type Where } from '../core'

/**
 * Runs a body that may meet a Fault. Any other error is a mistake in the program and goes on up.
 *
 * @example attempt(() => 1 + 1).value // 2
 */
export function attempt<T>(
  body: () => T,
): { value: T; fault?: undefined } | { value?: undefined; fault: Fault } {
  try {
    return { value: body() }
  } catch (error) {
    if (error instanceof Fault) return { fault: error }
    throw error
  }
}

/**
 * The one sentence a fault is told in: where, what was found, what is needed. A pane that knows the cells says their address; a
 * worksheet function knows only its own arguments and counts rows and columns from 1 within them, as a typed expression's characters are.
 *
 * @param addressOf the address of a place as the user knows it, or null where it is no cell of theirs
 * @example explain(new Fault('text', 'found “abc”', 'a number is needed', { argument: 'weights', row: 2, column: 0 })) // "weights, row 3, column 1: found “abc”; a number is needed."
 */
export function explain(fault: Fault, addressOf?: (where: Where) => string | null): string {
  const { argument } = fault.where
  // numerical doors put the argument's name first, because there the message stands alone
  const found =
    argument && fault.found.startsWith(`${argument}: `) ? fault.found.slice(argument.length + 2) : fault.found
  const place = addressOf?.(fault.where) ?? placeOf(fault)
  const sentence = `${found}; ${fault.needed}.`
  return place === '' ? sentence.charAt(0).toUpperCase() + sentence.slice(1) : `${place}: ${sentence}`
}

function placeOf({ code, where: { argument, row, column } }: Fault): string {
  if (code === 'expression' && column !== undefined) return `Character ${column + 1}`
  const parts = [
    argument,
    row === undefined ? undefined : `row ${row + 1}`,
    column === undefined ? undefined : `column ${column + 1}`,
  ]
  return parts.filter((part) => part !== undefined).join(', ')
}

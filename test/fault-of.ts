import { Fault } from '../src/core'

/** The fault something ends in; anything else that happens fails the test. */
export function faultOf(work: () => unknown): Fault {
  try {
    work()
  } catch (error) {
    if (error instanceof Fault) return error
    throw error
  }
  throw new Error('no fault was raised')
}

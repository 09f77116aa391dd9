/**
 * Long computations are generators that yield the share done, 0 to 1, and return their result. Who runs one decides
 * when to go on, to show progress or to leave it.
 */

/**
 * The result of such a computation, without a stop between its steps.
 *
 * @throws Fault   what the computation throws
 * @example        inOneGo(pairwiseCovariance(Float64Array.of(.01, .03, .02, NaN, .03, .01), 3, 2)).matrix // [0.0001, -0.0002, -0.0002, 0.0002]
 */
export function inOneGo<Result>(steps: Generator<number, Result>): Result {
  for (;;) {
    const step = steps.next()
    if (step.done) return step.value
  }
}

/**
 * A computation as a part of a longer one: its share done becomes that between two shares of the whole.
 *
 * @throws Fault   what the computation throws
 * @example        partOf(pairwiseCovariance(Float64Array.of(.01, .03, .02), 3, 1), .5, 1).next().value // 0.5
 */
export function* partOf<Result>(
  steps: Generator<number, Result>,
  from: number,
  to: number,
): Generator<number, Result> {
  for (;;) {
    const step = steps.next()
    if (step.done) return step.value
    yield from + (to - from) * step.value
  }
}

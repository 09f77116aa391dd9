/**
 * The largest difference between two lists of numbers, relative to the largest entry expected (absolute where all
 * expected are 0). NaN where anything is not a number or lengths differ, so that no comparison with it holds.
 */
export function relativeGap(
  actual: ArrayLike<number> | number,
  expected: ArrayLike<number> | number,
): number {
  const a = typeof actual === 'number' ? [actual] : actual
  const b = typeof expected === 'number' ? [expected] : expected
  if (a.length !== b.length) return NaN
  let gap = 0
  let largest = 0
  for (let k = 0; k < b.length; k++) {
    // Math.max passes NaN on
    gap = Math.max(gap, Math.abs(a[k]! - b[k]!))
    largest = Math.max(largest, Math.abs(b[k]!))
  }
  return largest === 0 ? gap : gap / largest
}

/** The largest absolute difference; NaN as above. */
export function absoluteGap(
  actual: ArrayLike<number> | number,
  expected: ArrayLike<number> | number,
): number {
  const a = typeof actual === 'number' ? [actual] : Array.from(actual)
  const b = typeof expected === 'number' ? [expected] : Array.from(expected)
  return a.length === b.length ? a.reduce((gap, value, k) => Math.max(gap, Math.abs(value - b[k]!)), 0) : NaN
}

import { EigenvalueDecomposition, WrapperMatrix1D } from 'ml-matrix'
import { Fault } from './fault'
import { matrixModel } from './risk-model'
import { conditionOf } from './spectrum'
import { inOneGo, partOf } from './steps'

/**
 * Matrices that are no covariance: what each pair's own dates, or views of single correlations, leave with negative
 * eigenvalues, for which some portfolio would have a negative variance.
 */

export interface Repair {
  /** Correlations; n x n row-major, ones on the diagonal, no eigenvalue below zero but for rounding. */
  readonly matrix: Float64Array
  readonly iterations: number
  /** How many of the iterations were steps of alternating projections. */
  readonly projections: number
  /** The largest |x_ii - 1| that was left when the iteration ended; the matrix is then scaled to ones exactly. */
  readonly residual: number
  /** |A - X|, Frobenius: every off-diagonal entry counts twice. */
  readonly distance: number
  /** Whether the residual came down to the tolerance. If not, the matrix is valid, but there is a nearer one. */
  readonly converged: boolean
  /** y, n: X is the positive part of A + diag(y), which proves it the nearest. */
  readonly multipliers: Float64Array
}

export interface NearestOptions {
  /** For the residual; default 1e-10. */
  readonly tolerance?: number
  /** Default 100; ten are common with Newton's steps, hundreds with projections alone. */
  readonly maxIterations?: number
  /** Default "newton". "projections": only the slow, safe steps, as a second computation of the same matrix. */
  readonly steps?: 'newton' | 'projections'
}

/**
 * The nearest correlation matrix: of all symmetric matrices with ones on the diagonal and no negative eigenvalue the
 * one with the least sum of squared differences from A.
 *
 *   minimise |A - X|  over X >= 0, diag(X) = 1;     dual: minimise theta(y) = |(A + diag y)_+|^2 / 2 - sum y
 *   grad theta = diag((A + diag y)_+) - 1;          X = (A + diag y)_+ at its minimum
 *
 * Newton's method on the dual, its equations solved by conjugate gradients. Where a Newton step makes no progress the
 * step is y - grad theta, which always does: the alternating projections with Dykstra's correction are exactly these
 * steps (A + diag y is the matrix they project onto the positive semidefinite ones, and setting its diagonal to
 * ones takes grad theta off y).
 *
 * @param matrix   n x n row-major, symmetric; any diagonal of 0 or more
 * @param size     n
 * @returns        yields the share done, by the digits of the residual. Not converging is in the result; a matrix that
 *                 is one of correlations already comes back bit for bit
 * @throws Fault   "shape" | "not-a-number" | "negative-variance" | "not-symmetric" | "out-of-range" (options)
 * @source         Higham (2002), Computing the nearest correlation matrix - a problem from finance, IMA J. Numerical Analysis
 *                 22, 329-343; Qi & Sun (2006), A quadratically convergent Newton method for computing the nearest correlation
 *                 matrix, SIAM J. Matrix Analysis 28, 360-385; preconditioner of Borsdorf & Higham (2010), A preconditioned
 *                 Newton algorithm for the nearest correlation matrix, IMA J. Numerical Analysis 30, 94-107 (all from memory)
 * @cost           one O(n^3) eigendecomposition a step, which yields nothing before its end (a second at n = 500), and O(r n^2) for each of its few conjugate gradients, r the number of
 *                 negative or of positive eigenvalues, whichever is less
 * @example        inOneGo(nearestCorrelation(Float64Array.of(1, 1, 0, 1, 1, 1, 0, 1, 1), 3)).matrix // [1, 0.76069, 0.15730, 0.76069, 1, 0.76069, 0.15730, 0.76069, 1]
 */
export function* nearestCorrelation(
  matrix: Float64Array,
  size: number,
  options: NearestOptions = {},
): Generator<number, Repair> {
  const { tolerance = 1e-10, maxIterations = 100, steps = 'newton' } = options
  if (!(tolerance > 0)) {
    throw new Fault('out-of-range', `tolerance ${tolerance}`, 'a number above 0 is needed', {
      argument: 'tolerance',
    })
  }
  if (!Number.isInteger(maxIterations) || maxIterations < 0) {
    throw new Fault('out-of-range', `${maxIterations} iterations`, 'a whole number of 0 or more is needed', {
      argument: 'maxIterations',
    })
  }
  const given = symmetric(matrix, size)
  let here = dualAt(
    given,
    Float64Array.from({ length: size }, (_, i) => 1 - given[i * size + i]!),
  )
  if (
    here.y.every((shift) => shift === 0) &&
    here.values[0]! >= -size * Number.EPSILON * here.values[size - 1]!
  ) {
    const valid = { iterations: 0, projections: 0, residual: 0, distance: 0, converged: true }
    return { matrix: matrix.slice(), ...valid, multipliers: here.y }
  }
  yield 0

  const digitsWanted = Math.log(Math.max(here.residual / tolerance, 1 + 1e-9))
  const first = here.residual
  let iterations = 0
  let projections = 0
  let share = 0
  while (here.residual > tolerance && iterations < maxIterations) {
    const newton = steps === 'newton' ? yield* newtonStep(here, share) : null
    const next = newton ?? dualAt(given, subtract(here.y, here.gradient))
    // A projection never makes the gradient longer and lowers the dual by at least half its square. Where neither is to be
    // seen, rounding has the last word.
    if (!newton && next.slope >= here.slope && here.value - next.value < roundingOf(here)) break
    here = next
    iterations++
    if (!newton) projections++
    share = Math.max(share, Math.min(0.99, Math.log(first / here.residual) / digitsWanted))
    yield share
  }

  const nearest = withUnitDiagonal(positivePart(here), size)
  return {
    matrix: nearest,
    iterations,
    projections,
    residual: here.residual,
    distance: frobenius(given, nearest),
    converged: here.residual <= tolerance,
    multipliers: here.y,
  }
}

/** theta and what belongs to it at one y. */
interface Dual {
  readonly given: Float64Array
  readonly y: Float64Array
  readonly size: number
  /** theta(y) */
  readonly value: number
  /** diag((A + diag y)_+) - 1 */
  readonly gradient: Float64Array
  /** |gradient| */
  readonly slope: number
  /** Largest |gradient_i|. */
  readonly residual: number
  /** Eigenvalues of A + diag y, ascending, and their vectors, one a row. */
  readonly values: Float64Array
  readonly vectors: Float64Array
  /** How many eigenvalues are 0 or less. */
  readonly negative: number
}

function dualAt(given: Float64Array, y: Float64Array): Dual {
  const size = y.length
  const shifted = given.slice()
  for (let i = 0; i < size; i++) shifted[i * size + i] = shifted[i * size + i]! + y[i]!
  const { values, vectors } = eigen(shifted, size)
  const negative = values.filter((value) => value <= 0).length
  // whichever part has fewer vectors: the positive part itself, or what its absence adds to the matrix
  const few = fewer(values, negative)
  const gradient = Float64Array.from({ length: size }, (_, i) =>
    few.positive ? -1 : shifted[i * size + i]! - 1,
  )
  for (let a = few.from; a < few.to; a++) {
    const weight = Math.abs(values[a]!)
    for (let i = 0, k = a * size; i < size; i++, k++) {
      gradient[i] = gradient[i]! + weight * vectors[k]! * vectors[k]!
    }
  }
  let value = 0
  for (let a = negative; a < size; a++) value += 0.5 * values[a]! * values[a]!
  for (const shift of y) value -= shift
  return {
    given,
    y,
    size,
    value,
    gradient,
    slope: Math.sqrt(dot(gradient, gradient)),
    residual: gradient.reduce((largest, g) => Math.max(largest, Math.abs(g)), 0),
    values,
    vectors,
    negative,
  }
}

/** The eigenvectors of one sign, of which there are fewer: [from, to). */
const fewer = (values: Float64Array, negative: number) =>
  negative <= values.length - negative
    ? { positive: false, from: 0, to: negative }
    : { positive: true, from: negative, to: values.length }

/** (A + diag y)_+ in full. */
function positivePart({ given, y, size, values, vectors, negative }: Dual): Float64Array {
  const few = fewer(values, negative)
  const part = new Float64Array(size * size)
  if (!few.positive) {
    part.set(given)
    for (let i = 0; i < size; i++) part[i * size + i] = part[i * size + i]! + y[i]!
  }
  for (let a = few.from; a < few.to; a++) {
    const weight = Math.abs(values[a]!)
    const vector = vectors.subarray(a * size, (a + 1) * size)
    for (let i = 0; i < size; i++) {
      const scaled = weight * vector[i]!
      for (let j = 0; j <= i; j++) part[i * size + j] = part[i * size + j]! + scaled * vector[j]!
    }
  }
  mirrorInPlace(part, size)
  return part
}

/** Of theta, a sum of n squares. */
const roundingOf = ({ size, value }: Dual) => size * Number.EPSILON * Math.abs(value)

/** A step that lowers theta enough (Armijo) or halves its gradient; null where Newton's direction gives none. */
function* newtonStep(here: Dual, share: number): Generator<number, Dual | null> {
  const direction = yield* newtonDirection(here, share)
  const descent = dot(here.gradient, direction)
  // nor is a direction without a usable length one, which nearly singular equations can give
  if (!(descent < 0 && descent > -1e100)) return null
  // near the minimum theta itself changes by less than its rounding, its gradient does not
  const measurable = -1e-4 * descent > roundingOf(here)
  for (let length = 1; length >= (measurable ? 1 / 4096 : 1); length /= 2) {
    const next = dualAt(
      here.given,
      here.y.map((value, i) => value + length * direction[i]!),
    )
    yield share
    if (measurable && next.value <= here.value + 1e-4 * length * descent) return next
    if (next.slope <= here.slope / 2) return next
  }
  return null
}

/** V d = -gradient, V the generalised Hessian of theta, by preconditioned conjugate gradients. */
function* newtonDirection(here: Dual, share: number): Generator<number, Float64Array> {
  const { size, gradient, slope } = here
  const hessian = hessianAt(here)
  const diagonal = yield* hessian.diagonal(share)
  const direction = new Float64Array(size)
  const rest = gradient.map((g) => -g)
  const scaled = rest.map((r, i) => r / diagonal[i]!)
  const search = scaled.slice()
  let norm = dot(rest, scaled)
  // equations solved ever more exactly as the minimum comes near, which keeps Newton's convergence quadratic
  const enough = Math.min(0.01, slope) * slope
  for (let k = 0; k < 50 && Math.sqrt(dot(rest, rest)) > enough; k++) {
    const image = yield* hessian.apply(search, share)
    const curvature = dot(search, image)
    if (!(curvature > 0)) break
    const length = norm / curvature
    for (let i = 0; i < size; i++) {
      direction[i] = direction[i]! + length * search[i]!
      rest[i] = rest[i]! - length * image[i]!
      scaled[i] = rest[i]! / diagonal[i]!
    }
    const before = norm
    norm = dot(rest, scaled)
    for (let i = 0; i < size; i++) search[i] = scaled[i]! + (norm / before) * search[i]!
  }
  return direction
}

/**
 * V h = diag(P (W o (P' diag(h) P)) P'), where w is 1 between two positive eigenvalues, 0 between two others and
 * a / (a + |b|) between a > 0 and b <= 0. With few positive vectors only their rows of W count; with few negative ones
 * V h = h - the same with 1 - W, whose rows are alike.
 */
function hessianAt({ size, values, vectors, negative }: Dual) {
  const few = fewer(values, negative)
  /** Rows a of W (or 1 - W) as a few: for b on the same side 1, for b on the other twice the weight. */
  const weight = (a: number, b: number) => {
    if (b >= few.from && b < few.to) return 1
    const own = Math.abs(values[a]!)
    return own === 0 ? 0 : (2 * own) / (own + Math.abs(values[b]!))
  }
  const rows = Array.from({ length: size }, (_, a) => vectors.subarray(a * size, (a + 1) * size))

  function* summed(term: (a: number, into: Float64Array) => void, share: number) {
    const sum = new Float64Array(size)
    const inner = new Float64Array(size)
    for (let a = few.from; a < few.to; a++) {
      inner.fill(0)
      term(a, inner)
      for (let i = 0; i < size; i++) sum[i] = sum[i]! + inner[i]!
      if ((a - few.from) % 8 === 7) yield share
    }
    return sum
  }

  return {
    *apply(h: Float64Array, share: number): Generator<number, Float64Array> {
      const scaled = new Float64Array(size)
      const sum = yield* summed((a, into) => {
        const vector = rows[a]!
        for (let i = 0; i < size; i++) scaled[i] = vector[i]! * h[i]!
        for (let b = 0; b < size; b++) {
          const other = rows[b]!
          const factor = weight(a, b) * dot(scaled, other)
          for (let i = 0; i < size; i++) into[i] = into[i]! + factor * other[i]!
        }
        for (let i = 0; i < size; i++) into[i] = into[i]! * vector[i]!
      }, share)
      return few.positive ? sum : subtract(h, sum)
    },
    /** V_ii, kept away from 0: it only steers the conjugate gradients. */
    *diagonal(share: number): Generator<number, Float64Array> {
      const sum = yield* summed((a, into) => {
        const vector = rows[a]!
        for (let b = 0; b < size; b++) {
          const factor = weight(a, b)
          const other = rows[b]!
          for (let i = 0; i < size; i++) into[i] = into[i]! + factor * other[i]! * other[i]!
        }
        for (let i = 0; i < size; i++) into[i] = into[i]! * vector[i]! * vector[i]!
      }, share)
      return sum.map((value) => Math.max(few.positive ? value : 1 - value, 1e-8))
    },
  }
}

export interface ShrunkCorrelation {
  /** Correlations; n x n row-major. */
  readonly matrix: Float64Array
  /** The part of the identity, 0 to 1; 0 where nothing had to be done. */
  readonly intensity: number
  /** |A - S|, Frobenius. */
  readonly distance: number
  /** Smallest eigenvalue of the matrix given. */
  readonly smallestBefore: number
}

/**
 * All correlations made smaller by one factor, the largest that leaves no eigenvalue below rounding: quicker than the
 * nearest correlation matrix and positive definite, but farther away.
 *
 *   S = (1 - alpha) A + alpha I,   alpha = (e - l) / (1 - l),   l the smallest eigenvalue, e = 2 n eps times the largest
 *
 * With the identity as the target an eigenvalue l becomes (1 - alpha) l + alpha, so that alpha needs no search.
 *
 * @param matrix   n x n row-major, symmetric, ones on the diagonal
 * @param size     n
 * @throws Fault   "shape" | "not-a-number" | "negative-variance" | "not-symmetric" | "out-of-range" (a diagonal that is not 1)
 * @source         Higham, Strabić & Šego (2016), Restoring definiteness via shrinking, with an application to correlation
 *                 matrices with a fixed block, SIAM Review 58, 245-263 (from memory)
 * @cost           O(n^3), one set of eigenvalues
 * @example        shrinkToDefinite(Float64Array.of(1, -.5, -.5, -.5, -.5, 1, -.5, -.5, -.5, -.5, 1, -.5, -.5, -.5, -.5, 1), 4).intensity // 0.33333
 */
export function shrinkToDefinite(matrix: Float64Array, size: number): ShrunkCorrelation {
  const given = symmetric(matrix, size)
  for (let i = 0; i < size; i++) {
    if (Math.abs(given[i * size + i]! - 1) > 1e-8) {
      throw new Fault(
        'out-of-range',
        `risk: ${given[i * size + i]!} on the diagonal`,
        'correlations with 1 there are needed',
        {
          argument: 'risk',
          row: i,
          column: i,
        },
      )
    }
  }
  return inOneGo(shrunk(given, size))
}

function* shrunk(given: Float64Array, size: number): Generator<number, ShrunkCorrelation> {
  const { smallest, largest } = yield* conditionOf(matrixModel(given, size))
  if (smallest >= 0) return { matrix: given.slice(), intensity: 0, distance: 0, smallestBefore: smallest }
  const least = 2 * size * Number.EPSILON * largest!
  const intensity = (least - smallest) / (1 - smallest)
  const matrix = given.map((value, k) => (k % (size + 1) === 0 ? 1 : (1 - intensity) * value))
  return { matrix, intensity, distance: frobenius(given, matrix), smallestBefore: smallest }
}

/**
 * The smallest eigenvalue of a symmetric matrix, positions of variance 0 left out; below zero, the matrix is no
 * covariance.
 *
 * @param matrix   n x n row-major, symmetric
 * @param size     n
 * @returns        0 where rounding hides it
 * @throws Fault   "shape" | "not-a-number" | "negative-variance" | "not-symmetric" | "out-of-range" (a covariance beside a variance of 0)
 * @source         as `conditionOf`
 * @cost           O(n^3)
 * @example        smallestEigenvalue(Float64Array.of(2, 3, 3, 2), 2) // -1
 */
export function smallestEigenvalue(matrix: Float64Array, size: number): number {
  const given = symmetric(matrix, size)
  checkRiskless(given, size)
  return inOneGo(conditionOf(matrixModel(given, size))).smallest
}

export interface CovarianceRepair {
  /** Covariance; n x n row-major. The diagonal is that of the matrix given, bit for bit. */
  readonly matrix: Float64Array
  readonly how: 'nearest' | 'shrunk'
  /** False: no eigenvalue was below zero but for rounding, and the matrix is the one given, bit for bit. */
  readonly changed: boolean
  /** Smallest eigenvalue of the correlations, as given and as returned. Columns of variance 0 stay outside. */
  readonly smallestBefore: number
  readonly smallestAfter: number
  /** The correlation that changed most: from, to, and its pair; null where nothing changed. */
  readonly largestChange: {
    readonly i: number
    readonly j: number
    readonly before: number
    readonly after: number
  } | null
  /** Frobenius distance between the correlations before and after. */
  readonly distance: number
  /** Of "nearest"; 0 for "shrunk". */
  readonly iterations: number
  /** False where "nearest" ended before its tolerance: the matrix is valid, but not quite the nearest. */
  readonly converged: boolean
}

/**
 * A covariance without negative eigenvalues in place of one with some: its correlations are repaired, its variances
 * stay.
 *
 *   r_ij = c_ij / sqrt(c_ii c_jj),   x = the nearest or the shrunk correlations,   c'_ij = x_ij sqrt(c_ii c_jj)
 *
 * Columns with a variance of 0 pass through.
 *
 * @param matrix   n x n row-major, decimals squared
 * @param size     n
 * @param how      "nearest": changes correlations least; "shrunk": quicker, moves all of them toward 0
 * @returns        yields the share done
 * @throws Fault   "shape" | "not-a-number" | "negative-variance" | "not-symmetric" | "out-of-range" (a covariance beside a variance of 0)
 * @source         as `nearestCorrelation` and `shrinkToDefinite`; keeping the variances: common practice, no source
 * @cost           O(n^3) where nothing is wrong; else as its method
 * @example        inOneGo(repairCovariance(Float64Array.of(.04, .04, 0, .04, .04, .04, 0, .04, .04), 3, 'nearest')).matrix[1] // 0.030428
 */
export function* repairCovariance(
  matrix: Float64Array,
  size: number,
  how: 'nearest' | 'shrunk',
): Generator<number, CovarianceRepair> {
  const given = symmetric(matrix, size)
  const deviations = Float64Array.from({ length: size }, (_, i) => Math.sqrt(given[i * size + i]!))
  const moving = Array.from(deviations.keys()).filter((i) => deviations[i]! > 0)
  checkRiskless(given, size)
  const n = moving.length
  const correlations = new Float64Array(n * n)
  for (const [a, i] of moving.entries()) {
    for (const [b, j] of moving.entries()) {
      correlations[a * n + b] = i === j ? 1 : given[i * size + j]! / deviations[i]! / deviations[j]!
    }
  }
  const smallestBefore =
    n === 0 ? 0 : (yield* partOf(conditionOf(matrixModel(correlations, n)), 0, 0.1)).smallest
  const same = { how, distance: 0, iterations: 0, converged: true, smallestBefore }
  if (smallestBefore >= 0) {
    return {
      ...same,
      matrix: matrix.slice(),
      changed: false,
      smallestAfter: smallestBefore,
      largestChange: null,
    }
  }
  const repaired =
    how === 'nearest'
      ? yield* partOf(nearestCorrelation(correlations, n), 0.1, 0.9)
      : { ...(yield* partOf(shrunk(correlations, n), 0.1, 0.9)), iterations: 0, converged: true }
  const { smallest: smallestAfter } = yield* partOf(conditionOf(matrixModel(repaired.matrix, n)), 0.9, 1)
  const kept = matrix.slice()
  let largestChange = null
  let most = 0
  for (const [a, i] of moving.entries()) {
    for (let b = 0; b < a; b++) {
      const j = moving[b]!
      const [before, after] = [correlations[a * n + b]!, repaired.matrix[a * n + b]!]
      kept[i * size + j] = kept[j * size + i] = after * deviations[i]! * deviations[j]!
      if (Math.abs(after - before) > most) {
        most = Math.abs(after - before)
        largestChange = { i: j, j: i, before, after }
      }
    }
  }
  return {
    matrix: kept,
    how,
    changed: true,
    smallestBefore,
    smallestAfter,
    largestChange,
    distance: repaired.distance,
    iterations: repaired.iterations,
    converged: repaired.converged,
  }
}

/** No covariance but 0 goes with a variance of 0. */
function checkRiskless(matrix: Float64Array, size: number): void {
  for (let i = 0; i < size; i++) {
    if (matrix[i * size + i] !== 0) continue
    for (let j = 0; j < size; j++) {
      const covariance = matrix[i * size + j]!
      if (covariance === 0) continue
      throw new Fault(
        'out-of-range',
        `risk: a covariance of ${covariance} beside a variance of 0`,
        'a covariance of 0 is needed there',
        { argument: 'risk', row: i, column: j },
      )
    }
  }
}

/** The one library call: eigenvalues ascending, and their vectors as rows. It cannot be left half-way: a second at n = 500. */
function eigen(matrix: Float64Array, size: number): { values: Float64Array; vectors: Float64Array } {
  const { realEigenvalues, eigenvectorMatrix } = new EigenvalueDecomposition(
    new WrapperMatrix1D(matrix, { rows: size }),
    { assumeSymmetric: true },
  )
  const vectors = new Float64Array(size * size)
  for (let a = 0; a < size; a++) {
    for (let i = 0; i < size; i++) vectors[a * size + i] = eigenvectorMatrix.get(i, a)
  }
  return { values: Float64Array.from(realEigenvalues), vectors }
}

/** A checked copy, symmetric to the last bit: what was so within 1e-8 is averaged. */
function symmetric(matrix: Float64Array, size: number): Float64Array {
  const copy = matrixModel(matrix, size).matrix()
  for (let i = 0; i < size; i++) {
    for (let j = 0; j < i; j++) {
      copy[i * size + j] = copy[j * size + i] = (copy[i * size + j]! + copy[j * size + i]!) / 2
    }
  }
  return copy
}

/** x_ij / sqrt(x_ii x_jj), which keeps a matrix positive semidefinite. */
function withUnitDiagonal(matrix: Float64Array, size: number): Float64Array {
  const scales = Float64Array.from({ length: size }, (_, i) => 1 / Math.sqrt(matrix[i * size + i]!))
  return matrix.map((value, k) => {
    const i = Math.floor(k / size)
    const j = k - i * size
    return i === j ? 1 : value * (scales[i]! * scales[j]!)
  })
}

function mirrorInPlace(matrix: Float64Array, size: number): void {
  for (let i = 0; i < size; i++) {
    for (let j = 0; j < i; j++) matrix[j * size + i] = matrix[i * size + j]!
  }
}

const subtract = (a: Float64Array, b: Float64Array) => a.map((value, i) => value - b[i]!)

const frobenius = (a: Float64Array, b: Float64Array) => {
  const difference = subtract(a, b)
  return Math.sqrt(dot(difference, difference))
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!
  return sum
}

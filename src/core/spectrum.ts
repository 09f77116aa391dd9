import type { EstimatedModel } from './estimate'
import type { ReturnsModel, RiskModel } from './risk-model'

/** How far apart the eigenvalues of a covariance lie. Riskless positions, each an eigenvalue of 0, are left out. */
export interface Condition {
  /** Largest eigenvalue over smallest; Infinity where the smallest is not above 0; null where nothing moves. */
  readonly condition: number | null
  /** 0 where rounding hides it; negative where a given matrix is not positive semidefinite. */
  readonly smallest: number
  /** null where dates are too few for a regular matrix, which is known without computing it. */
  readonly largest: number | null
  /** Eigenvalues above rounding; null likewise. */
  readonly rank: number | null
  /** The positions counted: all but the riskless ones. */
  readonly moving: number
}

/**
 * The condition number of a covariance: how much an error in it may be magnified by whatever inverts it. Returns of T
 * dates without shrinkage have at most T-1 eigenvalues above 0: with more positions than that it is infinite, and
 * nothing is computed. Otherwise the matrix is formed, brought to three diagonals by reflections, and its eigenvalues
 * are found by counting how many lie below a number (Sturm sequences). That counts eigenvalues exactly, needs no
 * eigenvectors, and can be left at every column.
 *
 * @returns        yields the share done
 * @throws Fault   what `apply` of the model throws
 * @source         Golub & Van Loan (2013), Matrix Computations, 4th ed., sections 8.3.1 and 8.4.1; Wilkinson (1965), The
 *                 Algebraic Eigenvalue Problem, ch. 5 (from memory)
 * @cost           O(n^3) and one question to the model for each position; 8 n^2 bytes
 * @example        inOneGo(conditionOf(matrixModel(Float64Array.of(2, 1, 1, 2), 2))).condition // 3
 */
export function* conditionOf(model: RiskModel | ReturnsModel | EstimatedModel): Generator<number, Condition> {
  const variances = model.variances()
  const positions = Int32Array.from(variances.keys()).filter((i) => variances[i]! > 0)
  const moving = positions.length
  if (moving === 0) return { condition: null, smallest: 0, largest: 0, rank: 0, moving }
  const dates = datesOf(model)
  if (dates !== undefined && dates - 1 < moving) {
    return { condition: Infinity, smallest: 0, largest: null, rank: null, moving }
  }

  const rows = yield* lowerTriangle(model, positions, variances)
  const { diagonal, offDiagonal } = yield* tridiagonal(rows)
  const below = counter(diagonal, offDiagonal)
  const bound = diagonal.reduce(
    (most, d, i) =>
      Math.max(most, Math.abs(d) + Math.abs(offDiagonal[i - 1] ?? 0) + Math.abs(offDiagonal[i] ?? 0)),
    0,
  )
  /** The eigenvalue that k others lie below. */
  const eigenvalue = (k: number) => {
    let [low, high] = [-bound, bound]
    for (;;) {
      const middle = low + (high - low) / 2
      if (!(middle > low && middle < high) || high - low <= Number.EPSILON * Number.EPSILON * bound)
        return middle
      if (below(middle) > k) high = middle
      else low = middle
    }
  }
  const largest = eigenvalue(moving - 1)
  const resolution = moving * Number.EPSILON * largest
  const computed = eigenvalue(0)
  const smallest = Math.abs(computed) <= resolution ? 0 : computed
  return {
    condition: smallest > 0 ? largest / smallest : Infinity,
    smallest,
    largest,
    rank: moving - below(resolution),
    moving,
  }
}

/** T of a model whose rank cannot exceed T-1; undefined for all others. */
function datesOf(model: RiskModel | ReturnsModel | EstimatedModel): number | undefined {
  if ('shrinkage' in model) return model.shrinkage ? undefined : model.returns.dates
  return 'rowWeights' in model ? model.dates : undefined
}

/** The covariances of these positions, row i with the columns 0 to i. */
function* lowerTriangle(
  model: RiskModel,
  positions: Int32Array,
  variances: Float64Array,
): Generator<number, Float64Array[]> {
  const rows = Array.from(positions, (_, i) => new Float64Array(i + 1))
  const unit = new Float64Array(model.size)
  const column = new Float64Array(model.size)
  for (const [j, position] of positions.entries()) {
    unit[position] = 1
    model.apply(unit, column)
    unit[position] = 0
    rows[j]![j] = variances[position]!
    for (let i = j + 1; i < positions.length; i++) rows[i]![j] = column[positions[i]!]!
    yield (0.5 * j) / positions.length
  }
  return rows
}

/**
 * The three diagonals that reflections make of a symmetric matrix, which has the same eigenvalues: each row from the last
 * is reflected onto its last entry but one. `rows` is used up.
 */
function* tridiagonal(
  rows: Float64Array[],
): Generator<number, { diagonal: Float64Array; offDiagonal: Float64Array }> {
  const n = rows.length
  const diagonal = new Float64Array(n)
  const offDiagonal = new Float64Array(n - 1)
  for (let i = n - 1; i > 0; i--) {
    const u = rows[i]!.subarray(0, i)
    diagonal[i] = rows[i]![i]!
    // scaled: squares of small covariances must not vanish
    const scale = u.reduce((most, x) => Math.max(most, Math.abs(x)), 0)
    if (i === 1 || scale === 0) {
      offDiagonal[i - 1] = u[i - 1]!
      continue
    }
    let square = 0
    for (let k = 0; k < i; k++) {
      const x = (u[k] = u[k]! / scale)
      square += x * x
    }
    const last = u[i - 1]!
    const length = last > 0 ? -Math.sqrt(square) : Math.sqrt(square)
    offDiagonal[i - 1] = scale * length
    u[i - 1] = last - length
    reflect(rows, u, square - last * length)
    yield 1 - 0.5 * (i / n) ** 3
  }
  diagonal[0] = rows[0]![0]!
  return { diagonal, offDiagonal }
}

/** A - u q' - q u' for the leading block A, with p = A u / half and q = p - (u'p / 2 half) u: A seen in the mirror u. */
function reflect(rows: readonly Float64Array[], u: Float64Array, half: number): void {
  const n = u.length
  const q = new Float64Array(n)
  for (let j = 0; j < n; j++) {
    const row = rows[j]!
    const uj = u[j]!
    let sum = row[j]! * uj
    for (let k = 0; k < j; k++) {
      sum += row[k]! * u[k]!
      q[k] = q[k]! + row[k]! * uj
    }
    q[j] = q[j]! + sum
  }
  let product = 0
  for (let j = 0; j < n; j++) {
    const p = (q[j] = q[j]! / half)
    product += u[j]! * p
  }
  const part = product / (2 * half)
  for (let j = 0; j < n; j++) {
    const uj = u[j]!
    const qj = (q[j] = q[j]! - part * uj)
    const row = rows[j]!
    for (let k = 0; k <= j; k++) row[k] = row[k]! - uj * q[k]! - qj * u[k]!
  }
}

/** How many eigenvalues of three diagonals lie below a number: as many as there are negative pivots. */
function counter(diagonal: Float64Array, offDiagonal: Float64Array) {
  const squares = offDiagonal.map((e) => e * e)
  return (x: number) => {
    let count = 0
    let pivot = 1
    for (let i = 0; i < diagonal.length; i++) {
      // a pivot of exactly 0 counts as just above it
      const carried = i === 0 ? 0 : squares[i - 1]! / (pivot === 0 ? Number.MIN_VALUE : pivot)
      pivot = diagonal[i]! - x - carried
      if (pivot < 0) count++
    }
    return count
  }
}

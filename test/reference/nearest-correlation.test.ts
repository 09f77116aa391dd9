import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { inOneGo, nearestCorrelation, shrinkToDefinite, smallestEigenvalue } from '../../src/core'
import { absoluteGap } from '../closeness'
import { readJson } from './data'

// Expected: numpy 1.24.2 (Newton on the dual, Qi & Sun 2006), a second time by alternating projections (Higham 2002,
// Algorithm 3.3) and by R 4.2.2, Matrix::nearPD (Matrix 1.5-3); all agree to 1e-13. Where the example is a printed one,
// `input_source` and `published.status` in nearest_correlation.json say what was read and what is from memory.
// Tolerance 1e-8: an optimum, see README.md.
const tolerance = 1e-8

interface Case {
  readonly input: number[][]
  readonly input_source: string
  readonly input_eigenvalues: number[]
  readonly nearest: { readonly value: number[][] }
  readonly distance_frobenius: { readonly value: number }
  readonly optimality_certificate: { readonly dual_y: number[] }
  readonly clip_and_rescale?: { readonly distance: number }
}

const { cases } = readJson<{ readonly cases: Record<string, Case> }>('nearest_correlation.json')

const eigenvalues = (matrix: ArrayLike<number>, n: number) =>
  new EigenvalueDecomposition(Matrix.from1DArray(n, n, Array.from(matrix)), { assumeSymmetric: true })
    .realEigenvalues

describe.each(Object.entries(cases))('%s', (_, expected) => {
  const n = expected.input.length
  const input = Float64Array.from(expected.input.flat())
  const nearest = inOneGo(nearestCorrelation(input, n))

  it(`is the nearest (${expected.input_source})`, () => {
    expect(nearest.converged).toBe(true)
    // quadratic convergence: Newton's steps alone, and few; Qi & Sun (2006) report less than ten (from memory)
    expect(nearest.projections).toBe(0)
    expect(nearest.iterations).toBeLessThanOrEqual(6)
    expect(absoluteGap(nearest.matrix, expected.nearest.value.flat())).toBeLessThan(tolerance)
    expect(absoluteGap(nearest.distance, expected.distance_frobenius.value)).toBeLessThan(tolerance)
  })

  it('comes with the certificate that proves it', () => {
    // X >= 0, diag X = 1, X - A - diag y >= 0 and their product 0: sufficient for the minimum of a convex problem (Karush-Kuhn-Tucker)
    const y = nearest.multipliers
    const slack = nearest.matrix.map((x, k) => x - input[k]! - (k % (n + 1) === 0 ? y[k / (n + 1)]! : 0))
    expect(Array.from(y.keys(), (i) => nearest.matrix[i * (n + 1)])).toEqual(new Array(n).fill(1))
    expect(Math.min(...eigenvalues(nearest.matrix, n))).toBeGreaterThan(-1e-13)
    expect(Math.min(...eigenvalues(slack, n))).toBeGreaterThan(-tolerance)
    const product = nearest.matrix.reduce((sum, x, k) => sum + x * slack[k]!, 0)
    expect(Math.abs(product)).toBeLessThan(tolerance)
    // the multipliers are the only ones: the constraint is nondegenerate (Qi & Sun 2006)
    expect(absoluteGap(y, expected.optimality_certificate.dual_y)).toBeLessThan(tolerance)
  })

  it('is the same by alternating projections alone', () => {
    const slow = inOneGo(nearestCorrelation(input, n, { steps: 'projections', maxIterations: 500 }))
    expect(slow.converged).toBe(true)
    expect(absoluteGap(slow.matrix, expected.nearest.value.flat())).toBeLessThan(tolerance)
    expect(slow.iterations).toBeGreaterThan(nearest.iterations)
  })

  it('is no farther than clipped eigenvalues with a rescaled diagonal, or than the shrunk one', () => {
    // statsmodels 0.13.5 corr_clipped(threshold=1e-15)
    if (expected.clip_and_rescale) {
      expect(nearest.distance).toBeLessThan(expected.clip_and_rescale.distance + 1e-12)
    }
    if (input[0] === 1) expect(nearest.distance).toBeLessThan(shrinkToDefinite(input, n).distance + 1e-12)
  })

  it('has the smallest eigenvalue of the input', () => {
    // numpy.linalg.eigvalsh
    expect(absoluteGap(smallestEigenvalue(input, n), Math.min(...expected.input_eigenvalues))).toBeLessThan(
      1e-13,
    )
  })
})

describe('published', () => {
  interface Check {
    readonly id: string
    readonly citation: string
    readonly status: string
    readonly inputs: { readonly A: number[][] }
    readonly outputs: { readonly X: number[][]; readonly distance: number }
    readonly tolerance: { readonly X: number; readonly distance: number }
  }
  const check = readJson<{ readonly checks: readonly Check[] }>('published.json').checks.find(
    ({ id }) => id === 'higham-tridiagonal',
  )!

  test(`${check.citation} (${check.status})`, () => {
    const { inputs, outputs } = check
    const { matrix, distance } = inOneGo(nearestCorrelation(Float64Array.from(inputs.A.flat()), 4))
    expect(absoluteGap(matrix, outputs.X.flat())).toBeLessThanOrEqual(check.tolerance.X)
    expect(absoluteGap(distance, outputs.distance)).toBeLessThanOrEqual(check.tolerance.distance)
  })
})

it('five correlations of -1/2 shrink by half and are then the nearest as well', () => {
  // eigenvalues of 5 equal correlations r: 1 + 4r, and 1 - r four times; -1 becomes 0 at alpha = 1/2 and r at -1/4, the
  // least that five series can share (analytic; "equicorrelation_5_minus_half" in nearest_correlation.json)
  const input = Float64Array.from({ length: 25 }, (_, k) => (k % 6 === 0 ? 1 : -0.5))
  const { matrix, intensity, smallestBefore, distance } = shrinkToDefinite(input, 5)
  expect(absoluteGap([intensity, smallestBefore, matrix[1]!], [0.5, -1, -0.25])).toBeLessThan(1e-13)
  expect(absoluteGap(distance, Math.sqrt(20) * 0.25)).toBeLessThan(1e-13)
})

/**
 * Moments of series that start at different dates, a second time in the plainest way there is: series by length, each
 * regressed on all longer ones by normal equations and elimination, and one step of the expectation-maximisation
 * algorithm, which leaves exactly the maximum of the likelihood where it is.
 *
 *   regression  Stambaugh (1997), Journal of Financial Economics 45, 285-331 (from memory)
 *   one step    Little & Rubin (2002), Statistical Analysis with Missing Data, 2nd ed., section 11.2 (from memory)
 */
export type Rows = readonly (readonly number[])[]

export interface Moments {
  readonly means: number[]
  readonly matrix: number[][]
}

export function textbookMoments(rows: Rows): Moments {
  const n = rows[0]!.length
  const start = (i: number) => rows.findIndex((row) => !Number.isNaN(row[i]!))
  const order = Array.from({ length: n }, (_, i) => i).sort((a, b) => start(a) - start(b) || a - b)
  const means = new Array<number>(n).fill(0)
  const matrix = means.map(() => new Array<number>(n).fill(0))
  for (const s of new Set(order.map(start))) {
    const longer = order.filter((i) => start(i) < s)
    const group = order.filter((i) => start(i) === s)
    const own = rows.slice(s)
    const design = own.map((row) => [1, ...longer.map((l) => row[l]!)])
    const normal = design[0]!.map((_, a) =>
      design[0]!.map((__, b) => total(design.map((x) => x[a]! * x[b]!))),
    )
    const slopes = group.map((i) =>
      solve(
        normal,
        design[0]!.map((_, a) => total(design.map((x, t) => x[a]! * own[t]![i]!))),
      ),
    )
    const residual = (g: number, t: number) =>
      own[t]![group[g]!]! - total(design[t]!.map((x, a) => x * slopes[g]![a]!))
    for (const [g, i] of group.entries()) {
      means[i] = slopes[g]![0]! + total(longer.map((l, k) => slopes[g]![k + 1]! * means[l]!))
      for (const l of longer) {
        matrix[i]![l] = matrix[l]![i] = total(longer.map((m, k) => slopes[g]![k + 1]! * matrix[m]![l]!))
      }
    }
    for (const [g, i] of group.entries()) {
      for (const [h, j] of group.entries()) {
        const left = total(own.map((_, t) => residual(g, t) * residual(h, t))) / own.length
        matrix[i]![j] = left + total(longer.map((l, k) => slopes[h]![k + 1]! * matrix[i]![l]!))
      }
    }
  }
  return { means, matrix }
}

/** Expected completion of every row under the moments given, and the moments of the completed rows. */
export function expectationMaximisationStep(rows: Rows, { means, matrix }: Moments): Moments {
  const n = means.length
  const extra = means.map(() => new Array<number>(n).fill(0))
  const completed = rows.map((row) => {
    const seen = row.flatMap((x, i) => (Number.isNaN(x) ? [] : [i]))
    const unseen = row.flatMap((x, i) => (Number.isNaN(x) ? [i] : []))
    const block = seen.map((i) => seen.map((j) => matrix[i]![j]!))
    const full = [...row]
    const slopes = unseen.map((u) =>
      solve(
        block,
        seen.map((i) => matrix[u]![i]!),
      ),
    )
    for (const [k, u] of unseen.entries()) {
      full[u] = means[u]! + total(seen.map((i, a) => slopes[k]![a]! * (row[i]! - means[i]!)))
      for (const v of unseen) {
        extra[u]![v]! += matrix[u]![v]! - total(seen.map((i, a) => slopes[k]![a]! * matrix[i]![v]!))
      }
    }
    return full
  })
  const T = rows.length
  const newMeans = means.map((_, i) => total(completed.map((row) => row[i]!)) / T)
  return {
    means: newMeans,
    matrix: means.map((_, i) =>
      means.map(
        (__, j) =>
          (total(completed.map((row) => (row[i]! - newMeans[i]!) * (row[j]! - newMeans[j]!))) +
            extra[i]![j]!) /
          T,
      ),
    ),
  }
}

const total = (values: readonly number[]) => values.reduce((sum, x) => sum + x, 0)

/** Gaussian elimination with the largest pivot. */
function solve(matrix: readonly (readonly number[])[], right: readonly number[]): number[] {
  const rows = matrix.map((row, i) => [...row, right[i]!])
  const n = rows.length
  for (let c = 0; c < n; c++) {
    let best = c
    for (let r = c + 1; r < n; r++) if (Math.abs(rows[r]![c]!) > Math.abs(rows[best]![c]!)) best = r
    ;[rows[c], rows[best]] = [rows[best]!, rows[c]!]
    for (let r = c + 1; r < n; r++) {
      const factor = rows[r]![c]! / rows[c]![c]!
      for (let k = c; k <= n; k++) rows[r]![k]! -= factor * rows[c]![k]!
    }
  }
  const x = new Array<number>(n).fill(0)
  for (let c = n - 1; c >= 0; c--) {
    x[c] = (rows[c]![n]! - total(x.map((v, k) => (k > c ? rows[c]![k]! * v : 0)))) / rows[c]![c]!
  }
  return x
}

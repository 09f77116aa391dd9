/**
 * The same figures a second time, in the plainest way there is: form the covariance matrix by its definition, then
 * loop over positions. An oracle for the fast form, written from the formulas alone.
 *
 *   covariance     sum_t (x_ti - m_i)(x_tj - m_j) / (T - 1): any statistics text
 *   exponential    the same with weights decay^(T-1-t) / sum, divisor 1
 *   contributions  w_i (C w)_i / sqrt(w'C w): Maillard, Roncalli & Teiletche (2010), JPM 36(4), section 2
 */
export function textbookCovariance(rows: readonly (readonly number[])[], decay?: number): number[][] {
  const T = rows.length
  const raw = rows.map((_, t) => (decay === undefined ? 1 : decay ** (T - 1 - t)))
  const total = raw.reduce((a, b) => a + b, 0)
  const omega = raw.map((x) => x / total)
  const n = rows[0]!.length
  const means = Array.from({ length: n }, (_, i) => rows.reduce((a, row, t) => a + omega[t]! * row[i]!, 0))
  const divisor = decay === undefined ? (T - 1) / T : 1
  return means.map((mi, i) =>
    means.map(
      (mj, j) => rows.reduce((a, row, t) => a + omega[t]! * (row[i]! - mi) * (row[j]! - mj), 0) / divisor,
    ),
  )
}

export function textbookDecomposition(C: readonly (readonly number[])[], w: readonly number[]) {
  const Cw = C.map((row) => row.reduce((a, c, j) => a + c * w[j]!, 0))
  const variance = Cw.reduce((a, c, i) => a + c * w[i]!, 0)
  const volatility = Math.sqrt(variance)
  const deviation = C.map((row, i) => Math.sqrt(row[i]!))
  const standAlone = w.map((x, i) => Math.abs(x) * deviation[i]!)
  const gross = standAlone.reduce((a, b) => a + b, 0)
  const share = Cw.map((c, i) => (w[i]! * c) / variance)
  return {
    variance,
    volatility,
    standAlone,
    marginal: Cw.map((c) => c / volatility),
    contribution: Cw.map((c, i) => (w[i]! * c) / volatility),
    share,
    beta: Cw.map((c) => c / variance),
    correlation: Cw.map((c, i) => c / (deviation[i]! * volatility)),
    diversificationRatio: gross / volatility,
    diversificationBenefit: gross - volatility,
    effectiveNumber: 1 / share.reduce((a, p) => a + p * p, 0),
  }
}

/** C with c_ij = corr_ij vol_i vol_j, row-major. */
export function covarianceOf(vol: readonly number[], corr: readonly (readonly number[])[]): Float64Array {
  return Float64Array.from(vol.flatMap((a, i) => vol.map((b, j) => corr[i]![j]! * a * b)))
}

const centredOf = (rows: readonly (readonly number[])[]) => {
  const means = rows[0]!.map((_, i) => rows.reduce((a, row) => a + row[i]!, 0) / rows.length)
  return rows.map((row) => row.map((x, i) => x - means[i]!))
}
const meanOf = (values: readonly number[]) => values.reduce((a, x) => a + x, 0) / values.length
const sumOver = (n: number, term: (i: number, j: number) => number) => {
  let sum = 0
  for (let i = 0; i < n; i++) for (let j = 0; j < n; j++) sum += term(i, j)
  return sum
}

/**
 * Shrinkage by double loops over the definitions, S with divisor T; every column must move.
 *
 *   identity     Ledoit & Wolf (2004), J. Multivariate Analysis 88(2), section 3.3 (from memory)
 *   oas          Chen, Wiesel, Eldar & Hero (2010), IEEE Trans. Signal Processing 58(10), eq. 23 (from memory)
 *   correlation  Ledoit & Wolf (2004), J. Portfolio Management 30(4), appendices A and B (from memory)
 */
export function textbookShrinkage(
  rows: readonly (readonly number[])[],
  target: 'identity' | 'oas' | 'correlation',
): { intensity: number; S: number[][]; F: number[][]; C: number[][] } {
  const x = centredOf(rows)
  const T = x.length
  const n = x[0]!.length
  const S = x[0]!.map((_, i) => x[0]!.map((_, j) => meanOf(x.map((row) => row[i]! * row[j]!))))
  const deviation = S.map((row, i) => Math.sqrt(row[i]!))
  const trace = S.reduce((a, row, i) => a + row[i]!, 0)
  const r = sumOver(n, (i, j) => (i === j ? 0 : S[i]![j]! / (deviation[i]! * deviation[j]!))) / (n * (n - 1))
  const F = S.map((row, i) =>
    row.map((s, j) => {
      if (target === 'correlation') return i === j ? s : r * deviation[i]! * deviation[j]!
      return i === j ? trace / n : 0
    }),
  )
  const distance = sumOver(n, (i, j) => (S[i]![j]! - F[i]![j]!) ** 2)
  const noise = (i: number, j: number) => meanOf(x.map((row) => (row[i]! * row[j]! - S[i]![j]!) ** 2))
  const theta = (own: number, i: number, j: number) =>
    meanOf(x.map((row) => (row[own]! ** 2 - S[own]![own]!) * (row[i]! * row[j]! - S[i]![j]!)))
  const intensities = {
    identity: () => {
      const b = sumOver(n, noise) / T
      return Math.min(b, distance) / distance
    },
    oas: () => {
      const squares = sumOver(n, (i, j) => S[i]![j]! ** 2)
      return Math.min(
        1,
        ((1 - 2 / n) * squares + trace ** 2) / ((T + 1 - 2 / n) * (squares - trace ** 2 / n)),
      )
    },
    correlation: () => {
      const pi = sumOver(n, noise)
      const rho = sumOver(n, (i, j) => {
        if (i === j) return noise(i, i)
        const ratio = deviation[j]! / deviation[i]!
        return (r / 2) * (ratio * theta(i, i, j) + theta(j, i, j) / ratio)
      })
      return Math.max(0, Math.min(1, (pi - rho) / distance / T))
    },
  }
  const intensity = intensities[target]()
  const C = S.map((row, i) => row.map((s, j) => (1 - intensity) * s + intensity * F[i]![j]!))
  return { intensity, S, F, C }
}

/** Lagged terms by the definition: Newey & West (1987), Econometrica 55(3), eq. 5 (from memory), divisor T. */
export function textbookLagged(rows: readonly (readonly number[])[], lags: number): number[][] {
  const z = centredOf(rows)
  const T = z.length
  const G = (k: number, i: number, j: number) =>
    z.slice(k).reduce((a, row, t) => a + row[i]! * z[t]![j]!, 0) / T
  return z[0]!.map((_, i) =>
    z[0]!.map((_, j) => {
      let c = G(0, i, j)
      for (let k = 1; k <= lags; k++) c += (1 - k / (lags + 1)) * (G(k, i, j) + G(k, j, i))
      return c
    }),
  )
}

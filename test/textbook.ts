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

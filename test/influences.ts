import { textbookDecomposition } from './textbook'

/**
 * How far each date moves each figure, in the plainest way there is: an oracle for the fast form, written from the
 * formulas alone. One list over the dates for the volatility, and one for each contribution and share.
 *
 *   share         u_t = (w_i z_i y - p_i y^2) / v          contribution  u_t = C w_i z_i y / s - c_i / 2 - c_i y^2 / (2 v)
 *   volatility    u_t = C (y^2 - v) / (2 s)                with v = sum of omega y^2, s^2 = C v, C the correction
 *
 * and with lags products a_t b_t replaced by a_t b_t + sum_k kappa_k (a_t b_(t-k) + a_(t-k) b_t), kappa_k = 1 - k/(L+1).
 */
export function influences(
  rows: readonly (readonly number[])[],
  weights: ArrayLike<number>,
  { omega, correction, lags = 0 }: { omega: ArrayLike<number>; correction: number; lags?: number },
) {
  const T = rows.length
  const w = Array.from(weights)
  const sum = (term: (t: number) => number) => rows.reduce((total, _, t) => total + term(t), 0)
  const means = w.map((_, i) => sum((t) => omega[t]! * rows[t]![i]!))
  const z = rows.map((row) => row.map((r, i) => r - means[i]!))
  const y = z.map((row) => row.reduce((total, x, i) => total + x * w[i]!, 0))
  const product = (a: (t: number) => number, b: (t: number) => number, t: number) => {
    let total = a(t) * b(t)
    for (let k = 1; k <= Math.min(lags, t); k++) {
      total += (1 - k / (lags + 1)) * (a(t) * b(t - k) + a(t - k) * b(t))
    }
    return total
  }
  const yy = z.map((_, t) =>
    product(
      (at) => y[at]!,
      (at) => y[at]!,
      t,
    ),
  )
  const v = sum((t) => omega[t]! * yy[t]!)
  const s = Math.sqrt(correction * v)
  const zy = w.map((_, i) =>
    z.map((_row, t) =>
      product(
        (at) => z[at]![i]!,
        (at) => y[at]!,
        t,
      ),
    ),
  )
  const p = w.map((wi, i) => (wi * sum((t) => omega[t]! * zy[i]![t]!)) / v)
  const dates = Array.from({ length: T }, (_, t) => t)
  return {
    volatility: dates.map((t) => (correction * (yy[t]! - v)) / (2 * s)),
    share: w.map((wi, i) => dates.map((t) => (wi * zy[i]![t]! - p[i]! * yy[t]!) / v)),
    contribution: w.map((wi, i) => {
      const c = p[i]! * s
      return dates.map((t) => (correction * wi * zy[i]![t]!) / s - c / 2 - (c * yy[t]!) / (2 * v))
    }),
  }
}

/** The standard error that influence values give: sqrt of the sum over dates t, u of kappa_|t-u| e_t e_u, e = omega u. */
export function errorOf(values: readonly number[], omega: ArrayLike<number>, lags = 0): number {
  const e = values.map((u, t) => omega[t]! * u)
  let total = 0
  e.forEach((a, t) =>
    e.forEach((b, u) => {
      total += Math.max(0, 1 - Math.abs(t - u) / (lags + 1)) * a * b
    }),
  )
  return Math.sqrt(Math.max(total, 0))
}

/**
 * The definition of an influence value, without any formula for it: how fast the figures of the textbook change when
 * date t gains weight at the cost of all others (central difference; errors near 1e-9 of the figures).
 */
export function influencesByDefinition(
  rows: readonly (readonly number[])[],
  weights: readonly number[],
  omega: ArrayLike<number>,
  correction: number,
) {
  const figures = (date: number, step: number) => {
    const shifted = rows.map((_, t) => (1 - step) * omega[t]! + (t === date ? step : 0))
    const mean = (of: (row: readonly number[]) => number) =>
      rows.reduce((total, row, t) => total + shifted[t]! * of(row), 0)
    const means = weights.map((_, i) => mean((row) => row[i]!))
    const C = means.map((mi, i) =>
      means.map((mj, j) => correction * mean((row) => (row[i]! - mi) * (row[j]! - mj))),
    )
    return textbookDecomposition(C, weights)
  }
  const step = 1e-5
  const changes = rows.map((_, t) => {
    const up = figures(t, step)
    const down = figures(t, -step)
    const slope = (a: number, b: number) => (a - b) / (2 * step)
    return {
      volatility: slope(up.volatility, down.volatility),
      share: up.share.map((p, i) => slope(p, down.share[i]!)),
      contribution: up.contribution.map((c, i) => slope(c, down.contribution[i]!)),
    }
  })
  return {
    volatility: changes.map((u) => u.volatility),
    share: weights.map((_, i) => changes.map((u) => u.share[i]!)),
    contribution: weights.map((_, i) => changes.map((u) => u.contribution[i]!)),
  }
}

/**
 * Risk-budget weights a second way, for matrices without riskless positions: cyclical coordinate descent on 1/2 x'C x - sum b_i ln x_i, each x_i in turn
 * the positive root of c_ii x_i^2 + x_i sum_{j != i} c_ij x_j = b_i; Griveau-Billion, Richard & Roncalli (2013), A Fast Algorithm for Computing
 * High-dimensional Risk Parity Portfolios, SSRN 2325255, section 2.2 (from memory).
 */
export function cyclicalBudgetWeights(C: readonly (readonly number[])[], b: readonly number[]): number[] {
  const x = C.map((row, i) => 1 / Math.sqrt(row[i]!))
  for (let round = 0, change = Infinity; round < 100_000 && change > 1e-15; round++) {
    change = 0
    C.forEach((row, i) => {
      const others = row.reduce((sum, c, j) => (j === i ? sum : sum + c * x[j]!), 0)
      const root = (-others + Math.sqrt(others * others + 4 * row[i]! * b[i]!)) / (2 * row[i]!)
      change = Math.max(change, Math.abs(root / x[i]! - 1))
      x[i] = root
    })
  }
  const total = x.reduce((sum, value) => sum + value, 0)
  return x.map((value) => value / total)
}

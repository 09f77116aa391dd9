import { returnsModel } from '../../src/core'
import { readCsv, readJson } from './data'

// NIST/ITL Statistical Reference Datasets (StRD), univariate summary statistics, https://www.itl.nist.gov/div898/strd/
// certified values (read). Digits agreed = -log10(relative error), capped at 16. Two comparisons:
// - with exact arithmetic on the stored doubles, the best a program that reads doubles can be compared with: 15 digits;
// - with NIST's certified decimals, as far as storing the data in doubles leaves them (`input_rounding_limit`).
interface Univariate {
  readonly sets: Record<
    string,
    {
      readonly n: number
      readonly certified: { readonly mean: string; readonly sd: string }
      readonly exact_of_stored_doubles: { readonly mean: string; readonly sd: string }
      readonly double_precision_digits: { readonly input_rounding_limit: number | null }
    }
  >
}

const { sets } = readJson<Univariate>('nist_univariate.json')
const digits = (actual: number, expected: string) =>
  Math.min(16, -Math.log10(Math.abs(actual / Number(expected) - 1)))

describe.each(Object.entries(sets))('NIST %s', (name, set) => {
  const values = Float64Array.from(readCsv(`nist_${name}.csv`).rows, ([y]) => y!)

  test.each(['simd', 'plain'] as const)(
    'mean and standard deviation to the digits doubles allow, %s form',
    (form) => {
      expect(values).toHaveLength(set.n)
      const model = returnsModel(values, set.n, 1, { kind: 'sample' }, form)
      expect(model.form).toBe(form)
      const mean = model.means[0]!
      const variances = [model.variances()[0]!, model.apply(Float64Array.of(1)).variance, model.matrix()[0]!]
      expect(digits(mean, set.exact_of_stored_doubles.mean)).toBeGreaterThanOrEqual(15)
      for (const variance of variances) {
        const sd = Math.sqrt(variance)
        expect(digits(sd, set.exact_of_stored_doubles.sd)).toBeGreaterThanOrEqual(15)
        // certified values are printed to 15 digits
        const attainable = Math.min(set.double_precision_digits.input_rounding_limit ?? 16, 14.7)
        expect(digits(sd, set.certified.sd)).toBeGreaterThanOrEqual(attainable - 0.1)
      }
    },
  )
})

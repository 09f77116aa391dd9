import {
  decompose,
  inOneGo,
  leastVariance,
  matrixModel,
  returnsModel,
  riskBudgetWeights,
  simpleReturns,
  type Decomposition,
  type RiskModel,
} from '../../src/core'
import { absoluteGap } from '../closeness'
import { covarianceOf } from '../textbook'
import { readJson } from './data'

// Worked examples as printed. Citation, status (read or memory) and tolerance stand beside each figure in
// data/published.json; every test is named by its citation and status, and compares at the printed digits.
interface Inputs {
  /** Decimals of capital, or amounts of money: whichever the source gives. */
  readonly weights: number[]
  readonly values?: number[]
  readonly vol: number[]
  readonly corr: number[][]
  readonly corrs: number[]
  readonly constantCorr: number
  readonly z: number
  readonly leverage: number
  readonly activeWeights: number[]
  readonly varB: number
  readonly covAB: number
}

interface Check {
  readonly id: string
  readonly citation: string
  readonly status: 'read' | 'memory'
  readonly derived?: boolean
  readonly inputs: unknown
  readonly outputs: Record<string, number | number[]>
  readonly tolerance: Record<string, number>
}

const checks = readJson<{ readonly checks: readonly Check[] }>('published.json').checks

/** Normal quantile at 95%, 1.6448536269514722: computed with scipy 1.10.1, norm.ppf(0.95). */
const z95 = 1.6448536269514722

/** One example: `compute` works its figures from the inputs; the printed ones come from the file. */
function example<I = Inputs>(
  id: string,
  compute: (inputs: I, printed: Record<string, number[]>) => Record<string, ArrayLike<number> | number>,
): void {
  const check = checks.find((entry) => entry.id === id)
  if (!check) throw new Error(`no published example ${id}`)
  const status = check.derived ? `${check.status}, figures derived from the formula` : check.status
  test(`${id}: ${check.citation} (${status})`, () => {
    const actual = compute(
      check.inputs as I,
      Object.fromEntries(Object.entries(check.outputs).map(([key, value]) => [key, [value].flat()])),
    )
    expect(Object.keys(actual).length).toBeGreaterThan(0)
    for (const [figure, value] of Object.entries(actual)) {
      const printed = check.outputs[figure]
      expect([figure, printed]).not.toContain(undefined)
      // 1e-12: a printed 0 or an exact figure is still compared in doubles
      expect(absoluteGap(value, printed!)).toBeLessThanOrEqual(check.tolerance[figure]! + 1e-12)
    }
  })
}

const correlated = (rho: number) => [
  [1, rho],
  [rho, 1],
]
const identity = correlated(0)

const model = ({ vol, corr }: Inputs): RiskModel => matrixModel(covarianceOf(vol!, corr!), vol.length)
const split = (inputs: Inputs, weights: readonly number[] = inputs.values ?? inputs.weights) =>
  decompose(model(inputs), Float64Array.from(weights))
const times = (factor: number, values: Float64Array | null) => Float64Array.from(values!, (x) => x * factor)

const equalRisk = (risk: RiskModel) =>
  inOneGo(riskBudgetWeights(risk, new Float64Array(risk.size).fill(1 / risk.size)))
const longOnlyLeast = (risk: RiskModel) => {
  const { size } = risk
  const bounds = { lower: new Float64Array(size), upper: new Float64Array(size).fill(1), sum: 1 }
  const result = inOneGo(leastVariance(risk, bounds))
  if (!result.feasible) throw new Error('a sum of 1 lies between 0 and 1 for each')
  return result
}

/** Risk lost when position i is taken out and nothing else changes. */
const lostWithout = (inputs: Inputs, i: number) => {
  const values = [...(inputs.values ?? inputs.weights)]
  const whole = split(inputs).volatility
  values[i] = 0
  return whole - split(inputs, values).volatility
}

describe('published examples', () => {
  example('jorion-2ccy-printed', (inputs) => {
    const d = split(inputs)
    const z = inputs.z
    return {
      portfolioStdDev: d.volatility,
      portfolioVaR: z * d.volatility,
      individualVaR: times(z, d.standAlone),
      undiversifiedVaR: z * (d.volatility + d.diversificationBenefit),
      marginalVaR: times(z, d.marginal),
      componentVaR: times(z, d.contribution),
      percent: d.share!,
      // the book's betas are to the portfolio of money amounts, per unit of its value
      betas: times(3000000, d.beta),
    }
  })

  example('jorion-2ccy-exact-z', (inputs) => {
    const d = split(inputs)
    return {
      portfolioVaR: z95 * d.volatility,
      eurIndividual: z95 * d.standAlone[1]!,
      cadIndividual: z95 * d.standAlone[0]!,
      incrementalCad: z95 * lostWithout(inputs, 0),
      incrementalEur: z95 * lostWithout(inputs, 1),
    }
  })

  example('frm-cad-usd-component', (inputs) => {
    const d = split(inputs)
    return {
      individualCad: z95 * d.standAlone[0]!,
      corrToPortfolio: d.correlation![0]!,
      componentCad: z95 * d.contribution[0]!,
      incrementalCad: z95 * lostWithout(inputs, 0),
    }
  })

  example('frm-50-50-individual', (inputs) => {
    const d = split(inputs)
    return {
      individual: times(z95, d.standAlone),
      // of a book of 100
      portfolioVol: d.volatility / 100,
      portfolioVaR: z95 * d.volatility,
    }
  })

  example('roncalli-t2.2-vol', (inputs) => {
    const d = split(inputs)
    return {
      risk: 100 * d.volatility,
      marginal: times(100, d.marginal),
      contribution: times(100, d.contribution),
      percent: times(100, d.share),
    }
  })

  const figures = (d: Decomposition) => ({
    risk: d.volatility,
    percent: d.share!,
    marginal: d.marginal!,
    contribution: d.contribution,
  })

  example('mrt-ew', (inputs) => figures(split(inputs)))

  example('mrt-mv', (inputs) => {
    const { weights } = longOnlyLeast(model(inputs))
    const { risk, percent, marginal } = figures(split(inputs, Array.from(weights)))
    return { weights, risk, percent, marginal }
  })

  example('mrt-erc', (inputs) => {
    const { weights } = equalRisk(model(inputs))
    const { risk, marginal, percent } = figures(split(inputs, Array.from(weights)))
    return { weights, risk, marginal, percent }
  })

  example('mrt-const-corr-0.3', (inputs) => {
    const rho = inputs.constantCorr
    const corr = [0, 1, 2, 3].map((i) => [0, 1, 2, 3].map((j) => (i === j ? 1 : rho)))
    const risk = matrixModel(covarianceOf(inputs.vol, corr), 4)
    return { erc: equalRisk(risk).weights, minVar: longOnlyLeast(risk).weights }
  })

  example('mrt-two-asset', (inputs, printed) => {
    const first = inputs.corrs.map(
      (rho) => equalRisk(matrixModel(covarianceOf(inputs.vol, correlated(rho)), 2)).weights[0]!,
    )
    // one weight is printed for all correlations
    expect(
      absoluteGap(
        first,
        inputs.corrs.map(() => printed['w1']![0]!),
      ),
    ).toBeLessThanOrEqual(1e-9)
    return { w1: first[0]! }
  })

  example('qian-6040', (inputs) => {
    const { risk, percent } = figures(split(inputs))
    return { risk, percent }
  })

  example('qian-eggs', (inputs) => {
    // The essay's analogy weighs variances by weight; a share of risk is another figure, as its author says elsewhere.
    const [w, v] = [inputs.weights, inputs.vol]
    const uncorrelated = { ...inputs, corr: identity }
    // 8100 / 8500: (6 x 15)^2 and (4 x 5)^2, by hand
    expect(split(uncorrelated).share![0]).toBeCloseTo(8100 / 8500, 12)
    // 6 x 9 and 4 x 1: in units of 5 squared
    const eggs = w.map((x, i) => (x * v[i]! ** 2) / 25)
    return { total: eggs[0]! + eggs[1]!, share: eggs[0]! / (eggs[0]! + eggs[1]!) }
  })

  example('cfa-l3-active-cash', (inputs, printed) => {
    const weights = Float64Array.from(inputs.activeWeights)
    const [varB, covAB] = [inputs.varB, inputs.covAB]
    // With returns relative to the benchmark (A + B) / 2, as in the exhibit; var A is not printed and is solved for.
    const relative = (varA: number) => {
      const total = [
        [varA, covAB, 0],
        [covAB, varB, 0],
        [0, 0, 0],
      ]
      const benchmark = [0.5, 0.5, 0]
      const against = total.map((row) => row.reduce((a, c, j) => a + c * benchmark[j]!, 0))
      const own = against.reduce((a, c, i) => a + c * benchmark[i]!, 0)
      const C = total.flatMap((row, i) => row.map((c, j) => c - against[i]! - against[j]! + own))
      return decompose(matrixModel(Float64Array.from(C), 3), weights).share!
    }
    let [low, high] = [0.0045, 0.2]
    for (let k = 0; k < 200; k++) {
      const middle = (low + high) / 2
      if (relative(middle)[0]! < printed['relative']![0]!) low = middle
      else high = middle
    }
    const share = relative(low)
    // and with own returns, the other convention, riskless cash has no share
    const plain = Float64Array.of(low, covAB, 0, covAB, varB, 0, 0, 0, 0)
    expect(decompose(matrixModel(plain, 3), weights).share![2]).toBe(0)
    return { relative: share }
  })

  example('tasche-inequalities', (inputs) => {
    const d = split(inputs)
    const withWithout = [0, 1, 2].map((i) => lostWithout(inputs, i))
    withWithout.forEach((lost, i) => {
      expect(lost).toBeLessThanOrEqual(d.contribution[i]!)
      expect(d.contribution[i]).toBeLessThanOrEqual(d.standAlone[i]!)
    })
    return {
      withWithout,
      euler: d.contribution,
      standAlone: d.standAlone,
      DI: 1 / d.diversificationRatio!,
      marginalDI: d.contribution.map((c, i) => c / d.standAlone[i]!),
    }
  })

  example('menchero-davis-identity', (inputs) => {
    const d = split(inputs)
    return {
      corrToPortfolio: d.correlation!,
      product: d.correlation!.map((r, i) => r * inputs.vol[i]! * inputs.weights[i]!),
    }
  })

  example('denault-riskless', (inputs) => {
    const C = covarianceOf([...inputs.vol, 0], [...inputs.corr.map((row) => [...row, 0]), [0, 0, 0, 1]])
    const leverage = inputs.leverage
    const weights = Float64Array.from([...inputs.weights.map((w) => w * leverage), 1 - leverage])
    const d = decompose(matrixModel(C, 4), weights)
    return {
      cashContribution: Math.abs(d.contribution[3]!),
      leveredRisk: d.volatility,
      shareUnchanged: d.share!.subarray(0, 3),
    }
  })

  example('negative-contribution', (inputs) => {
    const d = split(inputs)
    return { risk: d.volatility, contribution: d.contribution, share: d.share! }
  })

  example('market-neutral-unstable-shares', (inputs) => {
    const each = inputs.corrs.map((rho) => split({ ...inputs, corr: correlated(rho) }))
    return { risk: each.map((d) => d.volatility), share1: each.map((d) => d.share![0]!) }
  })

  example('concentration-of-contributions', (inputs) => ({
    inverseHerfindahl: split(inputs).effectiveNumber!,
  }))

  example<{ vol: number[]; corr: number; decay: number; p0: number[]; p1: number[] }>(
    'hull-ewma-problem',
    (inputs) => {
      // The update C1 = 0.95 C0 + 0.05 r r' of the book, with this project's simple returns and correlation form.
      const prices = Float64Array.from([...inputs.p0, ...inputs.p1])
      const r = simpleReturns(prices, 2, 2)
      const decay = inputs.decay
      const C0 = covarianceOf(inputs.vol, correlated(inputs.corr))
      const C1 = C0.map((c, k) => decay * c + (1 - decay) * r[k >> 1]! * r[k & 1]!)
      const d = decompose(matrixModel(C1, 2), Float64Array.of(1, 0))
      // correlation of the second with a portfolio of the first alone
      return { cov0: C0[1]!, corr: d.correlation![1]! }
    },
  )

  example<{ decay: number[]; tolerance: number[] }>('ewma-effective-days', (inputs) => {
    // share of the weight older than K dates is decay^K: read off the model's own weights of 3000 dates
    const days = inputs.decay.map((decay, k) => {
      const { rowWeights } = returnsModel(
        Float64Array.from({ length: 3000 }, (_, t) => t),
        3000,
        1,
        {
          kind: 'exponential',
          decay,
        },
      )
      const limit = inputs.tolerance[k]!
      let older = 1
      let count = 0
      let before = older
      for (let t = 2999; older > limit; t--, count++) {
        before = older
        older -= rowWeights[t]!
      }
      // between whole dates the share falls as a power
      return count - 1 + Math.log(limit / before) / Math.log(older / before)
    })
    return { days }
  })
})

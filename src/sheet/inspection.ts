import { decompose, Fault } from '../core'
import type { RiskModel } from '../core'
import type { Blocks } from './book-model'
import { modelChoices, modelOf } from './book-model'
import type { Calculator, Work } from './calculator'
import type { Check, Correction, SeriesFacts } from './checks'
import { checksOf, factsInput } from './checks'
import { currencyKey } from './currency'
import { explain } from './explain'
import type { ReturnsReading } from './returns'
import type { Settings } from './settings'

/** A fault suspected in the data, and what the volatility would be with it mended. */
export interface CheckLine {
  readonly check: Check
  readonly corrections: readonly CorrectedVolatility[]
}

export interface CorrectedVolatility {
  readonly label: string
  /** the choice that does it, where one does */
  readonly change: Partial<Settings> | null
  /** scaled as the figures are; a sentence where it could not be computed */
  readonly volatility: number | string
}

/**
 * Looks over the data of one book, again and again as weights and choices change. What depends on the returns alone is computed once: the
 * statistics of the series, and the models of the corrections, so that a new weight costs one pass for each of these.
 */
export class Inspection {
  #facts: { returns: ReturnsReading; key: string; facts: SeriesFacts | null } | null = null
  #found: { of: readonly unknown[]; checks: readonly Check[] } | null = null
  readonly #models = new Map<string, RiskModel | string>()
  #modelsOf: { returns: ReturnsReading; key: string } | null = null

  /**
   * What may be wrong with the data.
   *
   * @throws Fault "cancelled"
   */
  async checks(
    blocks: Blocks,
    settings: Settings,
    calculator: Calculator,
    work: Work,
  ): Promise<readonly Check[]> {
    const facts = await this.#factsOf(blocks.returns, settings, calculator, work)
    const { match, holdings, returns } = blocks
    const of = [facts, match, holdings, returns, settings]
    if (!this.#found || of.some((part, k) => part !== this.#found?.of[k]))
      this.#found = { of, checks: facts === null ? [] : checksOf(blocks, settings, facts) }
    return this.#found.checks
  }

  /**
   * The same, with the volatility that each correction gives.
   *
   * @throws Fault "cancelled"
   */
  async lines(
    blocks: Blocks,
    settings: Settings,
    calculator: Calculator,
    work: Work,
  ): Promise<readonly CheckLine[]> {
    const checks = await this.checks(blocks, settings, calculator, work)
    const key = JSON.stringify([
      modelChoices(settings),
      [...blocks.match.seriesOf],
      currencyKey(blocks.match.currencies),
    ])
    if (this.#modelsOf?.returns !== blocks.returns || this.#modelsOf.key !== key) this.#models.clear()
    this.#modelsOf = { returns: blocks.returns, key }

    const weights = Float64Array.from(blocks.holdings.holdings, ({ weight }) => weight)
    const scale = Math.sqrt(settings.periodsPerYear ?? blocks.returns.proposedPeriodsPerYear ?? 1)
    const lines: CheckLine[] = []
    for (const check of checks) {
      const corrections: CorrectedVolatility[] = []
      for (const correction of check.corrections) {
        const model = await this.#modelOf(check, correction, blocks, settings, calculator, work)
        const { label, change } = correction
        corrections.push({
          label,
          change,
          volatility: typeof model === 'string' ? model : decompose(model, weights).volatility * scale,
        })
      }
      lines.push({ check, corrections })
    }
    return lines
  }

  async #factsOf(
    returns: ReturnsReading,
    settings: Settings,
    calculator: Calculator,
    work: Work,
  ): Promise<SeriesFacts | null> {
    const key = JSON.stringify([settings.lookBack, settings.periodsPerYear])
    if (this.#facts?.returns === returns && this.#facts.key === key) return this.#facts.facts
    const input = factsInput(returns, settings)
    const facts = input && (await calculator.run('series facts', input, work))
    this.#facts = { returns, key, facts }
    return facts
  }

  async #modelOf(
    check: Check,
    { label, change, returns }: Correction,
    blocks: Blocks,
    settings: Settings,
    calculator: Calculator,
    work: Work,
  ): Promise<RiskModel | string> {
    // a choice says itself what it does; corrected returns belong to the series they correct
    const key = change ? JSON.stringify(change) : `${check.kind} ${label} ${check.names.join('\n')}`
    const known = this.#models.get(key)
    if (known !== undefined) return known
    let model: RiskModel | string
    try {
      const corrected = returns ? { ...blocks, returns: returns() } : blocks
      const book = await modelOf(
        corrected,
        modelChoices({ ...settings, ...change }),
        calculator,
        work,
        'model alone',
      )
      model = book.model
    } catch (fault) {
      if (!(fault instanceof Fault) || fault.code === 'cancelled') throw fault
      model = explain(fault, () => '')
    }
    this.#models.set(key, model)
    return model
  }
}

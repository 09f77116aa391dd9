import {
  decompose,
  estimateModel,
  inOneGo,
  matrixModel,
  riskBudgetWeights,
  type BudgetWeights,
  type Decomposition,
  type EstimatedModel,
  type Estimator,
  type RiskModel,
} from '../core'
import { panelOf, type Cells, type Panel } from './blocks'

/** A block read once: its numbers, and the models and decompositions made of them so far. */
export interface KeptBlock {
  readonly panel: Panel
  /** @throws Fault those of the models */
  model(estimator: Estimator): RiskModel
  /** The same, where the block holds returns. */
  estimated(estimator: Estimator): EstimatedModel | null
  /** @throws Fault those of the models and of `decompose` */
  decomposition(estimator: Estimator, weights: Float64Array): Decomposition
  /** @throws Fault those of the models and of `riskBudgetWeights` */
  budgetWeights(estimator: Estimator, budgets: Float64Array): BudgetWeights
}

interface Entry extends KeptBlock {
  readonly cells: CellsCopy
  bytes(): number
}

const MOST_BLOCKS = 8
const MOST_BYTES = 256e6
const MOST_MODELS = 4
const MOST_DECOMPOSITIONS = 4

/**
 * Keeps the blocks seen last, so that many cells over one block read and centre it once. A host hands over fresh arrays at every
 * call, so a block is known again by its content: every cell is compared, which stops at the first that differs, and a hash would
 * have to read them all before the same comparison. At most 8 blocks or 256 MB are kept, but always the newest.
 */
export function blockMemo(): (argument: string, cells: Cells) => KeptBlock {
  let kept: Entry[] = []
  return (argument, cells) => {
    const known = kept.find((entry) => entry.cells.equal(cells))
    const entry = known ?? entryOf(panelOf(argument, cells, 'returns'), new CellsCopy(cells))
    kept = [entry, ...kept.filter((other) => other !== entry)].slice(0, MOST_BLOCKS)
    let bytes = 0
    kept = kept.filter((other, age) => (bytes += other.bytes()) <= MOST_BYTES || age === 0)
    return entry
  }
}

function entryOf(panel: Panel, cells: CellsCopy): Entry {
  let models: {
    readonly key: string
    readonly model: RiskModel
    readonly estimated: EstimatedModel | null
    seen: Decomposition[]
    budgeted: { readonly budgets: Float64Array; readonly weights: BudgetWeights }[]
  }[] = []
  const made = (estimator: Estimator) => {
    const key = JSON.stringify(estimator)
    const { kind, values, rows, columns } = panel
    const known = models.find((other) => other.key === key)
    const estimated = known || kind === 'covariance' ? null : estimateModel(values, rows, columns, estimator)
    const one = known ?? {
      key,
      model: estimated ?? matrixModel(values, columns),
      estimated,
      seen: [],
      budgeted: [],
    }
    models = [one, ...models.filter((other) => other !== one)].slice(0, MOST_MODELS)
    return one
  }
  return {
    panel,
    cells,
    bytes: () => cells.bytes + panel.values.byteLength * (1 + models.length),
    model: (estimator) => made(estimator).model,
    estimated: (estimator) => made(estimator).estimated,
    decomposition(estimator, weights) {
      const one = made(estimator)
      const known = one.seen.find((d) => d.weights.every((weight, k) => weight === weights[k]))
      const d = known ?? decompose(one.model, weights)
      one.seen = [d, ...one.seen.filter((other) => other !== d)].slice(0, MOST_DECOMPOSITIONS)
      return d
    },
    budgetWeights(estimator, budgets) {
      const one = made(estimator)
      const known = one.budgeted.find((other) => other.budgets.every((budget, k) => budget === budgets[k]))
      const found = known ?? { budgets, weights: inOneGo(riskBudgetWeights(one.model, budgets)) }
      one.budgeted = [found, ...one.budgeted.filter((other) => other !== found)].slice(0, MOST_DECOMPOSITIONS)
      return found.weights
    },
  }
}

/** A copy of a block's cells to compare others with: numbers packed, the few others aside. */
class CellsCopy {
  readonly #columns: number
  readonly #numbers: Float64Array
  readonly #others = new Map<number, unknown>()

  constructor(cells: Cells) {
    this.#columns = cells[0]!.length
    this.#numbers = new Float64Array(cells.length * this.#columns)
    let k = 0
    for (const row of cells) {
      for (const value of row) {
        if (typeof value === 'number') this.#numbers[k] = value
        else {
          this.#numbers[k] = NaN
          this.#others.set(k, value)
        }
        k++
      }
    }
  }

  get bytes(): number {
    return this.#numbers.byteLength
  }

  equal(cells: Cells): boolean {
    const columns = this.#columns
    const first = cells[0]!
    if (first.length !== columns || cells.length * columns !== this.#numbers.length) return false
    // the row of names apart: where text and numbers meet in one loop, engines box every number they look at
    if (!first.every((value, c) => this.#holds(c, value))) return false
    for (let r = 1, k = columns; r < cells.length; r++) {
      const row = cells[r]!
      for (let c = 0; c < columns; c++, k++) {
        if (row[c] !== this.#numbers[k] && !this.#holds(k, row[c])) return false
      }
    }
    return true
  }

  #holds(k: number, value: unknown): boolean {
    return value === this.#numbers[k] || (this.#others.has(k) && this.#others.get(k) === value)
  }
}

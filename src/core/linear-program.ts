/**
 * Linear programs of few rows and many bounded columns, as the linearised limits of a portfolio are: a dozen limits over hundreds of
 * positions. Bounds cost nothing here; in a solver that takes them for rows, a thousand columns would be a thousand rows more.
 */

export interface LinearProgram {
  /** m */
  readonly rows: number
  /** m numbers for each column, one column after another. */
  readonly columns: Float64Array
  readonly costs: Float64Array
  /** Of each column; -Infinity and Infinity are none. */
  readonly lower: Float64Array
  readonly upper: Float64Array
  /** Of each row: A x <= most, or A x = most. */
  readonly most: Float64Array
  /** 1 for the rows that are equations; m */
  readonly equal: Uint8Array
  /** 1 for the rows whose excess is brought down before that of the others; m */
  readonly first: Uint8Array
}

export interface LeastCost {
  /**
   * "optimal": least excess over the first rows, then over the others, then least cost. "unbounded": the cost has no least value.
   * "stopped": the bound on pivots was reached.
   */
  readonly status: 'optimal' | 'unbounded' | 'stopped'
  readonly x: Float64Array
  /** sum of costs x; excess has no part in it */
  readonly cost: number
  /** How far each row is over (an equation: away from) its figure; all 0 where the program has a solution. m */
  readonly excess: Float64Array
  /** What one unit more of each `most` would save of the cost; 0 or more for inequalities. m */
  readonly savings: Float64Array
  readonly pivots: number
}

const PIVOT = 1e-10
const GAIN = 1e-10
/** How far a basic variable may be beyond its bound while rows are chosen for a pivot (Harris). */
const SLACK = 1e-11
/** Pivots after which the inverse is made anew. */
const REFRESH = 100
/** Multiplications between two yields: some milliseconds. */
const STINT = 4e6

/**
 * The least cost of a linear program by the bounded-variable primal simplex method, and where it has no solution, the point
 * of least excess: three objectives one after another, each kept while the next is minimised.
 *
 *   minimise c'x  over  A x <= b (or = b),  lower <= x <= upper
 *
 * The inverse of the basis is kept outright, m x m. Where degenerate pivots go on, the least index enters (Bland), so that none goes round in circles.
 *
 * @returns  always; a bound on pivots holds. Yields the share of the three objectives that is behind
 * @source   Dantzig (1963), Linear Programming and Extensions, chapter 18 (upper bounds); Harris (1973), Mathematical Programming 5, 1-28 (choice of
 *           the row); Bland (1977), Mathematics of Operations Research 2(2), 103-107 (all from memory)
 * @cost     O(m (m + columns)) a pivot
 * @example  inOneGo(leastCost({ rows: 1, columns: Float64Array.of(-1, -2), costs: Float64Array.of(1, 1), lower: Float64Array.of(0, 0), upper: Float64Array.of(9, 2), most: Float64Array.of(-5), equal: Uint8Array.of(0), first: Uint8Array.of(0) })).x // [1, 2]
 */
export function* leastCost(program: LinearProgram): Generator<number, LeastCost> {
  const { rows: m, columns, costs, most, equal, first } = program
  const count = costs.length
  // behind the columns stand, for each row: its slack, its excess, and for an equation what it falls short by
  const total = count + 3 * m
  const lower = new Float64Array(total)
  const upper = new Float64Array(total).fill(Infinity)
  lower.set(program.lower)
  upper.set(program.upper)
  for (let r = 0; r < m; r++) {
    if (equal[r]) upper[count + r] = 0
    else upper[count + 2 * m + r] = 0
  }
  const signOf = (j: number) => (j >= count + m && j < count + 2 * m ? -1 : 1)

  const x = new Float64Array(total)
  const basic = new Uint8Array(total)
  const basis = new Int32Array(m)
  const inverse = new Float64Array(m * m)
  for (let j = 0; j < count; j++) {
    // the bound nearest to 0; a column without bounds stays at 0 until it enters
    const bound = Math.abs(lower[j]!) <= Math.abs(upper[j]!) ? lower[j]! : upper[j]!
    x[j] = Number.isFinite(bound) ? bound : 0
  }
  const left = leftOver()
  for (let r = 0; r < m; r++) {
    const j = left[r]! < 0 ? count + m + r : equal[r] ? count + 2 * m + r : count + r
    basis[r] = j
    basic[j] = 1
    x[j] = Math.abs(left[r]!)
    inverse[r * m + r] = signOf(j)
  }

  const prices = new Float64Array(m)
  const direction = new Float64Array(m)
  let pivots = 0
  let sinceRefresh = 0
  let work = 0
  let still = 0
  let lookedAt = -1
  const mostPivots = 200 + 20 * (m + count)

  const goal = new Float64Array(total)
  let status: LeastCost['status'] = 'optimal'
  for (const stage of [0, 1, 2]) {
    goal.fill(0)
    if (stage === 2) goal.set(costs)
    else {
      for (let r = 0; r < m; r++) {
        if (first[r] === (stage === 0 ? 1 : 0)) goal[count + m + r] = goal[count + 2 * m + r] = 1
      }
    }
    for (;;) {
      const ended = minimise(stage === 2)
      if (ended === null) {
        yield stage / 3
        continue
      }
      status = ended
      break
    }
    if (status !== 'optimal') break
    for (let j = count + m; stage < 2 && j < total; j++) {
      if (goal[j]) upper[j] = Math.min(upper[j]!, Math.max(0, x[j]!))
    }
  }

  const excess = new Float64Array(m)
  for (let r = 0; r < m; r++) excess[r] = Math.max(0, x[count + m + r]! + x[count + 2 * m + r]!)
  let cost = 0
  for (let j = 0; j < count; j++) cost += costs[j]! * x[j]!
  return { status, x: x.slice(0, count), cost, excess, savings: prices.map((price) => -price), pivots }

  /** b - A x of the columns that are not basic. */
  function leftOver(): Float64Array {
    const rest = most.slice()
    for (let j = 0; j < count; j++) {
      const value = x[j]!
      if (basic[j] || value === 0) continue
      for (let r = 0, k = j * m; r < m; r++, k++) rest[r] = rest[r]! - columns[k]! * value
    }
    for (let j = count; j < total; j++) {
      if (!basic[j] && x[j] !== 0) rest[(j - count) % m]! -= signOf(j) * x[j]!
    }
    return rest
  }

  /** Pivots until the goal is least; null: for now. */
  function minimise(last: boolean): LeastCost['status'] | null {
    for (work = 0; work < STINT;) {
      if (pivots >= mostPivots) return 'stopped'
      prices.fill(0)
      for (let r = 0; r < m; r++) {
        const c = goal[basis[r]!]!
        if (c !== 0) for (let k = 0; k < m; k++) prices[k] = prices[k]! + c * inverse[r * m + k]!
      }
      const entering = choose(still > 20 + m)
      if (entering < 0) {
        // what is called optimal rests on fresh numbers
        if (sinceRefresh === 0 || (!last && sinceRefresh < REFRESH / 4)) return 'optimal'
        refresh()
        continue
      }
      const step = exchange(entering)
      if (step === Infinity) return 'unbounded'
      pivots++
      still = step > 1e-13 ? 0 : still + 1
      work += m * (total + 2 * m)
      if (++sinceRefresh >= REFRESH) refresh()
    }
    return null
  }

  function reducedCost(j: number): number {
    let d = goal[j]!
    if (j < count) for (let r = 0, k = j * m; r < m; r++, k++) d -= prices[r]! * columns[k]!
    else d -= prices[(j - count) % m]! * signOf(j)
    return d
  }

  /** The column that lowers the goal fastest among the next eighth of them, or of all where none there does; or the first that lowers it at all. */
  function choose(leastIndex: boolean): number {
    let best = -1
    let most = GAIN
    const enough = total / 8
    for (let seen = 0; seen < total; seen++) {
      const j = leastIndex ? seen : lookedAt < total - 1 ? ++lookedAt : (lookedAt = 0)
      if (!basic[j] && lower[j]! < upper[j]!) {
        const d = reducedCost(j)
        const gain = d < 0 ? (x[j]! < upper[j]! ? -d : 0) : x[j]! > lower[j]! ? d : 0
        if (gain > most) {
          if (leastIndex) return j
          most = gain
          best = j
        }
      }
      if (best >= 0 && seen >= enough) break
    }
    return best
  }

  /** Moves one column as far as bounds allow, and in or out of the basis; how far it went. */
  function exchange(entering: number): number {
    const up = reducedCost(entering) < 0 ? 1 : -1
    for (let r = 0; r < m; r++) {
      let sum = 0
      if (entering < count) {
        for (let k = 0; k < m; k++) sum += inverse[r * m + k]! * columns[entering * m + k]!
      } else sum = inverse[r * m + ((entering - count) % m)]! * signOf(entering)
      direction[r] = sum
    }
    const room = (r: number, slack: number) => {
      const slope = -up * direction[r]!
      const j = basis[r]!
      if (slope > PIVOT) return (upper[j]! + slack - x[j]!) / slope
      return slope < -PIVOT ? (lower[j]! - slack - x[j]!) / slope : Infinity
    }
    let reach = Infinity
    for (let r = 0; r < m; r++) reach = Math.min(reach, room(r, SLACK))
    const flip = upper[entering]! - lower[entering]!
    let leaving = -1
    let step = flip
    if (reach < flip) {
      let largest = 0
      for (let r = 0; r < m; r++) {
        if (Math.abs(direction[r]!) > largest && room(r, 0) <= reach) {
          largest = Math.abs(direction[r]!)
          leaving = r
        }
      }
      step = Math.max(0, room(leaving, 0))
    }
    if (step === Infinity) return step
    for (let r = 0; r < m; r++) x[basis[r]!] = x[basis[r]!]! - up * step * direction[r]!
    if (leaving < 0) {
      x[entering] = up > 0 ? upper[entering]! : lower[entering]!
      return step
    }
    x[entering] = x[entering]! + up * step
    const out = basis[leaving]!
    x[out] = -up * direction[leaving]! > 0 ? upper[out]! : lower[out]!
    basic[out] = 0
    basic[entering] = 1
    basis[leaving] = entering
    const pivot = 1 / direction[leaving]!
    for (let k = 0; k < m; k++) inverse[leaving * m + k] = inverse[leaving * m + k]! * pivot
    for (let r = 0; r < m; r++) {
      const factor = direction[r]!
      if (r === leaving || factor === 0) continue
      for (let k = 0; k < m; k++)
        inverse[r * m + k] = inverse[r * m + k]! - factor * inverse[leaving * m + k]!
    }
    return step
  }

  /** The inverse and the basic variables anew from the columns, against rounding that builds up. */
  function refresh(): void {
    sinceRefresh = 0
    work += m * m * m
    const width = 2 * m
    const table = new Float64Array(m * width)
    for (let r = 0; r < m; r++) {
      const j = basis[r]!
      if (j < count) for (let k = 0; k < m; k++) table[k * width + r] = columns[j * m + k]!
      else table[((j - count) % m) * width + r] = signOf(j)
      table[r * width + m + r] = 1
    }
    for (let c = 0; c < m; c++) {
      let at = c
      for (let r = c + 1; r < m; r++) {
        if (Math.abs(table[r * width + c]!) > Math.abs(table[at * width + c]!)) at = r
      }
      const pivot = table[at * width + c]!
      // pivots are bounded away from 0, so this is rounding's doing; the inverse at hand is the better one
      if (Math.abs(pivot) < 1e-14) return
      for (let k = 0; k < width; k++) {
        const here = table[at * width + k]! / pivot
        table[at * width + k] = table[c * width + k]!
        table[c * width + k] = here
      }
      for (let r = 0; r < m; r++) {
        const factor = table[r * width + c]!
        if (r === c || factor === 0) continue
        for (let k = c; k < width; k++)
          table[r * width + k] = table[r * width + k]! - factor * table[c * width + k]!
      }
    }
    for (let r = 0; r < m; r++) for (let k = 0; k < m; k++) inverse[r * m + k] = table[r * width + m + k]!
    const rest = leftOver()
    for (let r = 0; r < m; r++) {
      let sum = 0
      for (let k = 0; k < m; k++) sum += inverse[r * m + k]! * rest[k]!
      x[basis[r]!] = sum
    }
  }
}

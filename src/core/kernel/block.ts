/// <reference path="./module.d.ts" />
import bytes from './passes.as'

/** The two forms of the kernel: WebAssembly with SIMD, and plain TypeScript where that does not compile. */
export type KernelForm = 'simd' | 'plain'

/**
 * A centred block of returns Z, T x n, laid out for the kernel in memory of its own.
 *
 * Write every row once, then ask as often as needed. Every question about weights or dates reads the block once: O(T n).
 */
export interface Block {
  readonly form: KernelForm
  /** Sets row t to z and its multiplier to k. */
  write(date: number, z: Float64Array, multiplier: number): void
  /** Row t as it was written; n, a copy. */
  read(date: number, into?: Float64Array): Float64Array
  /** For weights w: y = Z w, g = Z'K y and v = y'K y, K = diag(k). */
  pass(weights: Float64Array, marginalsInto?: Float64Array): Pass
  /** y of the same pass; T. */
  portfolio(weights: Float64Array, marginalsInto?: Float64Array): Float64Array
  /** Z'a for a number a_t of each date (T): the sum of a_t z_t; n. Multipliers do not count. */
  weigh(perDate: Float64Array, into?: Float64Array): Float64Array
  /** For two numbers of each date, q_t and a_t: the sums of q_t z_ti^2 and of a_t z_ti. Multipliers do not count. */
  squares(perDateOfSquares: Float64Array, perDate: Float64Array): Sums
  /**
   * The products z_s'z_t of four rows, s = 4 first .., with four, t = 4 second ..; 4 x 4, zeros for rows past the last.
   * Reads those eight rows alone: O(n). Multipliers do not count. Overwritten by the next call.
   */
  products(first: number, second: number): Float64Array
}

export interface Pass {
  /** g, one for each position. */
  readonly marginals: Float64Array
  /** v */
  readonly variance: number
}

/** Sums over dates, one of each for every position. */
export interface Sums {
  /** sum of q_t z_ti^2 */
  readonly squares: Float64Array
  /** sum of a_t z_ti */
  readonly sums: Float64Array
}

/** The little of WebAssembly that is used here; `lib` of this folder is the language alone. */
interface WebAssemblyHost {
  readonly Module: new (bytes: Uint8Array) => object
  readonly Memory: new (size: { initial: number; maximum: number }) => { readonly buffer: ArrayBuffer }
  readonly Instance: new (
    module: object,
    imports: { env: { memory: object } },
  ) => { readonly exports: object }
}

/** What passes.as exports; all arguments but the counts, which come last, are byte offsets into the block's memory. */
interface Passes {
  onePass(z: number, w: number, k: number, y: number, g: number, rows: number, stride: number): number
  weigh(z: number, a: number, g: number, rows: number, stride: number): void
  squares(z: number, q: number, a: number, s: number, g: number, rows: number, stride: number): void
  products(z: number, o: number, x: number, stride: number): void
}

const webAssembly = (globalThis as { readonly WebAssembly?: WebAssemblyHost }).WebAssembly

// Compiling is the only true test: validate() also says yes under a content security policy that then refuses.
const compiled: object | undefined = (() => {
  try {
    return webAssembly && new webAssembly.Module(bytes)
  } catch {
    return undefined
  }
})()

/** The form that new blocks take in this host. */
export const kernelForm: KernelForm = compiled ? 'simd' : 'plain'

const pageBytes = 65536
const roundUp = (count: number, multiple: number) => Math.ceil(count / multiple) * multiple

/**
 * Opens a block of zeros. The SIMD form gets a memory of exactly its size that never grows, so its views stay
 * attached and the garbage collector frees block and memory together; when the host refuses that memory (or the
 * module), the block is an ordinary array and takes the plain form, which `form` reports.
 *
 * Layout: rows padded with zeros to a multiple of 4 numbers (`stride`) and the block to a multiple of 4 rows.
 * Padding changes no sum and spares the kernel all leftovers. Four rows are interleaved two numbers at a time,
 *   z[t][i] at (t>>2) 4 stride + (i>>1) 8 + (t&3) 2 + (i&1),
 * so that the kernel reads one straight stream. Behind the block: w, g, s (by position), k, y, q, a (by date), x (16 products).
 */
export function openBlock(dates: number, size: number, wanted: KernelForm = kernelForm): Block {
  const rows = roundUp(dates, 4)
  const stride = roundUp(size, 4)
  const w = rows * stride
  const g = w + stride
  const s = g + stride
  const k = s + stride
  const y = k + rows
  const q = y + rows
  const a = q + rows
  const x = a + rows
  const total = x + 16

  const kernel = wanted === 'simd' ? simdKernel(total) : undefined
  const numbers = kernel?.numbers ?? new Float64Array(total)
  const passes = kernel?.passes ?? plainPasses(numbers)
  const weightsAt = numbers.subarray(w, w + size)
  const sumsAt = numbers.subarray(g, g + size)
  const squaresAt = numbers.subarray(s, s + size)
  // a copy of a view costs a microsecond, a slice of the whole memory forty
  const portfolioAt = numbers.subarray(y, y + dates)
  const productsAt = numbers.subarray(x, x + 16)
  const run = (weights: Float64Array) => {
    weightsAt.set(weights)
    sumsAt.fill(0)
    return passes.onePass(0, w * 8, k * 8, y * 8, g * 8, rows, stride)
  }
  const rowStart = (date: number) => (date >> 2) * 4 * stride + (date & 3) * 2

  return {
    form: kernel ? 'simd' : 'plain',
    write(date, z, multiplier) {
      const start = rowStart(date)
      for (let i = 0; i < size; i++) numbers[start + (i >> 1) * 8 + (i & 1)] = z[i]!
      numbers[k + date] = multiplier
    },
    read(date, z = new Float64Array(size)) {
      const start = rowStart(date)
      for (let i = 0; i < size; i++) z[i] = numbers[start + (i >> 1) * 8 + (i & 1)]!
      return z
    },
    pass: (weights, marginals = new Float64Array(size)) => {
      const variance = run(weights)
      marginals.set(sumsAt)
      return { marginals, variance }
    },
    portfolio: (weights, marginals) => {
      run(weights)
      marginals?.set(sumsAt)
      return portfolioAt.slice()
    },
    weigh: (perDate, into = new Float64Array(size)) => {
      // by `set` at fixed places, never longer than the dates: the numbers of padding rows stay 0
      numbers.set(perDate, a)
      sumsAt.fill(0)
      passes.weigh(0, a * 8, g * 8, rows, stride)
      into.set(sumsAt)
      return into
    },
    squares: (perDateOfSquares, perDate) => {
      numbers.set(perDateOfSquares, q)
      numbers.set(perDate, a)
      sumsAt.fill(0)
      squaresAt.fill(0)
      passes.squares(0, q * 8, a * 8, s * 8, g * 8, rows, stride)
      return { squares: squaresAt.slice(), sums: sumsAt.slice() }
    },
    products: (first, second) => {
      passes.products(first * 32 * stride, second * 32 * stride, x * 8, stride)
      return productsAt
    },
  }
}

function simdKernel(total: number) {
  if (!webAssembly || !compiled) return undefined
  try {
    const pages = Math.ceil((total * 8) / pageBytes)
    const memory = new webAssembly.Memory({ initial: pages, maximum: pages })
    const passes = new webAssembly.Instance(compiled, { env: { memory } }).exports as Passes
    return { numbers: new Float64Array(memory.buffer, 0, total), passes }
  } catch {
    return undefined
  }
}

/** passes.as, operation for operation, so that the two forms give the same bits. */
function plainPasses(numbers: Float64Array): Passes {
  /** `count` numbers from a byte offset */
  const at = (bytes: number, count: number) => numbers.subarray(bytes / 8, bytes / 8 + count)

  return {
    onePass(zBytes, wBytes, kBytes, yBytes, gBytes, rows, stride) {
      const z = at(zBytes, rows * stride)
      const w = at(wBytes, stride)
      const k = at(kBytes, rows)
      const y = at(yBytes, rows)
      const g = at(gBytes, stride)
      let variance = 0
      let lost = 0
      for (let t = 0; t < rows; t += 4) {
        const tile = z.subarray(t * stride, (t + 4) * stride)
        // one sum over even and one over odd columns for each row: the two lanes of the SIMD form
        let even0 = 0
        let even1 = 0
        let even2 = 0
        let even3 = 0
        let odd0 = 0
        let odd1 = 0
        let odd2 = 0
        let odd3 = 0
        for (let i = 0, p = 0; i < stride; i += 2, p += 8) {
          const even = w[i]!
          const odd = w[i + 1]!
          even0 += tile[p]! * even
          odd0 += tile[p + 1]! * odd
          even1 += tile[p + 2]! * even
          odd1 += tile[p + 3]! * odd
          even2 += tile[p + 4]! * even
          odd2 += tile[p + 5]! * odd
          even3 += tile[p + 6]! * even
          odd3 += tile[p + 7]! * odd
        }
        const y0 = (y[t] = even0 + odd0)
        const y1 = (y[t + 1] = even1 + odd1)
        const y2 = (y[t + 2] = even2 + odd2)
        const y3 = (y[t + 3] = even3 + odd3)
        const s0 = k[t]! * y0
        const s1 = k[t + 1]! * y1
        const s2 = k[t + 2]! * y2
        const s3 = k[t + 3]! * y3
        const term = s0 * y0 + s1 * y1 + s2 * y2 + s3 * y3 - lost
        const sum = variance + term
        lost = sum - variance - term
        variance = sum
        addRows(tile, g, s0, s1, s2, s3)
      }
      return variance
    },
    weigh(zBytes, aBytes, gBytes, rows, stride) {
      const z = at(zBytes, rows * stride)
      const a = at(aBytes, rows)
      const g = at(gBytes, stride)
      for (let t = 0; t < rows; t += 4) {
        const tile = z.subarray(t * stride, (t + 4) * stride)
        addRows(tile, g, a[t]!, a[t + 1]!, a[t + 2]!, a[t + 3]!)
      }
    },
    squares(zBytes, qBytes, aBytes, sBytes, gBytes, rows, stride) {
      const z = at(zBytes, rows * stride)
      const q = at(qBytes, rows)
      const a = at(aBytes, rows)
      const s = at(sBytes, stride)
      const g = at(gBytes, stride)
      for (let t = 0; t < rows; t += 4) {
        const tile = z.subarray(t * stride, (t + 4) * stride)
        const q0 = q[t]!
        const q1 = q[t + 1]!
        const q2 = q[t + 2]!
        const q3 = q[t + 3]!
        for (let i = 0; i < stride; i++) {
          const p = (i >> 1) * 8 + (i & 1)
          const z0 = tile[p]!
          const z1 = tile[p + 2]!
          const z2 = tile[p + 4]!
          const z3 = tile[p + 6]!
          s[i] = s[i]! + z0 * q0 * z0 + z1 * q1 * z1 + z2 * q2 * z2 + z3 * q3 * z3
        }
        addRows(tile, g, a[t]!, a[t + 1]!, a[t + 2]!, a[t + 3]!)
      }
    },
    products(zBytes, oBytes, xBytes, stride) {
      const z = at(zBytes, 4 * stride)
      const o = at(oBytes, 4 * stride)
      const x = at(xBytes, 16)
      for (let r = 0; r < 4; r++) {
        let even0 = 0
        let even1 = 0
        let even2 = 0
        let even3 = 0
        let odd0 = 0
        let odd1 = 0
        let odd2 = 0
        let odd3 = 0
        for (let p = 0; p < o.length; p += 8) {
          const even = z[p + 2 * r]!
          const odd = z[p + 2 * r + 1]!
          even0 += o[p]! * even
          odd0 += o[p + 1]! * odd
          even1 += o[p + 2]! * even
          odd1 += o[p + 3]! * odd
          even2 += o[p + 4]! * even
          odd2 += o[p + 5]! * odd
          even3 += o[p + 6]! * even
          odd3 += o[p + 7]! * odd
        }
        x[4 * r] = even0 + odd0
        x[4 * r + 1] = even1 + odd1
        x[4 * r + 2] = even2 + odd2
        x[4 * r + 3] = even3 + odd3
      }
    },
  }
}

/** Four rows, each times its number, into one sum for each position. */
function addRows(tile: Float64Array, g: Float64Array, s0: number, s1: number, s2: number, s3: number): void {
  for (let i = 0, p = 0; i < g.length; i += 2, p += 8) {
    g[i] = g[i]! + tile[p]! * s0 + tile[p + 2]! * s1 + tile[p + 4]! * s2 + tile[p + 6]! * s3
    g[i + 1] = g[i + 1]! + tile[p + 1]! * s0 + tile[p + 3]! * s1 + tile[p + 5]! * s2 + tile[p + 7]! * s3
  }
}

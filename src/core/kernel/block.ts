/// <reference path="./module.d.ts" />
import bytes from './one-pass.as'

/** The two forms of the one-pass kernel: WebAssembly with SIMD, and plain TypeScript where that does not compile. */
export type KernelForm = 'simd' | 'plain'

/**
 * A centred block of returns, T x n, laid out for the one-pass kernel in memory of its own.
 *
 * Write every row once, then call `pass` as often as needed.
 */
export interface Block {
  readonly form: KernelForm
  /** Sets row t to z and its multiplier to k. */
  write(date: number, z: Float64Array, multiplier: number): void
  /** Row t as it was written; n, a copy. */
  read(date: number): Float64Array
  /** For weights w: y = Z w, g = Z'K y and v = y'K y, K = diag(k). Reads the block once; O(T n). */
  pass(weights: Float64Array, marginalsInto?: Float64Array): Pass
  /** y of the same pass; T. */
  portfolio(weights: Float64Array): Float64Array
}

export interface Pass {
  /** g, one for each position. */
  readonly marginals: Float64Array
  /** v */
  readonly variance: number
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

interface KernelExports {
  onePass(z: number, w: number, k: number, y: number, g: number, rows: number, stride: number): number
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
 * so that the kernel reads one straight stream. Behind the block: w, g, k, y.
 */
export function openBlock(dates: number, size: number, wanted: KernelForm = kernelForm): Block {
  const rows = roundUp(dates, 4)
  const stride = roundUp(size, 4)
  const w = rows * stride
  const g = w + stride
  const k = g + stride
  const y = k + rows
  const total = y + rows

  const kernel = wanted === 'simd' ? simdKernel(total) : undefined
  const numbers = kernel?.numbers ?? new Float64Array(total)
  const onePass = kernel?.onePass ?? ((...at) => plainOnePass(numbers, ...at))
  const weightsAt = numbers.subarray(w, w + size)
  const marginalsAt = numbers.subarray(g, g + size)
  const run = (weights: Float64Array) => {
    weightsAt.set(weights)
    marginalsAt.fill(0)
    return onePass(0, w * 8, k * 8, y * 8, g * 8, rows, stride)
  }
  const rowStart = (date: number) => (date >> 2) * 4 * stride + (date & 3) * 2

  return {
    form: kernel ? 'simd' : 'plain',
    write(date, z, multiplier) {
      const start = rowStart(date)
      for (let i = 0; i < size; i++) numbers[start + (i >> 1) * 8 + (i & 1)] = z[i]!
      numbers[k + date] = multiplier
    },
    read(date) {
      const z = new Float64Array(size)
      const start = rowStart(date)
      for (let i = 0; i < size; i++) z[i] = numbers[start + (i >> 1) * 8 + (i & 1)]!
      return z
    },
    pass: (weights, marginals = new Float64Array(size)) => {
      const variance = run(weights)
      marginals.set(marginalsAt)
      return { marginals, variance }
    },
    portfolio: (weights) => {
      run(weights)
      return numbers.slice(y, y + dates)
    },
  }
}

function simdKernel(total: number) {
  if (!webAssembly || !compiled) return undefined
  try {
    const pages = Math.ceil((total * 8) / pageBytes)
    const memory = new webAssembly.Memory({ initial: pages, maximum: pages })
    const { onePass } = new webAssembly.Instance(compiled, { env: { memory } }).exports as KernelExports
    return { numbers: new Float64Array(memory.buffer, 0, total), onePass }
  } catch {
    return undefined
  }
}

/** one-pass.as, operation for operation, so that the two forms give the same bits; offsets are in bytes there. */
function plainOnePass(
  numbers: Float64Array,
  ...[zBytes, wBytes, kBytes, yBytes, gBytes, rows, stride]: Parameters<KernelExports['onePass']>
): number {
  const weights = numbers.subarray(wBytes / 8, wBytes / 8 + stride)
  const marginals = numbers.subarray(gBytes / 8, gBytes / 8 + stride)
  let variance = 0
  let lost = 0
  for (let t = 0; t < rows; t += 4) {
    const start = zBytes / 8 + t * stride
    const tile = numbers.subarray(start, start + 4 * stride)
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
      const even = weights[i]!
      const odd = weights[i + 1]!
      even0 += tile[p]! * even
      odd0 += tile[p + 1]! * odd
      even1 += tile[p + 2]! * even
      odd1 += tile[p + 3]! * odd
      even2 += tile[p + 4]! * even
      odd2 += tile[p + 5]! * odd
      even3 += tile[p + 6]! * even
      odd3 += tile[p + 7]! * odd
    }
    const y = yBytes / 8 + t
    const y0 = (numbers[y] = even0 + odd0)
    const y1 = (numbers[y + 1] = even1 + odd1)
    const y2 = (numbers[y + 2] = even2 + odd2)
    const y3 = (numbers[y + 3] = even3 + odd3)
    const k = kBytes / 8 + t
    const s0 = numbers[k]! * y0
    const s1 = numbers[k + 1]! * y1
    const s2 = numbers[k + 2]! * y2
    const s3 = numbers[k + 3]! * y3
    const term = s0 * y0 + s1 * y1 + s2 * y2 + s3 * y3 - lost
    const sum = variance + term
    lost = sum - variance - term
    variance = sum
    for (let i = 0, p = 0; i < stride; i += 2, p += 8) {
      marginals[i] = marginals[i]! + tile[p]! * s0 + tile[p + 2]! * s1 + tile[p + 4]! * s2 + tile[p + 6]! * s3
      marginals[i + 1] =
        marginals[i + 1]! + tile[p + 1]! * s0 + tile[p + 3]! * s1 + tile[p + 5]! * s2 + tile[p + 7]! * s3
    }
  }
  return variance
}

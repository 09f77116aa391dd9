/// <reference path="./module.d.ts" />
import bytes from './one-pass.as'

/** The two forms of the one-pass kernel: WebAssembly with SIMD, and plain TypeScript where that does not compile. */
export type KernelForm = 'simd' | 'plain'

/**
 * A centred block of returns laid out for the one-pass kernel, in memory of its own.
 *
 * Rows are padded with zeros to a multiple of 8 numbers and the block to a multiple of 4 rows: padding changes no
 * sum and spares the kernel all leftovers. Fill `centred` and `multipliers` once, then call `pass` as often as needed.
 */
export interface Block {
  readonly form: KernelForm
  /** Numbers from one row to the next; the first `size` of them count. */
  readonly stride: number
  /** z, padded rows x stride, row-major. */
  readonly centred: Float64Array
  /** k, one for each padded row: the weight of the row in the covariance. */
  readonly multipliers: Float64Array
  /** For weights w: y = Z w, g = Z'K y and v = y'K y, K = diag(k). Reads the block once; O(T n). */
  pass(weights: Float64Array): Pass
}

export interface Pass {
  /** y, one for each date. */
  readonly portfolio: Float64Array
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
 * Opens an empty block. The SIMD form gets a memory of exactly its size that never grows, so its views stay
 * attached and the garbage collector frees block and memory together; when the host refuses that memory (or the
 * module), the block is an ordinary array and takes the plain form, which `form` reports.
 */
export function openBlock(dates: number, size: number, wanted: KernelForm = kernelForm): Block {
  const rows = roundUp(dates, 4)
  const stride = roundUp(size, 8)
  // z | w | g | k | y: every part but the last two is a whole number of cache lines
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

  return {
    form: kernel ? 'simd' : 'plain',
    stride,
    centred: numbers.subarray(0, w),
    multipliers: numbers.subarray(k, k + rows),
    pass(weights) {
      weightsAt.set(weights)
      marginalsAt.fill(0)
      const variance = onePass(0, w * 8, k * 8, y * 8, g * 8, rows, stride)
      return { portfolio: numbers.slice(y, y + dates), marginals: marginalsAt.slice(), variance }
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

/** The same pass as one-pass.as, in the same layout; places are bytes there, hence the shifts. */
function plainOnePass(
  numbers: Float64Array,
  ...[z, w, k, y, g, rows, stride]: Parameters<KernelExports['onePass']>
): number {
  const weights = numbers.subarray(w >> 3, (w >> 3) + stride)
  const marginals = numbers.subarray(g >> 3, (g >> 3) + stride)
  let variance = 0
  for (let t = 0; t < rows; t++) {
    const start = (z >> 3) + t * stride
    const row = numbers.subarray(start, start + stride)
    // two running sums, for the processor to overlap
    let even = 0
    let odd = 0
    for (let i = 0; i < stride; i += 2) {
      even += row[i]! * weights[i]!
      odd += row[i + 1]! * weights[i + 1]!
    }
    const portfolio = even + odd
    const scaled = numbers[(k >> 3) + t]! * portfolio
    numbers[(y >> 3) + t] = portfolio
    variance += scaled * portfolio
    for (let i = 0; i < stride; i++) marginals[i]! += scaled * row[i]!
  }
  return variance
}

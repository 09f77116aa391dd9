import { readFileSync } from 'node:fs'
import path from 'node:path'

const at = (name: string) => path.join(__dirname, 'data', name)

/** Trusted: the files lie beside this one and the tests fail on any figure that is not there. */
export const readJson = <T>(name: string): T => JSON.parse(readFileSync(at(name), 'utf8')) as T

/** The columns of a csv file with one header row. */
export function readCsv(name: string): { names: string[]; rows: number[][] } {
  const [header, ...lines] = readFileSync(at(name), 'utf8').trim().split(/\r?\n/)
  return { names: header!.split(','), rows: lines.map((line) => line.split(',').map(Number)) }
}

/**
 * Returns by the integer generator in lcg60.json and lcg120.json (`about.generator.words`): x <- 16807 x mod (2^31 - 1),
 * sums of twelve for the normals, a factor model with common fat tails. Bit for bit the same in every language.
 */
export function generatedReturns(
  seed: number,
  n: number,
  T: number,
): { returns: Float64Array; factors: Float64Array; state: number } {
  const modulus = 2147483647
  let x = seed
  const step = () => (x = (16807 * x) % modulus)
  const u = () => step() / modulus
  const z = () => {
    let sum = 0
    for (let k = 0; k < 12; k++) sum += step()
    return sum / modulus - 6
  }
  const assets = Array.from({ length: n }, () => {
    const a = 0.0004 * (u() - 0.5) + 0.0002
    const b = [0.5 + u(), u() - 0.5, u() - 0.5] as const
    return { a, b, d: 0.005 + 0.015 * u() }
  })
  const returns = new Float64Array(T * n)
  const factors = new Float64Array(T * 3)
  for (let t = 0, k = 0; t < T; t++) {
    const f = [z(), z(), z()] as const
    let c = 0
    for (let j = 0; j < 5; j++) {
      const q = z()
      c += q * q
    }
    const m = Math.sqrt(5 / c)
    const F = [m * (0.009 * f[0]), m * (0.005 * f[1]), m * (0.003 * f[2])] as const
    factors.set(F, t * 3)
    for (const { a, b, d } of assets) {
      const e = z()
      returns[k++] = a + (b[0] * F[0] + b[1] * F[1] + b[2] * F[2]) + m * (d * e)
    }
  }
  return { returns, factors, state: x }
}

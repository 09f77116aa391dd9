// AssemblyScript (a TypeScript subset), compiled to WebAssembly with SIMD by src/build/kernel.cjs.
// The layout, and the same pass in plain TypeScript, operation for operation, are in block.ts.
//
// One streaming pass over a centred block z: for every row t
//   y[t] = z[t] . w,   v += k[t] y[t]^2,   g += k[t] y[t] z[t]
// so that g = Z'KZ w and the returned v = w'Z'KZ w, without the n x n matrix.
//
// Four rows at a time: each load of w, and each load and store of g, serves four rows, which are still in the
// nearest cache when the second loop reads them again. All arguments but the two counts are byte offsets into the
// imported memory; g must be zero on entry.
export function onePass(z: usize, w: usize, k: usize, y: usize, g: usize, rows: usize, stride: usize): f64 {
  let v: f64 = 0
  let lost: f64 = 0
  const width = stride << 3
  for (const end = z + rows * width; z < end; z += width << 2) {
    let a0 = f64x2.splat(0)
    let a1 = f64x2.splat(0)
    let a2 = f64x2.splat(0)
    let a3 = f64x2.splat(0)
    let p = z
    for (let o = w, last = w + width; o < last; o += 32) {
      let pair = v128.load(o)
      a0 = f64x2.add(a0, f64x2.mul(v128.load(p), pair))
      a1 = f64x2.add(a1, f64x2.mul(v128.load(p, 16), pair))
      a2 = f64x2.add(a2, f64x2.mul(v128.load(p, 32), pair))
      a3 = f64x2.add(a3, f64x2.mul(v128.load(p, 48), pair))
      pair = v128.load(o, 16)
      a0 = f64x2.add(a0, f64x2.mul(v128.load(p, 64), pair))
      a1 = f64x2.add(a1, f64x2.mul(v128.load(p, 80), pair))
      a2 = f64x2.add(a2, f64x2.mul(v128.load(p, 96), pair))
      a3 = f64x2.add(a3, f64x2.mul(v128.load(p, 112), pair))
      p += 128
    }
    const y0 = f64x2.extract_lane(a0, 0) + f64x2.extract_lane(a0, 1)
    const y1 = f64x2.extract_lane(a1, 0) + f64x2.extract_lane(a1, 1)
    const y2 = f64x2.extract_lane(a2, 0) + f64x2.extract_lane(a2, 1)
    const y3 = f64x2.extract_lane(a3, 0) + f64x2.extract_lane(a3, 1)
    store<f64>(y, y0)
    store<f64>(y, y1, 8)
    store<f64>(y, y2, 16)
    store<f64>(y, y3, 24)
    const s0 = load<f64>(k) * y0
    const s1 = load<f64>(k, 8) * y1
    const s2 = load<f64>(k, 16) * y2
    const s3 = load<f64>(k, 24) * y3
    // compensated (Kahan 1965): v keeps its digits however many rows there are
    const term = s0 * y0 + s1 * y1 + s2 * y2 + s3 * y3 - lost
    const sum = v + term
    lost = sum - v - term
    v = sum
    const m0 = f64x2.splat(s0)
    const m1 = f64x2.splat(s1)
    const m2 = f64x2.splat(s2)
    const m3 = f64x2.splat(s3)
    p = z
    for (let o = g, last = g + width; o < last; o += 32) {
      let c = f64x2.add(v128.load(o), f64x2.mul(v128.load(p), m0))
      c = f64x2.add(c, f64x2.mul(v128.load(p, 16), m1))
      c = f64x2.add(c, f64x2.mul(v128.load(p, 32), m2))
      v128.store(o, f64x2.add(c, f64x2.mul(v128.load(p, 48), m3)))
      c = f64x2.add(v128.load(o, 16), f64x2.mul(v128.load(p, 64), m0))
      c = f64x2.add(c, f64x2.mul(v128.load(p, 80), m1))
      c = f64x2.add(c, f64x2.mul(v128.load(p, 96), m2))
      v128.store(o, f64x2.add(c, f64x2.mul(v128.load(p, 112), m3)), 16)
      p += 128
    }
    y += 32
    k += 32
  }
  return v
}

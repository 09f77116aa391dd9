// AssemblyScript (a TypeScript subset), compiled to WebAssembly with SIMD by src/build/kernel.cjs.
//
// One streaming pass over a centred block: for every row t
//   y[t] = z[t] . w,   v += k[t] y[t]^2,   g += k[t] y[t] z[t]
// so that g = Z'KZ w and the returned v = w'Z'KZ w, without the n x n matrix.
//
// The caller pads with zeros: `rows` is a multiple of 4 and `stride` (doubles a row) a multiple of 8, so there
// are no leftovers to handle and rows begin on cache lines. Four rows at a time: each load of w, and each load
// and store of g, then serves four rows, and the rows are still in cache when the second loop reads them again.
// All arguments but the two counts are byte offsets in the imported memory; g must be zero on entry.
export function onePass(z: usize, w: usize, k: usize, y: usize, g: usize, rows: usize, stride: usize): f64 {
  let v: f64 = 0
  const width = stride << 3
  const end = z + rows * width
  for (let row0 = z; row0 < end; row0 += width << 2) {
    const row1 = row0 + width
    const row2 = row1 + width
    const row3 = row2 + width
    let a0 = f64x2.splat(0)
    let a1 = f64x2.splat(0)
    let a2 = f64x2.splat(0)
    let a3 = f64x2.splat(0)
    let b0 = f64x2.splat(0)
    let b1 = f64x2.splat(0)
    let b2 = f64x2.splat(0)
    let b3 = f64x2.splat(0)
    for (let o: usize = 0; o < width; o += 32) {
      const w0 = v128.load(w + o)
      const w1 = v128.load(w + o, 16)
      a0 = f64x2.add(a0, f64x2.mul(v128.load(row0 + o), w0))
      a1 = f64x2.add(a1, f64x2.mul(v128.load(row1 + o), w0))
      a2 = f64x2.add(a2, f64x2.mul(v128.load(row2 + o), w0))
      a3 = f64x2.add(a3, f64x2.mul(v128.load(row3 + o), w0))
      b0 = f64x2.add(b0, f64x2.mul(v128.load(row0 + o, 16), w1))
      b1 = f64x2.add(b1, f64x2.mul(v128.load(row1 + o, 16), w1))
      b2 = f64x2.add(b2, f64x2.mul(v128.load(row2 + o, 16), w1))
      b3 = f64x2.add(b3, f64x2.mul(v128.load(row3 + o, 16), w1))
    }
    a0 = f64x2.add(a0, b0)
    a1 = f64x2.add(a1, b1)
    a2 = f64x2.add(a2, b2)
    a3 = f64x2.add(a3, b3)
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
    v += s0 * y0 + s1 * y1 + (s2 * y2 + s3 * y3)
    const m0 = f64x2.splat(s0)
    const m1 = f64x2.splat(s1)
    const m2 = f64x2.splat(s2)
    const m3 = f64x2.splat(s3)
    for (let o: usize = 0; o < width; o += 32) {
      const c = g + o
      v128.store(
        c,
        f64x2.add(
          v128.load(c),
          f64x2.add(
            f64x2.add(f64x2.mul(v128.load(row0 + o), m0), f64x2.mul(v128.load(row1 + o), m1)),
            f64x2.add(f64x2.mul(v128.load(row2 + o), m2), f64x2.mul(v128.load(row3 + o), m3)),
          ),
        ),
      )
      v128.store(
        c,
        f64x2.add(
          v128.load(c, 16),
          f64x2.add(
            f64x2.add(f64x2.mul(v128.load(row0 + o, 16), m0), f64x2.mul(v128.load(row1 + o, 16), m1)),
            f64x2.add(f64x2.mul(v128.load(row2 + o, 16), m2), f64x2.mul(v128.load(row3 + o, 16), m3)),
          ),
        ),
        16,
      )
    }
    y += 32
    k += 32
  }
  return v
}

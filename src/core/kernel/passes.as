// AssemblyScript (a TypeScript subset), compiled to WebAssembly with SIMD by src/build/kernel.cjs.
// The layout, and the same passes in plain TypeScript, operation for operation, are in block.ts.
// All arguments but the counts are byte offsets into the imported memory; sums must be zero on entry.

// One streaming pass over a centred block z: for every row t
//   y[t] = z[t] . w,   v += k[t] y[t]^2,   g += k[t] y[t] z[t]
// so that g = Z'KZ w and the returned v = w'Z'KZ w, without the n x n matrix.
//
// Four rows at a time: each load of w, and each load and store of g, serves four rows, which are still in the
// nearest cache when they are read again.
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
    addRows(z, g, width, s0, s1, s2, s3)
    y += 32
    k += 32
  }
  return v
}

// g += a[t] z[t] for every row t: g = Z'a
export function weigh(z: usize, a: usize, g: usize, rows: usize, stride: usize): void {
  const width = stride << 3
  for (const end = z + rows * width; z < end; z += width << 2) {
    addRows(z, g, width, load<f64>(a), load<f64>(a, 8), load<f64>(a, 16), load<f64>(a, 24))
    a += 32
  }
}

// s += q[t] z[t]^2 (each position's own square) and g += a[t] z[t] for every row t
export function squares(z: usize, q: usize, a: usize, s: usize, g: usize, rows: usize, stride: usize): void {
  const width = stride << 3
  for (const end = z + rows * width; z < end; z += width << 2) {
    const q0 = f64x2.splat(load<f64>(q))
    const q1 = f64x2.splat(load<f64>(q, 8))
    const q2 = f64x2.splat(load<f64>(q, 16))
    const q3 = f64x2.splat(load<f64>(q, 24))
    const a0 = f64x2.splat(load<f64>(a))
    const a1 = f64x2.splat(load<f64>(a, 8))
    const a2 = f64x2.splat(load<f64>(a, 16))
    const a3 = f64x2.splat(load<f64>(a, 24))
    let p = z
    let h = g
    for (let o = s, last = s + width; o < last; o += 16) {
      const z0 = v128.load(p)
      const z1 = v128.load(p, 16)
      const z2 = v128.load(p, 32)
      const z3 = v128.load(p, 48)
      let c = f64x2.add(v128.load(o), f64x2.mul(f64x2.mul(z0, q0), z0))
      c = f64x2.add(c, f64x2.mul(f64x2.mul(z1, q1), z1))
      c = f64x2.add(c, f64x2.mul(f64x2.mul(z2, q2), z2))
      v128.store(o, f64x2.add(c, f64x2.mul(f64x2.mul(z3, q3), z3)))
      c = f64x2.add(v128.load(h), f64x2.mul(z0, a0))
      c = f64x2.add(c, f64x2.mul(z1, a1))
      c = f64x2.add(c, f64x2.mul(z2, a2))
      v128.store(h, f64x2.add(c, f64x2.mul(z3, a3)))
      p += 64
      h += 16
    }
    q += 32
    a += 32
  }
}

// x[r][c] = z[r] . o[c] for four rows z and four rows o; two rows z at a time, as many sums as registers hold
export function products(z: usize, o: usize, x: usize, stride: usize): void {
  const size = stride << 5
  for (let half: usize = 0; half < 2; half++) {
    let a0 = f64x2.splat(0)
    let a1 = f64x2.splat(0)
    let a2 = f64x2.splat(0)
    let a3 = f64x2.splat(0)
    let b0 = f64x2.splat(0)
    let b1 = f64x2.splat(0)
    let b2 = f64x2.splat(0)
    let b3 = f64x2.splat(0)
    let p = z + (half << 5)
    for (let q = o, last = o + size; q < last; q += 64) {
      const a = v128.load(p)
      const b = v128.load(p, 16)
      let pair = v128.load(q)
      a0 = f64x2.add(a0, f64x2.mul(pair, a))
      b0 = f64x2.add(b0, f64x2.mul(pair, b))
      pair = v128.load(q, 16)
      a1 = f64x2.add(a1, f64x2.mul(pair, a))
      b1 = f64x2.add(b1, f64x2.mul(pair, b))
      pair = v128.load(q, 32)
      a2 = f64x2.add(a2, f64x2.mul(pair, a))
      b2 = f64x2.add(b2, f64x2.mul(pair, b))
      pair = v128.load(q, 48)
      a3 = f64x2.add(a3, f64x2.mul(pair, a))
      b3 = f64x2.add(b3, f64x2.mul(pair, b))
      p += 64
    }
    store<f64>(x, f64x2.extract_lane(a0, 0) + f64x2.extract_lane(a0, 1))
    store<f64>(x, f64x2.extract_lane(a1, 0) + f64x2.extract_lane(a1, 1), 8)
    store<f64>(x, f64x2.extract_lane(a2, 0) + f64x2.extract_lane(a2, 1), 16)
    store<f64>(x, f64x2.extract_lane(a3, 0) + f64x2.extract_lane(a3, 1), 24)
    store<f64>(x, f64x2.extract_lane(b0, 0) + f64x2.extract_lane(b0, 1), 32)
    store<f64>(x, f64x2.extract_lane(b1, 0) + f64x2.extract_lane(b1, 1), 40)
    store<f64>(x, f64x2.extract_lane(b2, 0) + f64x2.extract_lane(b2, 1), 48)
    store<f64>(x, f64x2.extract_lane(b3, 0) + f64x2.extract_lane(b3, 1), 56)
    x += 64
  }
}

// g += s0 z[0] + s1 z[1] + s2 z[2] + s3 z[3]: four rows into one sum for each position
function addRows(z: usize, g: usize, width: usize, s0: f64, s1: f64, s2: f64, s3: f64): void {
  const m0 = f64x2.splat(s0)
  const m1 = f64x2.splat(s1)
  const m2 = f64x2.splat(s2)
  const m3 = f64x2.splat(s3)
  for (let o = g, last = g + width; o < last; o += 32) {
    let c = f64x2.add(v128.load(o), f64x2.mul(v128.load(z), m0))
    c = f64x2.add(c, f64x2.mul(v128.load(z, 16), m1))
    c = f64x2.add(c, f64x2.mul(v128.load(z, 32), m2))
    v128.store(o, f64x2.add(c, f64x2.mul(v128.load(z, 48), m3)))
    c = f64x2.add(v128.load(o, 16), f64x2.mul(v128.load(z, 64), m0))
    c = f64x2.add(c, f64x2.mul(v128.load(z, 80), m1))
    c = f64x2.add(c, f64x2.mul(v128.load(z, 96), m2))
    v128.store(o, f64x2.add(c, f64x2.mul(v128.load(z, 112), m3)), 16)
    z += 128
  }
}

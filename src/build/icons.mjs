// Draws assets/icon-*.png: a beam with two unequal weights, resting on the point where they balance.
import { writeFileSync } from 'node:fs'
import { crc32, deflateSync } from 'node:zlib'

const sizes = [16, 32, 64, 80, 128]

const spruce = [0x16, 0x4a, 0x41]
const chalk = [0xf6, 0xf1, 0xe4]
const ochre = [0xf2, 0xb1, 0x34]
const sage = [0x8f, 0xbf, 0xa9]

// The drawing lives on a grid of 16 x 16, so that its edges fall on pixels at every size.
const heavy = { left: 2, right: 7, top: 3, bottom: 8 }
const light = { left: 10, right: 13, top: 5, bottom: 8 }
const beam = { left: 1, right: 15, top: 8, bottom: 10 }

const area = ({ left, right, top, bottom }) => (right - left) * (bottom - top)
const middle = ({ left, right }) => (left + right) / 2

// Weights go as areas; the beam is level where their moments cancel.
const pivot = (area(heavy) * middle(heavy) + area(light) * middle(light)) / (area(heavy) + area(light))

const inBox = (x, y, { left, right, top, bottom }) => x >= left && x < right && y >= top && y < bottom
const inSupport = (x, y) => y >= 10 && y < 13 && Math.abs(x - pivot) <= (y - 9) * 0.75
function inTile(x, y) {
  const radius = 3
  const dx = Math.max(radius - x, x - (16 - radius), 0)
  const dy = Math.max(radius - y, y - (16 - radius), 0)
  return dx * dx + dy * dy <= radius * radius
}

/** Colour at a point of the grid, or null outside the tile. */
function paint(x, y) {
  if (inBox(x, y, light)) return ochre
  if (inBox(x, y, heavy)) return chalk
  if (inBox(x, y, beam) || inSupport(x, y)) return sage
  return inTile(x, y) ? spruce : null
}

/** RGBA pixels, each the mean of 8 x 8 samples. */
function rasterise(size) {
  const fine = 8
  const pixels = Buffer.alloc(size * size * 4)
  for (let row = 0; row < size; row++) {
    for (let column = 0; column < size; column++) {
      const sum = [0, 0, 0]
      let covered = 0
      for (let i = 0; i < fine * fine; i++) {
        const x = ((column + ((i % fine) + 0.5) / fine) * 16) / size
        const y = ((row + (Math.floor(i / fine) + 0.5) / fine) * 16) / size
        const colour = paint(x, y)
        if (!colour) continue
        covered++
        colour.forEach((value, channel) => (sum[channel] += value))
      }
      const colour = covered === 0 ? sum : sum.map((value) => Math.round(value / covered))
      pixels.set([...colour, Math.round((255 * covered) / fine ** 2)], (row * size + column) * 4)
    }
  }
  return pixels
}

function chunk(type, data) {
  const body = Buffer.concat([Buffer.from(type, 'latin1'), data])
  const length = Buffer.alloc(4)
  length.writeUInt32BE(data.length)
  const check = Buffer.alloc(4)
  check.writeUInt32BE(crc32(body))
  return Buffer.concat([length, body, check])
}

/** Portable Network Graphics (W3C Recommendation), 8 bits RGBA, no filter. */
function png(size, pixels) {
  const header = Buffer.alloc(13)
  header.writeUInt32BE(size, 0)
  header.writeUInt32BE(size, 4)
  header.set([8, 6, 0, 0, 0], 8)
  const rows = Array.from({ length: size }, (_, row) =>
    Buffer.concat([Buffer.from([0]), pixels.subarray(row * size * 4, (row + 1) * size * 4)]),
  )
  return Buffer.concat([
    Buffer.from([0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a]),
    chunk('IHDR', header),
    chunk('IDAT', deflateSync(Buffer.concat(rows), { level: 9 })),
    chunk('IEND', Buffer.alloc(0)),
  ])
}

for (const size of sizes) {
  writeFileSync(new URL(`../../assets/icon-${size}.png`, import.meta.url), png(size, rasterise(size)))
}

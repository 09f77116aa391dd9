import {
  bandOf,
  CAUTION,
  changeSteps,
  countOf,
  dateText,
  percentText,
  type Breakdown,
  type RiskChange,
} from '../sheet'
import { digitsFor, measureOf, pointsText } from './measure'
import { changeSentence, digitsOf, sideText } from './change-words'

/** A picture that stands on its own: a document of SVG with its size, and what it shows in words. */
export interface PictureFile {
  readonly svg: string
  readonly width: number
  readonly height: number
  /** of a file, without its ending */
  readonly name: string
  readonly alt: string
}

const WIDTH = 760
const MARGIN = 24
/** Where the names, the two columns of figures and the bars stand. */
const NAME = { x: MARGIN, width: 200 } as const
const FIGURES = [280, 364] as const
const BARS = { from: 384, to: WIDTH - MARGIN } as const
const LINE = 16
const FONT = 'Segoe UI, Arial, Helvetica, sans-serif'

/** Ink on white paper: bars differ by hollow, full and hatched, so that they do in shades of grey too. */
const INK = { text: '#1a1a1a', quiet: '#4a4a4a', rule: '#8a8a8a', bar: '#0f4c6b', paper: '#ffffff' } as const

const escaped = (text: string): string =>
  text.replaceAll('&', '&amp;').replaceAll('<', '&lt;').replaceAll('>', '&gt;').replaceAll('"', '&quot;')

/** Width of letters near enough to break lines by: wide scripts take a square, others a good half. */
const widthOf = (text: string, size: number): number =>
  [...text].reduce((sum, letter) => sum + (letter.charCodeAt(0) > 0x2e7f ? 1 : 0.56), 0) * size

/** A text in lines of at most a width; words that are longer break where they must. */
function linesOf(text: string, width: number, size: number): readonly string[] {
  const lines: string[] = []
  let line = ''
  for (let word of text.split(/\s+/)) {
    if (line !== '' && widthOf(`${line} ${word}`, size) > width) {
      lines.push(line)
      line = ''
    }
    while (widthOf(word, size) > width) {
      let fits = [...word].length
      while (widthOf([...word].slice(0, fits).join(''), size) > width) fits--
      lines.push([...word].slice(0, fits).join(''))
      word = [...word].slice(fits).join('')
    }
    line = line === '' ? word : `${line} ${word}`
  }
  return [...lines, line]
}

interface Lettering {
  readonly size?: number
  readonly bold?: boolean
  readonly quiet?: boolean
  readonly anchor?: 'start' | 'middle' | 'end'
}

const lettered = (
  x: number,
  y: number,
  text: string,
  { size = 12, bold = false, quiet = false, anchor = 'start' }: Lettering = {},
): string =>
  `<text x="${x}" y="${y}" font-size="${size}"${bold ? ' font-weight="600"' : ''} fill="${quiet ? INK.quiet : INK.text}" text-anchor="${anchor}">${escaped(text)}</text>`

const px = (value: number): string => String(Number(value.toFixed(2)))

type Look = 'hollow' | 'full' | 'hatched'

/** A bar between two places, in any order. */
function barred(a: number, b: number, y: number, height: number, look: Look): string {
  const fill = look === 'hollow' ? 'none' : look === 'full' ? INK.bar : 'url(#hatch)'
  const stroke = look === 'hollow' ? INK.quiet : INK.bar
  return `<rect x="${px(Math.min(a, b))}" y="${px(y)}" width="${px(Math.abs(b - a))}" height="${height}" fill="${fill}" stroke="${stroke}"/>`
}

const ruled = (x1: number, y1: number, x2: number, y2: number, color: string = INK.rule, dash = ''): string =>
  `<line x1="${px(x1)}" y1="${px(y1)}" x2="${px(x2)}" y2="${px(y2)}" stroke="${color}"${dash === '' ? '' : ` stroke-dasharray="${dash}"`}/>`

/** A drawing that grows downwards under its title, and ends with the caution. */
class Sheet {
  readonly #title: string
  readonly #parts: string[] = []
  y = MARGIN

  constructor(title: string, lines: readonly string[]) {
    this.#title = title
    for (const line of linesOf(title, WIDTH - 2 * MARGIN, 18)) {
      this.y += 18
      this.add(lettered(MARGIN, this.y, line, { size: 18, bold: true }))
      this.y += 6
    }
    for (const line of lines) this.sentence(line)
    this.y += 8
  }

  add(...parts: readonly string[]): void {
    this.#parts.push(...parts)
  }

  sentence(text: string, lettering: Lettering = {}): void {
    for (const line of linesOf(text, WIDTH - 2 * MARGIN, lettering.size ?? 12)) {
      this.y += LINE
      this.add(lettered(MARGIN, this.y, line, { quiet: true, ...lettering }))
    }
  }

  /** What bars look like, and what they are. */
  key(marks: readonly (readonly [Look | 'band' | 'level', string])[]): void {
    this.y += LINE + 2
    let x = MARGIN
    for (const [look, words] of marks) {
      const middle = this.y - 4
      this.add(
        look === 'band'
          ? whisker(x, x + 22, middle)
          : look === 'level'
            ? ruled(x + 11, middle - 7, x + 11, middle + 7, INK.text)
            : barred(x, x + 22, middle - 4, 8, look),
        lettered(x + 28, this.y, words, { quiet: true }),
      )
      x += 28 + widthOf(words, 12) + 20
    }
    this.y += 8
  }

  /** A name in the first column, wrapped, and what stands beside it; as high as both need. */
  row(name: string, figures: readonly string[], height: number, drawn: (top: number) => string): void {
    const lines = linesOf(name, NAME.width, 12)
    const full = Math.max(height, lines.length * LINE + 6)
    lines.forEach((line, k) => this.add(lettered(NAME.x, this.y + LINE - 2 + k * LINE, line)))
    figures.forEach((figure, k) =>
      this.add(
        lettered(FIGURES[k] ?? BARS.from, this.y + LINE - 2, figure, {
          anchor: 'end',
          bold: k === figures.length - 1,
        }),
      ),
    )
    this.add(drawn(this.y))
    this.y += full
  }

  done(name: string, alt: string): PictureFile {
    this.y += 8
    this.sentence(CAUTION, { size: 11 })
    const height = Math.ceil(this.y + MARGIN)
    const svg = `<?xml version="1.0" encoding="UTF-8"?>
<svg xmlns="http://www.w3.org/2000/svg" width="${WIDTH}" height="${height}" viewBox="0 0 ${WIDTH} ${height}" role="img" font-family="${FONT}">
<title>${escaped(this.#title)}</title>
<desc>${escaped(alt)}</desc>
<defs><pattern id="hatch" width="5" height="5" patternUnits="userSpaceOnUse" patternTransform="rotate(45)"><rect width="5" height="5" fill="${INK.paper}"/><line x1="0" y1="0" x2="0" y2="5" stroke="${INK.bar}" stroke-width="3"/></pattern></defs>
<rect width="${WIDTH}" height="${height}" fill="${INK.paper}"/>
${this.#parts.join('\n')}
</svg>
`
    return { svg, width: WIDTH, height, name: name.replace(/[\\/:*?"<>|\s]+/g, ' ').trim(), alt }
  }
}

/** A line with caps at both ends, dark with a pale edge so that it shows on a bar and beside it. */
function whisker(from: number, to: number, y: number): string {
  const path = `M${px(from)} ${px(y - 3)}v6M${px(from)} ${px(y)}H${px(to)}M${px(to)} ${px(y - 3)}v6`
  return `<path d="${path}" fill="none" stroke="${INK.paper}" stroke-width="3.5"/><path d="${path}" fill="none" stroke="${INK.text}" stroke-width="1.2"/>`
}

/** A scale from the lowest to the highest of some values onto the room of the bars. */
function acrossOf(values: readonly number[]): (value: number) => number {
  const low = Math.min(...values)
  const high = Math.max(...values)
  const span = high > low ? high - low : 1
  return (value) => BARS.from + ((value - low) / span) * (BARS.to - BARS.from)
}

/** Positions that are all drawn, and how many of the largest and of the most risk-reducing where there are more. */
const ALL = 30
const TOP = 20
const BOTTOM = 8

const dayOf = (serial: number): string =>
  new Date((Math.floor(serial) - 25569) * 86400000).toISOString().slice(0, 10)

/** The figure a picture of a breakdown is about, and the dates of its data. */
function basisOf({ decomposition, horizon, dates, currency }: Breakdown): string {
  const from =
    dates === null
      ? 'from a covariance matrix as given'
      : `from ${countOf(dates.used, 'date')} of returns${
          dates.first === null || dates.last === null
            ? ''
            : `, ${dateText(dates.first)} to ${dateText(dates.last)}`
        }`
  return `Volatility ${percentText(decomposition.volatility, 2)} ${horizon}${currency ? ` in ${currency.base}` : ''}, ${from}.`
}

/** Weight against share of risk, position by position, as a picture of its own; contribution to risk where shares are withheld. */
export function riskPicture(title: string, breakdown: Breakdown): PictureFile {
  const measure = measureOf(breakdown)
  const { names, decomposition, dates } = breakdown
  const { weights, volatility } = decomposition
  const digits = digitsFor(names.length)
  const order = names.map((_, i) => i).sort((a, b) => measure.values[b]! - measure.values[a]!)
  const reducing = order.filter((i) => measure.values[i]! < 0)
  const folds = order.length > ALL
  const last = folds ? reducing.slice(-BOTTOM) : reducing
  const first = folds
    ? order.slice(0, Math.min(TOP, order.length - last.length))
    : order.slice(0, order.length - last.length)
  const others = order.slice(first.length, order.length - last.length)
  const band = (i: number) => bandOf(measure.values[i]!, measure.errors?.[i] ?? 0)
  const across = acrossOf([
    0,
    ...[...first, ...last].flatMap((i) => [...band(i), ...(measure.comparable ? [weights[i]!] : [])]),
  ])
  const sheet = new Sheet(`Weight and ${measure.label.toLowerCase()}: ${title}`, [
    basisOf(breakdown),
    ...(breakdown.sharesWithheld === null ? [] : [breakdown.sharesWithheld]),
  ])
  sheet.key([
    ...(measure.comparable ? [['hollow', 'Weight'] as const] : []),
    ['full', measure.label],
    ...(last.length > 0 ? [['hatched', `${measure.label}, risk-reducing position`] as const] : []),
    ...(measure.errors ? [['band', '95% band'] as const] : []),
  ])
  sheet.y += LINE
  sheet.add(
    lettered(FIGURES[0], sheet.y, 'Weight', { anchor: 'end', quiet: true }),
    lettered(FIGURES[1], sheet.y, measure.comparable ? 'Share of risk' : 'Contribution', {
      anchor: 'end',
      quiet: true,
    }),
  )
  sheet.y += 6
  const top = sheet.y
  const height = measure.comparable ? 28 : 22
  const drawRow = (i: number): void => {
    const value = measure.values[i]!
    const reduces = last.includes(i)
    const thick = measure.comparable ? 13 : 4
    sheet.row(
      names[i] ?? '',
      [percentText(weights[i]!, digits), percentText(value, measure.digits)],
      height,
      (y) =>
        (measure.comparable ? barred(across(0), across(weights[i]!), y + 4, 6, 'hollow') : '') +
        barred(across(0), across(value), y + thick, 10, reduces ? 'hatched' : 'full') +
        (band(i)[1] > band(i)[0] ? whisker(across(band(i)[0]), across(band(i)[1]), y + thick + 5) : ''),
    )
  }
  first.forEach(drawRow)
  if (others.length > 0) {
    const sum = (values: Float64Array): number => others.reduce((total, i) => total + values[i]!, 0)
    sheet.row(
      `and ${countOf(others.length, 'other')}, together`,
      [percentText(sum(weights), digits), percentText(sum(measure.values), measure.digits)],
      height,
      () => '',
    )
  }
  if (last.length > 0) {
    sheet.y += LINE + 4
    sheet.add(lettered(MARGIN, sheet.y, 'Risk-reducing positions', { bold: true }))
    sheet.y += 10
    last.forEach(drawRow)
  }
  sheet.add(ruled(across(0), top, across(0), sheet.y))
  sheet.row(
    'Total',
    [percentText(breakdown.net, digits), percentText(measure.comparable ? 1 : volatility, measure.digits)],
    LINE,
    (y) => ruled(MARGIN, y, FIGURES[1], y),
  )
  const most = order[0]
  const alt =
    `Weight and ${measure.label.toLowerCase()} of ${countOf(names.length, 'position')}. ${basisOf(breakdown)}` +
    (most === undefined
      ? ''
      : ` Largest: ${names[most]}, weight ${percentText(weights[most]!, digits)}, ${measure.label.toLowerCase()} ${percentText(measure.values[most]!, measure.digits)}.`)
  const date = typeof dates?.last === 'number' ? ` ${dayOf(dates.last)}` : ''
  return sheet.done(`${title} weight and risk${date}`, alt)
}

/** What changed between two results, cause by cause, as a picture of its own. */
export function changePicture(title: string, change: RiskChange): PictureFile {
  const digits = digitsOf(change)
  const steps = changeSteps(change)
  const across = acrossOf(steps.flatMap(({ start, end }) => [start, end]))
  const sheet = new Sheet(`What changed: ${title}`, [
    `Volatility ${change.horizon}: ${changeSentence(change)}`,
    `From: ${sideText(change.from)}. To: ${sideText(change.to)}.`,
  ])
  sheet.key([
    ['level', 'Volatility'],
    ['full', 'Rise'],
    ['hatched', 'Fall'],
  ])
  sheet.y += 6
  steps.forEach(({ label, start, end, isLevel }, k) => {
    const next = steps[k + 1]
    sheet.row(
      label,
      ['', isLevel ? percentText(end, digits) : `${pointsText(end - start, digits)} points`],
      30,
      (y) =>
        [
          next ? ruled(across(end), y + 14, across(end), y + 44, INK.rule, '2 2') : '',
          isLevel
            ? `<line x1="${px(across(end))}" y1="${y + 3}" x2="${px(across(end))}" y2="${y + 25}" stroke="${INK.text}" stroke-width="3"/>`
            : barred(across(start), across(end), y + 6, 16, end < start ? 'hatched' : 'full'),
        ].join(''),
    )
  })
  return sheet.done(
    `${title} what changed${typeof change.to.dataDate === 'number' ? ` ${dayOf(change.to.dataDate)}` : ''}`,
    changeSentence(change),
  )
}

/** Charts as the desk draws them. Every expected figure follows from the definition of its kind, worked out beside it. */
import { DOMParser, type Element } from '@xmldom/xmldom'
import { renderToStaticMarkup } from 'react-dom/server'
import { ChartPicture, type DrawnChart } from '../../../src/desk/page/chart-picture'

const chart: DrawnChart = {
  name: 'North runs most of it.',
  kind: 'bars',
  title: 'Weight and share of risk',
  format: '0%',
  reversed: true,
  legend: true,
  categories: ['North', 'South', 'East'],
  series: [
    { name: 'Weight', look: 'outline', values: [0.4, 0.1, -0.2] },
    { name: 'Share of risk', look: 'solid', values: [0.8, null, -0.1] },
  ],
}

function drawn(changes: Partial<DrawnChart>, width = 400) {
  const markup = renderToStaticMarkup(
    <ChartPicture chart={{ ...chart, ...changes }} width={width} height={250} />,
  )
  const root = new DOMParser().parseFromString(markup, 'text/xml').documentElement!
  const all = (name: string, look = ''): Element[] =>
    [...root.getElementsByTagName(name)].filter((one) => (one.getAttribute('class') ?? '').includes(look))
  const bars = (look: string) =>
    all('rect', look)
      // the squares of the key are 9 by 9
      .filter((one) => one.getAttribute('width') !== '9' || one.getAttribute('height') !== '9')
      .map((one) => ['x', 'y', 'width', 'height'].map((side) => Number(one.getAttribute(side))))
      .map(([x = 0, y = 0, wide = 0, high = 0]) => ({ x, y, wide, high }))
  const texts = all('text').map(({ textContent }) => textContent)
  return { root, all, bars, texts }
}

it('says what it shows to whoever does not see it', () => {
  expect(drawn({}).root.getAttribute('role')).toBe('img')
  expect(drawn({}).root.getAttribute('aria-label')).toBe('North runs most of it.')
  expect(drawn({ name: '' }).root.getAttribute('aria-label')).toBe('Weight and share of risk')
})

it('draws bars as long as their figures from one line of zero, the first category on top where they run down', () => {
  const weights = drawn({}).bars('outline')
  expect(weights).toHaveLength(3)
  const [north, south, east] = weights as [(typeof weights)[0], (typeof weights)[0], (typeof weights)[0]]
  // 0.4 is four times 0.1; -0.2 is twice that to the other side; tolerance: doubles that are added up
  expect(north.wide / south.wide).toBeCloseTo(4, 9)
  expect(east.wide / south.wide).toBeCloseTo(2, 9)
  expect(east.x + east.wide).toBeCloseTo(north.x, 9)
  expect(north.y).toBeLessThan(south.y)
  const [upward] = drawn({ reversed: false }).bars('outline')
  const [, lower] = drawn({ reversed: false }).bars('outline')
  expect(upward!.y).toBeGreaterThan(lower!.y)
})

it('cuts off what lies before the beginning of an axis, so that small steps between high levels can be seen', () => {
  const steps: Partial<DrawnChart> = {
    kind: 'stacked columns',
    reversed: false,
    series: [
      { name: 'Under', look: 'unseen', values: [0, 0.08, 0] },
      { name: 'Level', look: 'solid', values: [0.08, 0, 0.09] },
      { name: 'Rise', look: 'outline', values: [0, 0.01, 0] },
    ],
  }
  const [rise] = drawn({ ...steps, minimum: 0.07 })
    .bars('outline')
    .filter(({ high }) => high > 1)
  const [first, , last] = drawn({ ...steps, minimum: 0.07 }).bars('solid')
  // from 0.07: a level of 0.08 is as high as the rise of 0.01, one of 0.09 twice as high
  expect(first!.high / rise!.high).toBeCloseTo(1, 9)
  expect(last!.high / rise!.high).toBeCloseTo(2, 9)
  const [small] = drawn(steps)
    .bars('outline')
    .filter(({ high }) => high > 1)
  expect(small!.high).toBeLessThan(rise!.high / 4)
})

it('leaves the place of a figure that is not there free', () => {
  expect(drawn({}).bars('solid')).toHaveLength(2)
})

it('stands columns on one another, those below zero hanging from it, and does not show what only takes up room', () => {
  const { bars } = drawn({
    kind: 'stacked columns',
    reversed: false,
    series: [
      { name: 'Under', look: 'unseen', values: [0.3, 0, 0] },
      { name: 'Up', look: 'outline', values: [0.2, 0.1, 0] },
      { name: 'Down', look: 'solid', values: [0, -0.1, 0] },
    ],
  })
  const [under] = bars('unseen')
  const [first, second] = bars('outline')
  const below = bars('solid')[1]!
  // the second stands where the first ends: its bottom is the first one's top
  expect(first!.y + first!.high).toBeCloseTo(under!.y, 9)
  expect(first!.high / under!.high).toBeCloseTo(2 / 3, 9)
  expect(below.y).toBeCloseTo(second!.y + second!.high, 9)
})

it('breaks a line where there is no figure', () => {
  const { all } = drawn({
    kind: 'line',
    legend: false,
    series: [
      { name: 'Risk', look: 'solid', values: [0.1, 0.2, null] },
      { name: 'B', look: 'outline', values: [0.1, null, 0.2] },
    ],
  })
  const [whole, broken] = all('path').map((path) => path.getAttribute('d') ?? '')
  expect([whole, broken].map((path) => path?.replace(/[^ML]/g, ''))).toEqual(['ML', 'MM'])
  expect(all('circle')).toHaveLength(4)
})

it('begins the axis of a line at zero unless its figures are about one level far from it', () => {
  const ticks = (values: number[]) =>
    drawn({ kind: 'line', legend: false, series: [{ name: 'Risk', look: 'solid', values }] }).texts.filter(
      (text) => text?.endsWith('%'),
    )
  expect(ticks([0.08, 0.1, 0.12])).toContain('0%')
  expect(ticks([0.9, 0.92, 0.94])).not.toContain('0%')
  expect(ticks([0.9, 0.9, 0.9])).toContain('0%')
})

it('cuts a text that has no room and shows that it was cut', () => {
  const long = 'Weight and share of risk of the fourteen largest holdings of the book'
  expect(drawn({ title: long }, 300).texts[0]).toMatch(/^Weight and share of risk.*…$/)
  expect(drawn({ title: long }, 900).texts[0]).toBe(long)
})

it('draws nothing it cannot: no categories, or no room', () => {
  expect(drawn({ categories: [], series: [] }).bars('')).toEqual([])
  expect(drawn({}, 70).bars('solid')).toEqual([])
})

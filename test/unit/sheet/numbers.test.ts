import { dateFromText, numberFromText } from '../../../src/sheet/numbers'
import { ENGLISH, GERMAN } from './blocks-of-cells'

const SWISS = { decimal: '.', group: '\u2019', dateOrder: 'dmy' } as const
const FRENCH = { decimal: ',', group: '\u202f', dateOrder: 'dmy' } as const

// How these notations write numbers and dates: Unicode CLDR, number and date patterns of en-US, de-DE, de-CH and fr-FR (from memory).

test.each([
  ['12.5%', ENGLISH, 0.125],
  ['12,5 %', GERMAN, 0.125],
  ['12,5\u00a0%', FRENCH, 0.125],
  ['(3.0%)', ENGLISH, -0.03],
  ['1,234.5', ENGLISH, 1234.5],
  ['1.234,5', GERMAN, 1234.5],
  ['1\u2019234.5', SWISS, 1234.5],
  ['1\u202f234,5', FRENCH, 1234.5],
  ['\u22123', ENGLISH, -3],
  ['3-', ENGLISH, -3],
  ['+0.5', ENGLISH, 0.5],
  ['.5', ENGLISH, 0.5],
  ['€ 1,000', ENGLISH, 1000],
  ['-$5', ENGLISH, -5],
  ['($5)', ENGLISH, -5],
  ['1e-3', ENGLISH, 0.001],
] as const)('%s is a number', (text, culture, value) => {
  expect(numberFromText(text, culture)).toBeCloseTo(value, 15)
})

test.each([
  ['12,5 %', ENGLISH],
  ['1,5', ENGLISH],
  ['1,23,456', ENGLISH],
  ['1.234.5', ENGLISH],
  ['abc', ENGLISH],
  ['', ENGLISH],
  ['5 apples', ENGLISH],
  ['--5', ENGLISH],
  ['1e999', ENGLISH],
  ['=1+1', ENGLISH],
] as const)('%s is none, and is not guessed at', (text, culture) => {
  expect(numberFromText(text, culture)).toBeNull()
})

test.each([
  ['2026-11-27', ENGLISH, 46353],
  ['2026-11-27T00:00', GERMAN, 46353],
  ['27.11.2026', GERMAN, 46353],
  ['11/27/2026', ENGLISH, 46353],
  ['27 Nov 2026', ENGLISH, 46353],
  ['27-November-2026', GERMAN, 46353],
  ['29 Feb 2024', ENGLISH, 45351],
] as const)('%s is a date', (text, culture, serial) => {
  expect(dateFromText(text, culture)).toBe(serial)
})

test.each([
  ['27/11/2026', ENGLISH],
  ['29 Feb 2026', ENGLISH],
  ['27.11.26', GERMAN],
  ['1.5', GERMAN],
  ['November', ENGLISH],
  ['0050-01-01', ENGLISH],
] as const)('%s is none', (text, culture) => {
  expect(dateFromText(text, culture)).toBeNull()
})

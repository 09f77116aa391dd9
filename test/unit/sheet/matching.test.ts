import { matchHoldings } from '../../../src/sheet'
import { groupsOf } from '../../../src/sheet/names'
import { held, returnsOf, series, told } from './blocks-of-cells'

// Every block here is typed for its test.

test('holdings find their series by name, wherever it stands', () => {
  const match = matchHoldings(held('B', 'A'), series('A', 'B', 'C'), [])
  expect([...match.seriesOf]).toEqual([1, 0])
  expect(match.findings).toEqual([])
})

test('case and spacing do not part a holding from its series, and it is told', () => {
  const match = matchHoldings(held('harbour  bonds', 'A'), series('A', 'Harbour bonds'), [])
  expect([...match.seriesOf]).toEqual([1, 0])
  expect(told(match, 'notes')).toEqual(['1 name matched but for case or spacing (first “harbour  bonds”).'])
})

test('a name like two series is not guessed at', () => {
  const match = matchHoldings(held('BONDS'), series('Bonds', 'bonds'), [])
  expect(told(match, 'stops')).toEqual([
    'Book!B2: “BONDS” is like 2 series in Returns!A1:B5; one is needed: spell one of them alike.',
  ])
})

test('two holdings cannot share a series', () => {
  const match = matchHoldings(held('Bonds', 'bonds'), series('Bonds', 'Shares'), [])
  expect(told(match, 'stops')).toEqual([
    'Book!B3: “bonds” and “Bonds” both match the series “Bonds”; one holding a series is needed.',
  ])
})

test('without names on one side, place decides, and only when the numbers are the same', () => {
  const nameless = returnsOf([[0.01, 0.02], [-0.01, 0.01], [0.02, -0.03]]) // prettier-ignore
  const match = matchHoldings(held('A', 'B'), nameless, [])
  expect([...match.seriesOf]).toEqual([0, 1])
  expect(told(match, 'warns')).toEqual([
    'No names on the returns: holdings and series are matched by their place.',
  ])
  expect(told(matchHoldings(held('A', 'B', 'C'), nameless, []), 'stops')).toEqual([
    'Returns!A1:B3: found 2 series for 3 holdings; without names on both sides as many are needed, in the same order.',
  ])
  expect([...matchHoldings(held('A', 'Cash', 'B'), nameless, ['Cash']).seriesOf]).toEqual([0, -1, 1])
})

test('groups are numbered as they come, alike but for case and spacing, blanks together', () => {
  const { groupOf, labels } = groupsOf(['Shares', '', 'shares ', 'Bonds', null])
  expect([...groupOf]).toEqual([0, 1, 0, 2, 1])
  expect(labels).toEqual(['Shares', 'Unassigned', 'Bonds'])
})

test('a label that says unassigned itself is one group with the blanks', () => {
  const { groupOf, labels } = groupsOf(['', 'unassigned', 'Bonds'])
  expect([...groupOf]).toEqual([0, 0, 1])
  expect(labels).toEqual(['Unassigned', 'Bonds'])
})

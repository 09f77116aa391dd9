import { renderToStaticMarkup } from 'react-dom/server'
import { FluentProvider, webLightTheme } from '@fluentui/react-components'
import { typedNumber } from '../../../src/pane/controls'
import { measureOf } from '../../../src/pane/measure'
import { Sentence } from '../../../src/pane/place'
import { sensitivity } from '../../../src/pane/positions'
import { BooksProvider } from '../../../src/pane/store'
import type { Area, Breakdown, Books } from '../../../src/sheet'

/** The texts of the links in a drawn sentence, and the whole of what it says. */
function draw(text: string, area?: Area): { links: string[]; said: string } {
  const markup = renderToStaticMarkup(
    <FluentProvider theme={webLightTheme}>
      <BooksProvider books={{} as Books}>
        <Sentence text={text} area={area ?? null} />
      </BooksProvider>
    </FluentProvider>,
  )
  const plain = (html: string): string =>
    html
      .replace(/<style.*?<\/style>|<[^>]*>/gs, '')
      .replaceAll('&#x27;', "'")
      .replaceAll('&amp;', '&')
  return {
    links: [...markup.matchAll(/<button[^>]*>(.*?)<\/button>/g)].map(([, inside]) => plain(inside ?? '')),
    said: plain(markup),
  }
}

const cell: Area = { sheet: 'Book', row: 6, column: 2, rows: 1, columns: 1 }

describe('a sentence with addresses', () => {
  test('links every address in it and loses no word', () => {
    const text = "Book!C7: found no returns for “Cash” in 'My returns'!A1:P261; one is needed."
    expect(draw(text)).toEqual({ links: ['Book!C7', "'My returns'!A1:P261"], said: text })
  })

  test('gets the place at its end when it does not name it', () => {
    expect(draw('The weight is text.', cell)).toEqual({
      links: ['Book!C7'],
      said: 'The weight is text. Book!C7',
    })
  })

  test('does not take the start of a longer address for the cell it is about', () => {
    expect(draw('Look at Book!C70 and Book!C7:D9.', cell).links).toEqual([
      'Book!C70',
      'Book!C7:D9',
      'Book!C7',
    ])
  })

  test('links no address twice', () => {
    expect(draw('Stale since Book!C7 was edited.', cell).links).toEqual(['Book!C7'])
  })
})

test('a typed number may have a point or a comma before its decimals, and is otherwise none', () => {
  expect(['0.97', '0,97', '52', ' 1 000 ', '-3'].map(typedNumber)).toEqual([0.97, 0.97, 52, 1000, -3])
  expect(['', 'a', '1,2,3', '1e999', '12%'].map(typedNumber)).toEqual([null, null, null, null, null])
})

test('the sensitivity is the share of risk in percent of the volatility, with a true minus sign', () => {
  // identity: the share of risk is the elasticity of risk to the size of the position
  expect(sensitivity(0.3107)).toContain('by 0.31% (of itself)')
  expect(sensitivity(-0.3707)).toContain('by \u22120.37% (of itself)')
})

test('positions are ranked by contribution where shares are withheld or undefined', () => {
  const breakdown = (share: Float64Array | null, sharesWithheld: string | null) =>
    ({
      decomposition: { share, contribution: Float64Array.of(0.01, 0.02), weights: Float64Array.of(0.5, 0.5) },
      sharesWithheld,
    }) as unknown as Breakdown
  const share = Float64Array.of(1 / 3, 2 / 3)
  expect(measureOf(breakdown(share, null))).toMatchObject({ label: 'Share of risk', values: share })
  expect(measureOf(breakdown(share, 'nearly cancel')).label).toBe('Contribution to risk')
  expect(measureOf(breakdown(null, null)).label).toBe('Contribution to risk')
})

import type { ReactNode } from 'react'
import { renderToStaticMarkup } from 'react-dom/server'
import { FluentProvider, webLightTheme } from '@fluentui/react-components'
import { BooksProvider } from '../../../src/pane/store'
import type { Books } from '../../../src/sheet'

const plain = (html: string): string =>
  html
    .replace(/<style.*?<\/style>|<[^>]*>/gs, ' ')
    .replaceAll('&#x27;', "'")
    .replaceAll('&amp;', '&')
    .replaceAll('\u00a0', ' ')
    .replace(/\s+/g, ' ')
    .trim()

/** What a part of the pane says when it is drawn over these books: all of it, the rows of its tables cell by cell, and the markup itself. */
export function draw(
  part: ReactNode,
  books = {} as Books,
): {
  said: string
  rows: readonly (readonly string[])[]
  markup: string
} {
  const markup = renderToStaticMarkup(
    <FluentProvider theme={webLightTheme}>
      <BooksProvider books={books}>{part}</BooksProvider>
    </FluentProvider>,
  )
  return {
    markup,
    said: plain(markup),
    rows: [...markup.matchAll(/<tr\b.*?<\/tr>/gs)].map(([row]) =>
      [...row.matchAll(/<t[hd]\b.*?<\/t[hd]>/gs)].map(([cell]) => plain(cell)),
    ),
  }
}

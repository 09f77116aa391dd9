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

/** What a part of the pane says when it is drawn: all of it, and the rows of its tables cell by cell. */
export function draw(part: ReactNode): { said: string; rows: readonly (readonly string[])[] } {
  const markup = renderToStaticMarkup(
    <FluentProvider theme={webLightTheme}>
      <BooksProvider books={{} as Books}>{part}</BooksProvider>
    </FluentProvider>,
  )
  return {
    said: plain(markup),
    rows: [...markup.matchAll(/<tr\b.*?<\/tr>/gs)].map(([row]) =>
      [...row.matchAll(/<t[hd]\b.*?<\/t[hd]>/gs)].map(([cell]) => plain(cell)),
    ),
  }
}

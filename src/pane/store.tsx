import { createContext, useContext, useEffect, useState, useSyncExternalStore, type ReactNode } from 'react'
import type { Books, BooksState } from '../sheet'

const BooksContext = createContext<Books | null>(null)

export const BooksProvider = ({ books, children }: { books: Books; children: ReactNode }) => (
  <BooksContext value={books}>{children}</BooksContext>
)

/** The commands, from anywhere in the pane. They never reject: what goes wrong arrives in the state. */
export function useBooks(): Books {
  const books = useContext(BooksContext)
  if (!books) throw new Error('The pane is drawn outside its BooksProvider.')
  return books
}

export function useBooksState(): BooksState {
  const books = useBooks()
  return useSyncExternalStore(
    (listener) => books.subscribe(listener),
    () => books.state(),
  )
}

/** True once `active` has lasted for `delay` milliseconds: what is over sooner never flickers on the screen. */
export function useLasting(active: boolean, delay: number): boolean {
  const [lasting, setLasting] = useState(false)
  useEffect(() => {
    if (!active) return
    const timer = setTimeout(() => setLasting(true), delay)
    return () => {
      clearTimeout(timer)
      setLasting(false)
    }
  }, [active, delay])
  return active && lasting
}

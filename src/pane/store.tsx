import { createContext, useContext, useEffect, useState, useSyncExternalStore, type ReactNode } from 'react'
import type { Books, BooksState } from '../sheet'

const BooksContext = createContext<Books | null>(null)
const KeptContext = createContext<Map<string, unknown>>(new Map())

export function BooksProvider({ books, children }: { books: Books; children: ReactNode }) {
  const [kept] = useState(() => new Map<string, unknown>())
  return (
    <BooksContext value={books}>
      <KeptContext value={kept}>{children}</KeptContext>
    </BooksContext>
  )
}

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

/** A state that is there again when the view it belongs to is shown anew, until the pane is closed. */
export function useKept<T>(key: string, initial: T): readonly [T, (value: T) => void] {
  const kept = useContext(KeptContext)
  // whoever keeps under a key takes from it again, so the type is the same
  const [value, setValue] = useState<T>(() => (kept.has(key) ? (kept.get(key) as T) : initial))
  return [
    value,
    (next) => {
      kept.set(key, next)
      setValue(next)
    },
  ]
}

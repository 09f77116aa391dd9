import type { BooksState } from '../sheet'
export function Checks({ state }: { state: BooksState }) {
  void state
  return null
}

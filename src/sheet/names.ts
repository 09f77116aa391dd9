/** Names are the same when they differ in case and spacing alone. */
export const plainName = (name: string): string =>
  name.normalize('NFKC').toLowerCase().replace(/\s+/g, ' ').trim()

/** The group of positions without a label: they are shown, never lost. */
export const UNASSIGNED = 'Unassigned'

/**
 * Numbers the groups in the order of their first member; labels that differ in case and spacing alone are one group, spelt as it
 * came first, and blank ones are together under "Unassigned", with those that are labelled so.
 */
export function groupsOf(labels: readonly (string | null | undefined)[]): {
  readonly groupOf: Int32Array
  readonly labels: readonly string[]
} {
  const shown: string[] = []
  const known = new Map<string, number>()
  const groupOf = Int32Array.from(labels, (label) => {
    const typed = plainName(label ?? '') === '' ? UNASSIGNED : (label ?? '')
    const key = plainName(typed)
    const group = known.get(key) ?? shown.push(typed) - 1
    known.set(key, group)
    return group
  })
  return { groupOf, labels: shown }
}

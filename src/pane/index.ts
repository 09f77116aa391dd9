export { openPane, type PaneHost } from './pane'
export type { HostTheme } from './theme'

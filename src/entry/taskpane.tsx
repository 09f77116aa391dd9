import { hostTheme, loadOnOpen, onThemeChanged, whenReady } from '../excel'
import { openPane } from '../pane'
import type { Books } from '../sheet'

/** Some hosts announce a change of their colours; the others are asked again whenever the pane is looked at. */
function onThemeChange(listener: () => void): () => void {
  const endAnnouncements = onThemeChanged(listener)
  window.addEventListener('focus', listener)
  document.addEventListener('visibilitychange', listener)
  return () => {
    endAnnouncements()
    window.removeEventListener('focus', listener)
    document.removeEventListener('visibilitychange', listener)
  }
}

/** Once a table is linked, the workbook starts the add-in when it opens, so that the table goes on following its book. */
function startWithTable(books: Books): void {
  const end = books.subscribe(look)
  function look() {
    if (!books.state().table) return
    end()
    // An older host cannot: then the table is up to date again once the pane is opened by hand.
    loadOnOpen(true).catch(() => undefined)
  }
  look()
}

async function start(root: HTMLElement): Promise<void> {
  const { host } = await whenReady()
  if (host === null) {
    root.textContent = 'Counterpoise works inside a workbook: open it from the Data tab in Excel.'
    return
  }
  // what computes comes in a chunk of its own: the pane is drawn before it is there
  const opening = import('./books').then(({ openWorkbook }) => openWorkbook())
  const closePane = openPane(root, opening, {
    theme: hostTheme,
    onThemeChange,
    version: COUNTERPOISE_VERSION,
  })
  try {
    startWithTable(await opening)
  } catch (error) {
    closePane()
    throw error
  }
}

const root = document.getElementById('pane')!
start(root).catch((error: unknown) => {
  const found = error instanceof Error ? error.message : String(error)
  root.textContent = `Counterpoise ${COUNTERPOISE_VERSION} could not start: ${found}. Close the pane and open it again.`
})

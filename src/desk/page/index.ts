/** The desk: a local workbook at the left, the add-in's pane at the right, and nothing that leaves the machine. */
import type { FunctionsMetadata } from '../functions'
import { createFrame } from './frame'
import { loadPane } from './pane-frame'
import { screenTheme, type ThemeName } from './theme'
import type { Workspace } from './workspace'

export interface DeskOptions {
  /** The workbook it opens with. */
  readonly demoUrl: string
  readonly functionsMetadataUrl: string
  /** The add-in's own page. */
  readonly paneUrl: string
  /** The prefix of the add-in's worksheet functions. */
  readonly namespace: string
}

/**
 * Draws the desk into the container and opens the first workbook.
 *
 * @returns the parts behind it, for whoever drives the desk from outside
 */
export async function openDesk(container: HTMLElement, options: DeskOptions): Promise<Workspace> {
  let theme = screenTheme()
  const parts: { workspace?: Workspace } = {}
  let told: { readonly message: string; readonly failure: boolean } = { message: '', failure: false }

  const frame = createFrame(
    container,
    {
      open: (file) => void open(file),
      save: () => void save(),
      theme: setTheme,
      focusGrid: () => parts.workspace?.focus(),
    },
    theme,
  )
  frame.setTheme(theme)
  frame.setBusy('Loading the workbook…')

  /** Says something that stays, but for the moment in which a selected cell has more to say. */
  function tell(message: string, failure = false): void {
    told = { message, failure }
    frame.say(message, failure)
  }

  function setTheme(name: ThemeName): void {
    theme = name
    frame.setTheme(name)
    parts.workspace?.setTheme(name)
    // A pane asks its host for the colours when it is looked at, and the user is looking at it now.
    frame.pane.contentWindow?.dispatchEvent(new Event('focus'))
  }

  async function show(bytes: ArrayBuffer, name: string): Promise<void> {
    const { workspace } = parts
    if (!workspace) return
    tell(await workspace.open(bytes, name))
    frame.setBookName(name)
    await loadPane(frame.pane, options.paneUrl, workspace.globals)
  }

  /** Does something that takes a moment; whatever goes wrong is said. */
  async function busy(message: string, work: () => Promise<void>): Promise<void> {
    frame.setBusy(message)
    try {
      await work()
    } catch (error) {
      tell(error instanceof Error ? error.message : String(error), true)
    } finally {
      frame.setBusy(null)
    }
  }

  async function open(file: File): Promise<void> {
    if (parts.workspace?.changed && !(await frame.askToDiscard())) return
    await busy(`Opening ${file.name}…`, async () => show(await file.arrayBuffer(), file.name))
  }

  async function save(): Promise<void> {
    await busy('Saving…', async () => {
      const { workspace } = parts
      if (!workspace) return
      const { bytes, name } = await workspace.save()
      download(bytes, name)
      tell(`Saved ${name}.`)
    })
  }

  const loaded = Promise.all([
    // The grid's own code is large: the frame is on the screen before it.
    import('./workspace'),
    fetched(options.functionsMetadataUrl).then((response) => response.json() as Promise<FunctionsMetadata>),
    fetched(options.demoUrl).then((response) => response.arrayBuffer()),
  ])
  loaded.catch(() => frame.setBusy('The desk could not be loaded. Build it again and reload the page.'))
  const [{ createWorkspace }, metadata, demo] = await loaded
  const created = createWorkspace(frame.grid, {
    theme,
    metadata,
    namespace: options.namespace,
    onCellMessage: (message) => (message ? frame.say(message) : frame.say(told.message, told.failure)),
    onPane: frame.showPane,
  })
  parts.workspace = created
  await busy('Loading the workbook…', () => show(demo, options.demoUrl.split('/').pop() ?? 'Workbook.xlsx'))
  return created
}

async function fetched(url: string): Promise<Response> {
  const response = await fetch(url)
  if (!response.ok) throw new Error(`${url} answered ${response.status}.`)
  return response
}

function download(bytes: ArrayBuffer, name: string): void {
  const type = 'application/vnd.openxmlformats-officedocument.spreadsheetml.sheet'
  const url = URL.createObjectURL(new Blob([bytes], { type }))
  const link = Object.assign(document.createElement('a'), { href: url, download: name })
  link.click()
  // The browser has read it by then.
  setTimeout(() => URL.revokeObjectURL(url), 60_000)
}

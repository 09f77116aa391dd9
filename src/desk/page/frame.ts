/** What surrounds the grid and the pane: the bar above, the line between them, the status line below, and the one question asked. */
import './desk.css'
import { THEMES, THEME_LABELS, type ThemeName } from './theme'

export interface Frame {
  /** Where the grid goes. */
  readonly grid: HTMLElement
  readonly pane: HTMLIFrameElement
  setTheme(theme: ThemeName): void
  setBookName(name: string): void
  setBusy(message: string | null): void
  /** Shows a line below; a failure is announced at once. */
  say(message: string, failure?: boolean): void
  showPane(shown: boolean): void
  askToDiscard(): Promise<boolean>
}

export interface FrameActions {
  open(file: File): void
  save(): void
  theme(name: ThemeName): void
  focusGrid(): void
}

const NARROWEST = 320
const WIDEST = 420
const USUAL = 350
const STEP = 10

function element<Tag extends keyof HTMLElementTagNameMap>(
  tag: Tag,
  properties: Partial<HTMLElementTagNameMap[Tag]> & { role?: string; label?: string } = {},
  ...children: (Node | string)[]
): HTMLElementTagNameMap[Tag] {
  const { label, ...rest } = properties
  const made = Object.assign(document.createElement(tag), rest)
  if (label) made.setAttribute('aria-label', label)
  made.append(...children)
  return made
}

export function createFrame(container: HTMLElement, actions: FrameActions, theme: ThemeName): Frame {
  const picker = element('input', { type: 'file', accept: '.xlsx', hidden: true })
  picker.addEventListener('change', () => {
    const [file] = picker.files ?? []
    picker.value = ''
    if (file) actions.open(file)
  })
  const open = element(
    'button',
    { type: 'button', title: 'Open a workbook (Ctrl+O)', onclick: () => picker.click() },
    'Open',
  )
  const save = element(
    'button',
    { type: 'button', title: 'Save the workbook (Ctrl+S)', onclick: () => actions.save() },
    'Save',
  )
  const themes = element(
    'select',
    { label: 'Theme' },
    ...THEMES.map((name) => element('option', { value: name, selected: name === theme }, THEME_LABELS[name])),
  )
  themes.addEventListener('change', () => actions.theme(themes.value as ThemeName))

  const bookName = element('span', { className: 'desk-book' })
  const bar = element(
    'header',
    { className: 'desk-bar' },
    mark(),
    element('h1', {}, 'Counterpoise'),
    bookName,
    element('div', { className: 'desk-actions' }, open, save, themes, picker),
  )
  const grid = element('section', { id: 'grid', className: 'desk-grid', label: 'Workbook' })
  const busy = element('p', { className: 'desk-busy', role: 'status' })
  const place = element('div', { className: 'desk-place' }, grid, busy)
  const pane = element('iframe', {
    id: 'pane',
    name: 'pane',
    title: 'Counterpoise pane',
    className: 'desk-pane',
  })
  const splitter = createSplitter(pane)
  const status = element('footer', { className: 'desk-status', role: 'status' })
  const dialog = element('dialog', { className: 'desk-dialog', label: 'Open another workbook' })

  container.replaceChildren(
    bar,
    element('main', { className: 'desk-body' }, place, splitter, pane),
    status,
    dialog,
  )
  container.classList.add('desk')
  const places: Place[] = [
    { holds: () => bar.contains(document.activeElement), enter: () => open.focus() },
    // Wherever else the focus is, it is the grid's: its editor lies outside of it in the document.
    {
      holds: () => !bar.contains(document.activeElement) && document.activeElement !== pane,
      enter: () => actions.focusGrid(),
    },
    { holds: () => document.activeElement === pane, enter: () => enterPane(pane) },
  ]
  const onKey = (event: KeyboardEvent): void => {
    shortcut(event, open, save)
    if (event.key === 'F6' && !event.ctrlKey && !event.altKey && !event.metaKey) {
      event.preventDefault()
      event.stopPropagation()
      goOn(pane.hidden ? places.slice(0, 2) : places, event.shiftKey)
    }
  }
  addEventListener('keydown', onKey, { capture: true })
  pane.addEventListener('load', () =>
    pane.contentWindow?.addEventListener('keydown', onKey, { capture: true }),
  )

  return {
    grid,
    pane,
    setTheme(name) {
      document.documentElement.dataset['theme'] = name
    },
    setBookName(name) {
      bookName.textContent = name
      document.title = name ? `${name} - Counterpoise desk` : 'Counterpoise desk'
    },
    setBusy(message) {
      busy.textContent = message
      busy.hidden = message === null
      open.disabled = save.disabled = message !== null
    },
    say(message, failure = false) {
      // Said again, it would be read out again.
      if (status.textContent === message) return
      status.setAttribute('role', failure ? 'alert' : 'status')
      status.classList.toggle('desk-failure', failure)
      status.textContent = message
    },
    showPane(shown) {
      pane.hidden = splitter.hidden = !shown
    },
    askToDiscard: () => ask(dialog),
  }
}

/** Ctrl or Command with O or S, wherever the focus is: browsers would open or save the page. */
function shortcut(event: KeyboardEvent, open: HTMLButtonElement, save: HTMLButtonElement): void {
  if (!(event.ctrlKey || event.metaKey) || event.altKey || event.shiftKey) return
  const button = { o: open, s: save }[event.key.toLowerCase()]
  if (!button) return
  event.preventDefault()
  event.stopPropagation()
  button.click()
}

interface Place {
  holds(): boolean
  enter(): void
}

/** F6, as in the host: the bar, the grid, the pane and round again. Tab alone cannot leave the grid, where it moves the selection. */
function goOn(places: readonly Place[], back: boolean): void {
  const now = places.findIndex(({ holds }) => holds())
  const next = (now + (back ? -1 : 1) + places.length) % places.length
  places[next]?.enter()
}

/** Into the pane, onto what had the focus there or else the first thing that takes it. */
function enterPane(pane: HTMLIFrameElement): void {
  const inside = pane.contentDocument
  const last = inside?.activeElement
  const first = inside?.querySelector<HTMLElement>(
    'button:not([disabled]), [href], input, select, [tabindex="0"]',
  )
  pane.contentWindow?.focus()
  if (!last || last === inside.body) first?.focus()
}

/** The line between grid and pane, moved by pointer and keys. */
function createSplitter(pane: HTMLElement): HTMLElement {
  const splitter = element('div', {
    className: 'desk-splitter',
    role: 'separator',
    tabIndex: 0,
    label: 'Width of the pane',
  })
  splitter.setAttribute('aria-orientation', 'vertical')
  splitter.setAttribute('aria-valuemin', String(NARROWEST))
  splitter.setAttribute('aria-valuemax', String(WIDEST))
  splitter.setAttribute('aria-controls', 'pane')
  let width = USUAL
  const resize = (wanted: number): void => {
    width = Math.min(WIDEST, Math.max(NARROWEST, Math.round(wanted)))
    pane.style.width = `${width}px`
    splitter.setAttribute('aria-valuenow', String(width))
  }
  resize(USUAL)
  splitter.addEventListener('keydown', ({ key }) => {
    if (key === 'ArrowLeft') resize(width + STEP)
    else if (key === 'ArrowRight') resize(width - STEP)
    else if (key === 'Home') resize(NARROWEST)
    else if (key === 'End') resize(WIDEST)
  })
  splitter.addEventListener('pointerdown', (event) => {
    splitter.setPointerCapture(event.pointerId)
    const from = { x: event.clientX, width }
    const move = ({ clientX }: PointerEvent): void => resize(from.width + from.x - clientX)
    splitter.addEventListener('pointermove', move)
    splitter.addEventListener('lostpointercapture', () => splitter.removeEventListener('pointermove', move), {
      once: true,
    })
  })
  return splitter
}

/** Whether changes since the last save may go. */
function ask(dialog: HTMLDialogElement): Promise<boolean> {
  const answer = (value: string, text: string): HTMLButtonElement =>
    element('button', { value, type: 'submit' }, text)
  dialog.replaceChildren(
    element(
      'form',
      { method: 'dialog' },
      element('p', {}, 'This workbook has changes that are not saved. Opening another one discards them.'),
      element(
        'div',
        { className: 'desk-answers' },
        answer('stay', 'Keep this workbook'),
        answer('discard', 'Discard and open'),
      ),
    ),
  )
  dialog.returnValue = ''
  dialog.showModal()
  return new Promise((resolve) => {
    dialog.addEventListener('close', () => resolve(dialog.returnValue === 'discard'), { once: true })
  })
}

/** The add-in's mark, as on its icons. */
function mark(): HTMLElement {
  return element('img', { src: 'assets/icon-32.png', alt: '', width: 20, height: 20 })
}

/**
 * Loads the add-in's own page, as the host gets it, into a frame over the stand-in.
 *
 * A frame and not an element of this document, as in the host: the pane's dialogs cover the pane alone, its widths are measured against
 * the pane, its keys do not move the grid's selection, the grid's style sheets do not reach it, and another workbook starts it afresh.
 * The page cannot simply be the frame's address, because it asks the host's server for its script; everything else in it is used as it
 * stands.
 */
export interface PaneGlobals {
  readonly Office: unknown
  readonly Excel: unknown
  readonly OfficeExtension: { readonly Error: unknown }
  readonly CustomFunctions: { readonly Error: unknown }
}

export async function loadPane(frame: HTMLIFrameElement, url: string, globals: PaneGlobals): Promise<void> {
  const response = await fetch(url)
  if (!response.ok) throw new Error(`${url} answered ${response.status}: build the add-in first.`)
  const page = new DOMParser().parseFromString(await response.text(), 'text/html')
  await blank(frame, page.documentElement.lang)
  const pane = frame.contentWindow as (Window & typeof globalThis) | null
  const target = frame.contentDocument
  if (!pane || !target) throw new Error('The pane has no document.')

  Object.assign(pane, globals)
  // Errors cross from this document into the frame's: there, too, they must be errors.
  for (const { Error } of [globals.OfficeExtension, globals.CustomFunctions]) {
    Object.setPrototypeOf((Error as { prototype: object }).prototype, pane.Error.prototype)
  }
  target.title = page.title
  target.body.replaceChildren(...[...page.body.childNodes].map((node) => target.importNode(node, true)))
  const own = (address: string | null): address is string =>
    address !== null && !/^(?:https?:)?\/\//.test(address)
  for (const node of page.querySelectorAll('link[rel="stylesheet"], style')) {
    if (node.tagName === 'STYLE' || own(node.getAttribute('href')))
      target.head.append(target.importNode(node, true))
  }
  const scripts = [...page.querySelectorAll('script')].map((script) => script.getAttribute('src')).filter(own)
  // The functions register before the pane starts, whichever comes first in the page: nothing in one needs the other.
  await Promise.all(scripts.map((src) => run(target, src)))
}

function blank(frame: HTMLIFrameElement, lang: string): Promise<void> {
  return new Promise((resolve) => {
    frame.addEventListener('load', () => resolve(), { once: true })
    // Its policy is the one of this document.
    frame.srcdoc = `<!doctype html><html lang="${/^[\w-]*$/.test(lang) ? lang : 'en'}"><head><meta charset="utf-8"></head><body></body></html>`
  })
}

function run(target: Document, src: string): Promise<void> {
  return new Promise((resolve, reject) => {
    const script = target.createElement('script')
    script.addEventListener('load', () => resolve(), { once: true })
    script.addEventListener('error', () => reject(new Error(`${src} could not be loaded.`)), { once: true })
    // In the order of the page.
    script.async = false
    script.src = src
    target.head.append(script)
  })
}

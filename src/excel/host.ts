/** The colours the host shows itself in; null where it does not say (then the browser's own preference holds). */
export interface HostTheme {
  readonly dark: boolean
  /** text and ground at the two ends of the scale, as the high contrast themes have them */
  readonly highContrast?: boolean
}

/** The host's theme now. */
export function hostTheme(): HostTheme | null {
  // absent on the web, whatever the types say
  const theme = Office.context.officeTheme as Partial<Office.OfficeTheme> | undefined
  if (!theme) return null
  const [ground, text] = [theme.bodyBackgroundColor ?? '', theme.bodyForegroundColor ?? '']
  if (ground === '#000000' && text.toUpperCase() === '#FFFFFF') return { dark: true, highContrast: true }
  if (typeof theme.isDarkTheme === 'boolean') return { dark: theme.isDarkTheme }
  const colour = /^#([0-9a-f]{2})([0-9a-f]{2})([0-9a-f]{2})$/i.exec(ground)
  if (!colour) return null
  const [red, green, blue] = colour.slice(1).map((part) => Number.parseInt(part, 16) / 255) as [
    number,
    number,
    number,
  ]
  // relative luminance (WCAG 2.2) without its gamma step: enough to tell dark from light
  return { dark: 0.2126 * red + 0.7152 * green + 0.0722 * blue < 0.5 }
}

/**
 * Tells of each change of the host's theme, where the host announces them; others are silent, so ask again when the pane gains the focus.
 * @returns a function that ends it
 */
export function onThemeChanged(listener: (theme: HostTheme | null) => void): () => void {
  const told = () => listener(hostTheme())
  const type = Office.EventType.OfficeThemeChanged
  // a host that does not know the event says so here or in the answer; either way nothing more is to be done
  try {
    Office.context.document.addHandlerAsync(type, told, () => undefined)
  } catch {
    return () => undefined
  }
  return () => Office.context.document.removeHandlerAsync(type, { handler: told })
}

/** Settles when the host can be spoken to; `host` is null outside an Office host. */
export async function whenReady(): Promise<{ readonly host: string | null }> {
  const { host } = await Office.onReady()
  return { host: host ? String(host) : null }
}

/** Whether this workbook starts the add-in when it opens, so that a linked table goes on following its book. */
export async function loadOnOpen(on: boolean): Promise<void> {
  await Office.addin.setStartupBehavior(on ? Office.StartupBehavior.load : Office.StartupBehavior.none)
}

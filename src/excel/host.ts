/** The colours the host shows itself in; null where it does not say (then the browser's own preference holds). */
export interface HostTheme {
  readonly dark: boolean
}

/** The host's theme now. Excel announces no change of it: ask again when the pane is shown or gains the focus. */
export function hostTheme(): HostTheme | null {
  // absent on the web, whatever the types say
  const theme = Office.context.officeTheme as Partial<Office.OfficeTheme> | undefined
  if (!theme) return null
  if (typeof theme.isDarkTheme === 'boolean') return { dark: theme.isDarkTheme }
  const colour = /^#([0-9a-f]{2})([0-9a-f]{2})([0-9a-f]{2})$/i.exec(theme.bodyBackgroundColor ?? '')
  if (!colour) return null
  const [red, green, blue] = colour.slice(1).map((part) => Number.parseInt(part, 16) / 255) as [
    number,
    number,
    number,
  ]
  // relative luminance (WCAG 2.2) without its gamma step: enough to tell dark from light
  return { dark: 0.2126 * red + 0.7152 * green + 0.0722 * blue < 0.5 }
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

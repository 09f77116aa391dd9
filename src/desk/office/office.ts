/** The global `Office`: the host around the workbook, as far as an add-in's pane and ribbon button ask for it. */
import type { Culture } from './book'
import { OfficeError } from './error'

export interface Theme {
  readonly bodyBackgroundColor: string
  readonly bodyForegroundColor: string
  readonly controlBackgroundColor: string
  readonly controlForegroundColor: string
  readonly isDarkTheme?: boolean
}

/** Requirement sets the desk claims, each with its highest version. */
const SETS: Readonly<Record<string, string>> = {
  ExcelApi: '1.20',
  SharedRuntime: '1.2',
  CustomFunctionsRuntime: '1.2',
  AddinCommands: '1.1',
}

/** Whether version `a` is at least `b`, number by number. */
function atLeast(a: string, b: string): boolean {
  const [have, need] = [a.split('.').map(Number), b.split('.').map(Number)]
  for (let i = 0; i < Math.max(have.length, need.length); i++) {
    const difference = (have[i] ?? 0) - (need[i] ?? 0)
    if (difference) return difference > 0
  }
  return true
}

type ThemeHandler = (event: { type: string; officeTheme: Theme | undefined }) => void

const THEME_CHANGED = 'officeThemeChanged'

type VisibilityHandler = (message: { visibilityMode: 'Taskpane' | 'Hidden' }) => void

export function officeGlobal(culture: Culture, theme: Theme | undefined, onPane: (shown: boolean) => void) {
  const info = { host: 'Excel', platform: 'PC' }
  const visibilityHandlers = new Set<VisibilityHandler>()
  const themeHandlers = new Set<ThemeHandler>()
  const actions = new Map<string, (event: unknown) => void>()
  let startup = 'none'

  const showPane = (shown: boolean) => {
    onPane(shown)
    for (const handler of visibilityHandlers) handler({ visibilityMode: shown ? 'Taskpane' : 'Hidden' })
    return Promise.resolve()
  }

  const checkType = (type: string) => {
    if (type !== THEME_CHANGED) throw new OfficeError('NotImplemented', `the desk has no event ${type}`)
  }
  const done = (callback?: (result: { status: string }) => void) => callback?.({ status: 'succeeded' })

  const api = {
    actions: { associate: (id: string, action: (event: unknown) => void) => void actions.set(id, action) },
    addin: {
      setStartupBehavior: (behaviour: string) => {
        startup = behaviour
        return Promise.resolve()
      },
      getStartupBehavior: () => Promise.resolve(startup),
      showAsTaskpane: () => showPane(true),
      hide: () => showPane(false),
      onVisibilityModeChanged: (handler: VisibilityHandler) => {
        visibilityHandlers.add(handler)
        return Promise.resolve(() => {
          visibilityHandlers.delete(handler)
          return Promise.resolve()
        })
      },
    },
    context: {
      ...info,
      contentLanguage: culture.name,
      displayLanguage: culture.name,
      diagnostics: { ...info, version: '16.0' },
      /** Some hosts have none. */
      officeTheme: theme,
      document: {
        addHandlerAsync: (
          type: string,
          handler: ThemeHandler,
          callback?: (result: { status: string }) => void,
        ) => {
          checkType(type)
          themeHandlers.add(handler)
          done(callback)
        },
        removeHandlerAsync: (
          type: string,
          options?: { handler?: ThemeHandler },
          callback?: (result: { status: string }) => void,
        ) => {
          checkType(type)
          if (options?.handler) themeHandlers.delete(options.handler)
          else themeHandlers.clear()
          done(callback)
        },
      },
      requirements: {
        isSetSupported: (name: string, version = '1.0') => {
          const highest = SETS[name]
          return highest !== undefined && atLeast(highest, version)
        },
      },
    },
    onReady: (callback?: (ready: typeof info) => unknown) =>
      Promise.resolve(info).then((ready) => (callback?.(ready), ready)),
    HostType: { Excel: 'Excel' },
    PlatformType: { PC: 'PC', OfficeOnline: 'OfficeOnline', Mac: 'Mac' },
    StartupBehavior: { none: 'none', load: 'load' },
    VisibilityMode: { hidden: 'Hidden', taskpane: 'Taskpane' },
    EventType: { OfficeThemeChanged: THEME_CHANGED },
    AsyncResultStatus: { Succeeded: 'succeeded', Failed: 'failed' },
  }

  return {
    api,
    /** Does what the ribbon button of an action does; resolves when the action says it is complete. */
    runAction: (id: string) =>
      new Promise<void>((resolve, reject) => {
        const action = actions.get(id)
        if (action) action({ source: { id }, completed: resolve })
        else reject(new Error(`no action "${id}" is associated`))
      }),
    setTheme: (changed: Theme | undefined) => {
      api.context.officeTheme = changed
      for (const handler of themeHandlers) handler({ type: THEME_CHANGED, officeTheme: changed })
    },
    forget: () => {
      themeHandlers.clear()
      visibilityHandlers.clear()
      actions.clear()
    },
  }
}

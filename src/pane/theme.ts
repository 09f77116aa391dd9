import { useSyncExternalStore } from 'react'
import {
  createDarkTheme,
  createLightTheme,
  teamsHighContrastTheme,
  type BrandVariants,
  type Theme,
} from '@fluentui/react-components'

/** What a host says about its colours; null where it says nothing. */
export interface HostTheme {
  readonly dark: boolean
  /** for hosts that offer such a theme of their own; a screen's forced colours are seen without being told */
  readonly highContrast?: boolean
}

/** Sixteen steps of one blue, evenly spaced in OKLCH lightness at hue 232. */
const BLUE: BrandVariants = {
  10: '#020a10', 20: '#061821', 30: '#052533', 40: '#023347', 50: '#024059', 60: '#004c68', 70: '#005777', 80: '#066386',
  90: '#147298', 100: '#2a81a8', 110: '#4093bb', 120: '#5da5ca', 130: '#78b7d8', 140: '#9ac8e1', 150: '#b8daed', 160: '#d8ebf6',
} // prettier-ignore

const LIGHT: Theme = createLightTheme(BLUE)

/** The dark ramp is picked for white backgrounds upside down: links and accents need lighter steps to stay readable. */
const DARK: Theme = {
  ...createDarkTheme(BLUE),
  colorBrandForeground1: BLUE[120],
  colorBrandForeground2: BLUE[130],
  colorBrandForegroundLink: BLUE[130],
  colorBrandForegroundLinkHover: BLUE[140],
  colorBrandForegroundLinkPressed: BLUE[120],
  colorCompoundBrandForeground1: BLUE[120],
  colorCompoundBrandStroke: BLUE[120],
  colorCompoundBrandStrokeHover: BLUE[130],
}

const darkScheme = matchMedia('(prefers-color-scheme: dark)')
const forcedColors = matchMedia('(forced-colors: active)')

function watchScreen(listener: () => void): () => void {
  darkScheme.addEventListener('change', listener)
  forcedColors.addEventListener('change', listener)
  return () => {
    darkScheme.removeEventListener('change', listener)
    forcedColors.removeEventListener('change', listener)
  }
}

export interface Look {
  readonly theme: Theme
  /** which way the browser draws what it draws itself: scroll bars, lists of choices, the calendar */
  readonly scheme: 'light' | 'dark'
}

const LOOKS = {
  light: { theme: LIGHT, scheme: 'light' },
  dark: { theme: DARK, scheme: 'dark' },
  contrast: { theme: teamsHighContrastTheme, scheme: 'dark' },
} as const satisfies { readonly [name: string]: Look }

/** The host's word first, else the screen's; forced colours win over both. */
export function useLook(
  hostTheme: () => HostTheme | null,
  onHostChange: (listener: () => void) => () => void,
): Look {
  return useSyncExternalStore(
    (listener) => {
      const endHost = onHostChange(listener)
      const endScreen = watchScreen(listener)
      return () => {
        endHost()
        endScreen()
      }
    },
    () => {
      const told = hostTheme()
      if (forcedColors.matches || told?.highContrast) return LOOKS.contrast
      return (told?.dark ?? darkScheme.matches) ? LOOKS.dark : LOOKS.light
    },
  )
}

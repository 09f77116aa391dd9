/** The three looks of the desk, and what each tells the add-in about its host. */
import type { Theme } from '../office'

export const THEMES = ['light', 'dark', 'contrast'] as const
export type ThemeName = (typeof THEMES)[number]

export const THEME_LABELS: Record<ThemeName, string> = {
  light: 'Light',
  dark: 'Dark',
  contrast: 'High contrast',
}

const OFFICE_THEMES: Record<ThemeName, Theme> = {
  light: {
    bodyBackgroundColor: '#FFFFFF',
    bodyForegroundColor: '#242424',
    controlBackgroundColor: '#F5F5F5',
    controlForegroundColor: '#242424',
    isDarkTheme: false,
  },
  dark: {
    bodyBackgroundColor: '#292929',
    bodyForegroundColor: '#F0F0F0',
    controlBackgroundColor: '#1F1F1F',
    controlForegroundColor: '#F0F0F0',
    isDarkTheme: true,
  },
  contrast: {
    bodyBackgroundColor: '#000000',
    bodyForegroundColor: '#FFFFFF',
    controlBackgroundColor: '#000000',
    controlForegroundColor: '#FFFFFF',
    isDarkTheme: true,
  },
}

export const officeThemeOf = (name: ThemeName): Theme => OFFICE_THEMES[name]
export const isDark = (name: ThemeName): boolean => name !== 'light'

/** The look the screen asks for. */
export function screenTheme(): ThemeName {
  if (matchMedia('(forced-colors: active)').matches) return 'contrast'
  return matchMedia('(prefers-color-scheme: dark)').matches ? 'dark' : 'light'
}

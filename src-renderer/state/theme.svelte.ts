/** Light, dark, or what the system says; kept in the browser's own storage. */
export type Theme = 'system' | 'light' | 'dark'

const key = 'rungwise-theme'
const order: readonly Theme[] = ['system', 'light', 'dark']

export const theme: { current: Theme } = $state({ current: read() })

export function nextTheme(): void {
  theme.current = order[(order.indexOf(theme.current) + 1) % order.length] ?? 'system'
  applyTheme()
  try {
    localStorage.setItem(key, theme.current)
  } catch {
    // A page without storage still changes its colours; it only forgets them.
  }
}

export function applyTheme(): void {
  if (theme.current === 'system') delete document.documentElement.dataset['theme']
  else document.documentElement.dataset['theme'] = theme.current
}

function read(): Theme {
  try {
    const kept = localStorage.getItem(key)
    return kept === 'light' || kept === 'dark' ? kept : 'system'
  } catch {
    return 'system'
  }
}

/** Changes with their sign. Pure. */
import { fixed } from '../state/format.ts'

/** "+0.55", "−0.60", "0.00" */
export function signed(value: number | null, decimals = 2): string {
  const text = fixed(value, decimals)
  return value !== null && value > 0 && /[1-9]/.test(text) ? `+${text}` : text
}

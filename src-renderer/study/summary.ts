/** The study in the header's words. Pure. */
import type { Rules, StudyView } from '../../src-main/operations/contract.ts'
import { bounded, count, plural, signedBounded } from '../state/format.ts'

/** "9 items, 3 clinics, N = 912 (304, 297, 311), 14 answers missing, 900 complete cases". */
export function dataInWords({ data }: StudyView): string {
  const total = data.groups.reduce((sum, group) => sum + group.n, 0)
  const complete = data.groups.reduce((sum, group) => sum + group.complete, 0)
  const sizes = data.groups.length > 1 ? ` (${data.groups.map((group) => `${group.name ?? ''} ${count(group.n)}`).join(', ')})` : ''
  const parts = [plural(data.indicators.length, 'item'), `N = ${count(total)}${sizes}`]
  if (data.missing > 0) parts.push(`${plural(data.missing, 'answer')} missing`, plural(complete, 'complete case'))
  return parts.join(', ')
}

export function estimationInWords({ estimation }: StudyView): string {
  const parts: string[] = [estimation.method, estimation.statistic, estimation.missing]
  if (estimation.convention === 'wishart') parts.push('Wishart N')
  return parts.join(', ')
}

/** The project file's name, or that there is none yet. */
export function fileInWords({ file }: StudyView): string {
  return file === null ? 'not saved' : `saved in ${file.split(/[/\\]/).at(-1) ?? file}`
}

/** "difference test, α = .05, Holm". */
export function rulesInWords(rules: Rules): string {
  const test = [`α = ${bounded(rules.alpha).replace(/0$/, '')}`, ...(rules.adjust === 'holm' ? ['Holm'] : [])]
  const change = rules.changeInFit
  const fit =
    change === null
      ? []
      : [change.preset, limit('CFI', change.cfi), limit('RMSEA', change.rmsea), limit('SRMR', change.srmr)].filter(
          (text) => text !== null
        )
  if (rules.decideBy === 'difference test') return ['difference test', ...test].join(', ')
  if (rules.decideBy === 'change in fit') return ['change in fit', ...fit].join(', ')
  return ['both criteria', ...test, ...fit].join(', ')
}

function limit(name: string, value: number | null): string | null {
  return value === null ? null : `Δ${name} ${signedBounded(value)}`
}

/**
 * A plan file (YAML 1.2) as a Plan, and back. What the keys mean is in the user's guide to the plan file.
 *
 * `parsePlan(writePlan(plan))` is `plan` again for every plan that `parsePlan` can yield.
 */
import { readCandidates } from './plan-candidates.ts'
import { readData } from './plan-data.ts'
import { PlanNodes, type Spot } from './plan-nodes.ts'
import { checkPlan } from './plan-references.ts'
import {
  type Estimation,
  estimationSchema,
  invarianceLevels,
  type LadderPlan,
  type Plan,
  planSchema,
  presets,
  type Rules,
  rulesSchema,
  type StructuralSet,
  structuralSets
} from './study.ts'

export { writePlan } from './plan-writer.ts'

const KEYS = ['study', 'data', 'estimation', 'candidates', 'ladders', 'rules']

/**
 * @param fileName what messages call the file
 * @throws InputError naming file, line and column for anything that is not a plan, or a plan that contradicts itself
 */
export function parsePlan(text: string, fileName: string): Plan {
  const nodes = new PlanNodes(text, fileName)
  if (nodes.root.node === null) nodes.fail(nodes.root, 'The plan is empty.', 'It needs "study:", "data:" and "candidates:".')
  const fields = nodes.fields(nodes.root, 'The plan', KEYS, ['study', 'data', 'candidates'])
  for (const [key, spot] of fields) nodes.mark(key, spot)
  const [estimation, ladders, rules] = [fields.get('estimation'), fields.get('ladders'), fields.get('rules')]
  const plan = {
    study: nodes.name(fields.get('study')!, 'The study'),
    data: readData(nodes, fields.get('data')!),
    estimation: estimation === undefined ? estimationSchema.parse({}) : readEstimation(nodes, estimation),
    candidates: readCandidates(nodes, fields.get('candidates')!),
    ladders: ladders === undefined ? [] : readLadders(nodes, ladders),
    rules: rules === undefined ? rulesSchema.parse({}) : readRules(nodes, rules)
  }
  const checked = planSchema.parse(plan)
  checkPlan(checked, (path) => nodes.placeOf(path))
  return checked
}

function readEstimation(nodes: PlanNodes, spot: Spot): Estimation {
  const fields = nodes.fields(spot, 'The estimation', ['method', 'convention', 'statistic', 'missing', 'standard errors'])
  const word = <T extends string>(key: string, words: readonly [T, ...T[]], otherwise: T = words[0]): T => {
    const value = fields.get(key)
    if (value !== undefined) nodes.mark(`estimation.${key}`, value)
    return value === undefined ? otherwise : nodes.word(value, `The ${key}`, words)
  }
  const missing = word('missing', ['complete cases', 'full information'])
  return {
    method: word('method', ['maximum likelihood']),
    convention: word('convention', ['normal', 'wishart']),
    statistic: word('statistic', ['normal theory', 'mean-scaled']),
    missing,
    // With missing answers the expected information asks more of them than full information itself does (methods: section 3).
    standardErrors: word(
      'standard errors',
      ['expected', 'observed', 'robust'],
      missing === 'full information' ? 'observed' : 'expected'
    )
  }
}

function readLadders(nodes: PlanNodes, spot: Spot): LadderPlan[] {
  return nodes.mapping(spot, 'The ladders').map(({ key, keySpot, value }, i) => {
    nodes.mark(`ladders.${i}`, keySpot)
    if (nodes.has(value, 'list')) return { name: key, rungs: readRungs(nodes, value, key, `ladders.${i}`) }
    if (!nodes.has(value, 'mapping')) {
      nodes.fail(
        value,
        `The ladder "${key}" must list candidates, or say "invariance of:".`,
        'Write it like [bottom, middle, top].'
      )
    }
    if (nodes.mapping(value, `The ladder "${key}"`).some((entry) => entry.key === 'over')) {
      return readRepeated(nodes, value, key, `ladders.${i}`)
    }
    const fields = nodes.fields(
      value,
      `The ladder "${key}"`,
      ['invariance of', 'across', 'over', 'through', 'and'],
      ['invariance of', 'across', 'through']
    )
    const and = fields.get('and')
    nodes.mark(`ladders.${i}.invariance of`, fields.get('invariance of')!)
    nodes.mark(`ladders.${i}.across`, fields.get('across')!)
    nodes.mark(`ladders.${i}.through`, fields.get('through')!)
    return {
      name: key,
      invarianceOf: nodes.name(fields.get('invariance of')!, 'The candidate'),
      across: nodes.name(fields.get('across')!, 'The grouping'),
      through: nodes.word(fields.get('through')!, 'The highest step', invarianceLevels),
      ...(and === undefined ? {} : { and: readStructural(nodes, and, key, `ladders.${i}.and`) })
    }
  })
}

/** A ladder over the occasions of repeated measurements. */
function readRepeated(nodes: PlanNodes, spot: Spot, name: string, path: string): LadderPlan {
  const what = `The ladder "${name}"`
  const fields = nodes.fields(spot, what, ['invariance of', 'over', 'across', 'through'], ['invariance of', 'over', 'through'])
  const across = fields.get('across')
  if (across !== undefined) nodes.fail(across, `${what} goes across groups or over occasions, not both.`, 'Write two ladders.')
  for (const [key, value] of fields) nodes.mark(`${path}.${key}`, value)
  const occasions = nodes.mapping(fields.get('over')!, 'The occasions')
  if (occasions.length < 2) {
    nodes.fail(
      fields.get('over')!,
      `${what} needs two occasions or more.`,
      'Write them like { first: [a1, b1], second: [a2, b2] }.'
    )
  }
  return {
    name,
    invarianceOf: nodes.name(fields.get('invariance of')!, 'The candidate'),
    over: occasions.map(({ key, keySpot, value }, t) => {
      nodes.mark(`${path}.over.${t}`, keySpot)
      return { name: key, indicators: readOccasion(nodes, value, key, `${path}.over.${t}`) }
    }),
    through: nodes.word(fields.get('through')!, 'The highest step', invarianceLevels)
  }
}

function readOccasion(nodes: PlanNodes, spot: Spot, occasion: string, path: string): string[] {
  const items = nodes.list(spot, `What was measured at "${occasion}"`, '[sleep, pain]')
  if (items.length === 0) nodes.fail(spot, `No indicator is listed at "${occasion}".`, 'List the same ones at every occasion.')
  items.forEach((item, i) => {
    nodes.mark(`${path}.${i}`, item)
  })
  return items.map((item) => nodes.name(item, `An indicator at "${occasion}"`))
}

/** What is held equal on top of the highest level, each by itself. */
function readStructural(nodes: PlanNodes, spot: Spot, ladder: string, path: string): StructuralSet[] {
  nodes.mark(path, spot)
  const items = nodes.list(spot, `What the ladder "${ladder}" adds`, '[factor variances, factor means]')
  if (items.length === 0) nodes.fail(spot, `The ladder "${ladder}" adds nothing.`, 'List factor variances, say, or remove "and".')
  items.forEach((item, k) => {
    nodes.mark(`${path}.${k}`, item)
  })
  return items.map((item) => nodes.word(item, 'What is added', structuralSets))
}

function readRungs(nodes: PlanNodes, spot: Spot, ladder: string, path: string): string[] {
  const items = nodes.list(spot, `The ladder "${ladder}"`, '[bottom, middle, top]')
  if (items.length === 0) nodes.fail(spot, `The ladder "${ladder}" has no rung.`, 'List its candidates, bottom first.')
  items.forEach((item, r) => {
    nodes.mark(`${path}.rungs.${r}`, item)
  })
  return items.map((item) => nodes.name(item, 'A rung'))
}

function readRules(nodes: PlanNodes, spot: Spot): Rules {
  const fields = nodes.fields(spot, 'The rules', ['alpha', 'adjust', 'change in fit', 'decide by', 'scaled difference'])
  const [alpha, adjust, change, decide, scaled] = [
    fields.get('alpha'),
    fields.get('adjust'),
    fields.get('change in fit'),
    fields.get('decide by'),
    fields.get('scaled difference')
  ]
  if (decide !== undefined) nodes.mark('rules.decide by', decide)
  return {
    alpha: alpha === undefined ? 0.05 : readAlpha(nodes, alpha),
    adjust: adjust === undefined ? 'holm' : nodes.word(adjust, 'The adjustment', ['holm', 'none'] as const),
    changeInFit: change === undefined ? null : readChangeInFit(nodes, change),
    decideBy:
      decide === undefined
        ? 'difference test'
        : nodes.word(decide, '"decide by"', ['difference test', 'change in fit', 'both'] as const),
    scaledDifference:
      scaled === undefined ? 'ordinary' : nodes.word(scaled, 'The scaled difference', ['ordinary', 'strictly positive'] as const)
  }
}

function readAlpha(nodes: PlanNodes, spot: Spot): number {
  const alpha = nodes.number(spot, 'alpha')
  if (!(alpha > 0 && alpha < 1))
    nodes.fail(spot, `alpha must lie between 0 and 1, not at ${alpha}.`, 'Write 0.05 for five percent.')
  return alpha
}

function readChangeInFit(nodes: PlanNodes, spot: Spot): NonNullable<Rules['changeInFit']> {
  const unset = { cfi: null, rmsea: null, srmr: null, mcdonald: null, gammaHat: null }
  if (nodes.has(spot, 'scalar')) return { ...unset, preset: nodes.word(spot, 'The change in fit', presets) }
  const fields = nodes.fields(spot, 'The change in fit', ['cfi', 'rmsea', 'srmr', 'mcdonald', 'gamma-hat'])
  const threshold = (key: 'cfi' | 'rmsea' | 'srmr' | 'mcdonald' | 'gamma-hat', sign: 1 | -1): number | null => {
    const value = fields.get(key)
    if (value === undefined) return null
    const number = nodes.number(value, `The threshold of ${key}`)
    if (number * sign < 0) {
      const wanted =
        sign < 0 ? 'the lowest change that still holds: zero or negative' : 'the highest change that still holds: zero or positive'
      nodes.fail(value, `The threshold of ${key} is ${wanted}, not ${number}.`, `Write ${-number}.`)
    }
    return number
  }
  return {
    preset: null,
    cfi: threshold('cfi', -1),
    rmsea: threshold('rmsea', 1),
    srmr: threshold('srmr', 1),
    mcdonald: threshold('mcdonald', -1),
    gammaHat: threshold('gamma-hat', -1)
  }
}

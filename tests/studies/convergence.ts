/**
 * `npm run study:convergence`: do random but identified models converge to the smallest minimum?
 *
 * 2,000 models are drawn (1 to 8 factors, 6 to 60 indicators, 1 to 4 groups, N of 60 to 5,000 and somewhat more where a
 * group would have fewer cases than indicators, a third with missing answers), fitted as the program fits them, and checked
 * against further starts: the population's own values, and three seeded perturbations of them. A fit is
 *
 *     beaten         when a further start ends lower by more than 1e-7 (1 + F)
 *     wrongly told   when it is said to have converged, but F has a slope there or curves downwards
 *
 * Usage: convergence.ts [models] [seed]. The table goes to convergence.md beside this file when all 2,000 are done.
 */
import { writeFileSync } from 'node:fs'
import { availableParallelism } from 'node:os'
import { fileURLToPath } from 'node:url'
import { isMainThread, parentPort, Worker, workerData } from 'node:worker_threads'
import { seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import { normalObjective, type Objective } from '../../src-main/statistics/estimation/normal-likelihood.ts'
import { minimise, ordinaryScoring } from '../../src-main/statistics/estimation/scoring.ts'
import { perturbedStart } from '../../src-main/statistics/estimation/starts.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import { isPositiveDefinite } from '../../src-main/statistics/matrix/symmetric.ts'
import { type CompiledModel, compileModel } from '../../src-main/statistics/model/compile.ts'
import { type DataDesign, type ModelDesign, pick, type RandomModel, randomData, randomModel, sizeBetween } from './random-models.ts'

const fullStudy = 2000
const furtherStarts = 4

interface Finding {
  index: number
  design: ModelDesign & DataDesign
  n: number
  state: string
  reason: string | null
  firstStart: boolean
  starts: number
  iterations: number
  milliseconds: number
  improper: boolean
  /** F here less the smallest F of the further starts, when positive. */
  beatenBy: number
  wronglyTold: boolean
  /** Further starts that converged. */
  others: number
}

/** The design of model `index`; all of it follows from the seed. */
function drawStudy(
  index: number,
  seed: number
): { model: RandomModel; data: DataDesign; generator: ReturnType<typeof seededGenerator> } {
  const generator = seededGenerator(seed + 7919 * index)
  const indicators = sizeBetween(generator, 6, 60)
  const factors = 1 + Math.floor(generator.uniform() * Math.min(8, Math.floor(indicators / 3)))
  const kinds = ['simple structure', 'simple structure', 'cross-loadings', 'residual covariances'] as const
  const design: ModelDesign = {
    kind: factors >= 4 && generator.uniform() < 0.2 ? 'second-order factor' : pick(generator, kinds),
    factors,
    indicators,
    groups: 1 + Math.floor(generator.uniform() * 4),
    level: pick(generator, ['same pattern', 'equal loadings', 'equal intercepts', 'equal residual variances']),
    scaling: pick(generator, ['first loading', 'factor variance', 'effects coding']),
    misfit: pick(generator, [0, 0.1, 0.2])
  }
  const data: DataDesign = {
    total: sizeBetween(generator, 60, 5000),
    patterns: generator.uniform() < 1 / 3 ? 2 + Math.floor(generator.uniform() * 7) : 1
  }
  return { model: randomModel(design, generator), data, generator }
}

function examine(index: number, seed: number): Finding {
  const { model, data, generator } = drawStudy(index, seed)
  const { moments } = randomData(model, data, generator)
  // Processor time of this thread, which other work on the machine does not stretch as it does the clock's.
  const before = process.threadCpuUsage()
  const { fit, gamma } = fitModel(model.cells, moments, { convention: 'normal' })
  const spent = process.threadCpuUsage(before)
  const milliseconds = (spent.user + spent.system) / 1000
  const compiled = compileModel(model.cells)
  const objective = normalObjective(compiled, moments, 'normal')
  const ends = furtherEnds(compiled, objective, model, seed + index)
  const smallest = Math.min(...ends)
  const value = fit.minimum ?? Number.POSITIVE_INFINITY
  const improper = ['negative-residual-variance', 'negative-factor-variance', 'factor-correlation-beyond-one', 'not-positive']
  return {
    index,
    design: { ...model.design, ...data },
    n: moments.groups.reduce((sum, g) => sum + g.n, 0),
    state: fit.state,
    reason: fit.reason,
    firstStart: fit.convergence.tried[0]?.stop === 'converged',
    starts: fit.convergence.starts,
    iterations: fit.convergence.iterations,
    milliseconds,
    improper: fit.cautions.some((caution) => improper.some((code) => caution.code.includes(code))),
    beatenBy: value - smallest > 1e-7 * (1 + Math.abs(smallest)) ? value - smallest : 0,
    wronglyTold: gamma !== null && !isMinimum(objective, Float64Array.from(gamma), seed + index),
    others: ends.length
  }
}

/** F where further starts end, of those that converge: the population's values, then perturbations of them that are feasible. */
function furtherEnds(model: CompiledModel, objective: Objective, { truth }: RandomModel, seed: number): number[] {
  const generator = seededGenerator(seed)
  const population = Float64Array.from(model.gammaLabels, (label) => truth.get(label)!)
  const ends: number[] = []
  for (let at = 0; at < furtherStarts; at++) {
    let start: Float64Array = population
    for (let draws = 0; at > 0 && draws < 30; draws++) {
      start = perturbedStart(model, population, generator)
      if (!Number.isNaN(objective.evaluate(start))) break
    }
    const { stop, value } = minimise(objective, start, { ...ordinaryScoring, iterations: 200 })
    if (stop === 'converged') ends.push(value)
  }
  return ends
}

/** No slope along random directions (central differences of F), and observed second derivatives that do not curve downwards. */
function isMinimum(objective: Objective, gamma: Float64Array, seed: number): boolean {
  const q = objective.parameters
  const generator = seededGenerator(seed)
  objective.evaluate(gamma)
  const expected = new Float64Array(q * q)
  objective.derive(new Float64Array(q), expected)
  const observed = new Float64Array(q * q)
  objective.derive(new Float64Array(q), observed, 'observed')
  for (let k = 0; k < q; k++) observed[k * q + k]! += 1e-8 * expected[k * q + k]!
  if (!isPositiveDefinite(observed, q)) return false
  for (let round = 0; round < 4; round++) {
    const direction = gamma.map((_, k) => generator.normal() / Math.sqrt(q * expected[k * q + k]!))
    const at = (step: number) => objective.evaluate(gamma.map((value, k) => value + step * direction[k]!))
    if (!(Math.abs(at(1e-4) - at(-1e-4)) / 2e-4 < 1e-6)) return false
  }
  return true
}

interface Task {
  models: number
  seed: number
  worker: number
  workers: number
}

async function main(): Promise<void> {
  const models = Number(process.argv[2] ?? fullStudy)
  const seed = Number(process.argv[3] ?? 20_261_201)
  const workers = Math.min(availableParallelism(), 8)
  const started = performance.now()
  const findings = (
    await Promise.all(Array.from({ length: workers }, (_, worker) => run({ models, seed, worker, workers })))
  ).flat()
  findings.sort((a, b) => a.index - b.index)
  const text = report(findings, seed)
  console.log(`${text}\n${Math.round((performance.now() - started) / 1000)} seconds with ${workers} workers`)
  for (const finding of findings.filter(bad)) console.log(describe(finding))
  if (models === fullStudy) writeFileSync(fileURLToPath(new URL('./convergence.md', import.meta.url)), text)
}

function run(task: Task): Promise<Finding[]> {
  return new Promise((resolve, reject) => {
    const worker = new Worker(new URL(import.meta.url), { workerData: task })
    worker.once('message', resolve)
    worker.once('error', reject)
  })
}

function bad(finding: Finding): boolean {
  return finding.state !== 'fitted' || finding.beatenBy > 0 || finding.wronglyTold
}

function describe({ index, design, n, state, reason, beatenBy, wronglyTold, starts, others }: Finding): string {
  const { kind, factors, indicators, groups, level, scaling, misfit, patterns } = design
  const what = `${indicators} on ${factors} in ${groups} (n ${n}, ${patterns} patterns): ${kind}, ${level}, ${scaling}, misfit ${misfit}`
  return `#${index} ${state}${wronglyTold ? ' WRONGLY' : ''}, beaten by ${beatenBy.toExponential(1)}, ${starts} starts, ${others} others: ${what} ${reason ?? ''}`
}

interface SizeClass {
  name: string
  holds: (finding: Finding) => boolean
}

const classes: SizeClass[] = [
  ...[
    [6, 14],
    [15, 29],
    [30, 60]
  ].flatMap(([low, high]) =>
    [false, true].map((missing) => ({
      name: `${low} to ${high} indicators, ${missing ? 'missing answers' : 'complete'}`,
      holds: ({ design }: Finding) => design.indicators >= low! && design.indicators <= high! && design.patterns > 1 === missing
    }))
  ),
  { name: 'all', holds: () => true }
]

function report(findings: Finding[], seed: number): string {
  const head = [
    'models of',
    'models',
    'from the first start',
    'converged',
    'to the smallest minimum seen',
    'no start converges',
    'improper',
    'convergence wrongly told',
    'median iterations',
    'median ms'
  ]
  const lines = classes.map(({ name, holds }) => [name, ...counts(findings.filter(holds))])
  const others = findings.reduce((sum, finding) => sum + finding.others, 0)
  const table = [head, head.map(() => '---'), ...lines].map((row) => `| ${row.join(' | ')} |`).join('\n')
  return `${findings.length} random models, seed ${seed}. ${others} of ${furtherStarts * findings.length} further starts converged; a minimum is the smallest seen when none of them ended lower. Times are a fit's processor time.\n\n${table}\n`
}

function counts(of: Finding[]): string[] {
  const share = (holds: (finding: Finding) => boolean) => {
    const count = of.filter(holds).length
    return `${count} (${((100 * count) / Math.max(of.length, 1)).toFixed(1)}%)`
  }
  return [
    String(of.length),
    share((f) => f.firstStart),
    share((f) => f.state === 'fitted'),
    share((f) => f.state === 'fitted' && f.beatenBy === 0),
    share((f) => f.state !== 'fitted' && f.others === 0),
    share((f) => f.improper),
    String(of.filter((f) => f.wronglyTold).length),
    String(median(of.map((f) => f.iterations))),
    median(of.map((f) => f.milliseconds)).toFixed(1)
  ]
}

function median(values: number[]): number {
  const sorted = [...values].sort((a, b) => a - b)
  return sorted[Math.floor(sorted.length / 2)] ?? 0
}

if (isMainThread) await main()
else {
  const { models, seed, worker, workers } = workerData as Task
  const findings: Finding[] = []
  for (let index = worker; index < models; index += workers) findings.push(examine(index, seed))
  parentPort!.postMessage(findings)
}

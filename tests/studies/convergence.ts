/**
 * `npm run study:convergence`: do random but identified models converge to the smallest minimum?
 *
 * 2,000 models are drawn (1 to 8 factors, 6 to 60 indicators, 1 to 4 groups, N of 60 to 5,000 and somewhat more where a
 * group would have fewer cases than indicators, a third with missing answers) and examined (examine.ts).
 *
 * Usage: convergence.ts [models] [seed]. The table goes to convergence.md beside this file when all 2,000 are done.
 */
import { writeFileSync } from 'node:fs'
import { availableParallelism } from 'node:os'
import { fileURLToPath } from 'node:url'
import { isMainThread, parentPort, Worker, workerData } from 'node:worker_threads'
import { examine, type Finding, furtherStarts } from './examine.ts'

const fullStudy = 2000

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

function describe({ index, design, n, state, reason, beatenBy, wronglyTold, others }: Finding): string {
  const { kind, factors, indicators, groups, level, scaling, patterns } = design
  const what = `${indicators} indicators on ${factors} factors in ${groups} groups, N = ${n}, ${patterns} patterns, ${kind}, ${level}, ${scaling}`
  const beaten = beatenBy > 0 ? `, beaten by ${beatenBy.toExponential(1)}` : ''
  return `- ${index}: ${state}${wronglyTold ? ', wrongly' : ''}${beaten} (${what}; ${others} of ${furtherStarts} further starts converge). ${reason ?? ''}`
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
  const rest = findings.filter(bad).map(describe)
  const table = [head, head.map(() => '---'), ...lines].map((row) => `| ${row.join(' | ')} |`).join('\n')
  return `${findings.length} random models, seed ${seed}. ${others} of ${furtherStarts * findings.length} further starts converged; a minimum is the smallest seen when none of them ended lower. Times are a fit's processor time.\n\n${table}\n${rest.length > 0 ? `\nThe others, by number:\n\n${rest.join('\n')}\n` : ''}`
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

/**
 * `npm run bench`: medians over repeats, ratios to a plain reference loop timed in the same run (timing.ts), the powers
 * with which time grows, and the memory that a scaled statistic takes.
 *
 * Times depend on the machine and on what else it does; ratios much less.
 */
import { relationOf } from '../../src-main/statistics/comparison/relation.ts'
import { seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import { normalObjective } from '../../src-main/statistics/estimation/normal-likelihood.ts'
import { startingValues } from '../../src-main/statistics/estimation/starts.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import { compileModel } from '../../src-main/statistics/model/compile.ts'
import { completeCaseMoments, type SampleMoments } from '../../src-main/statistics/moments/sample-moments.ts'
import { groupNames, ladderCells, oneGroupCells, patternMoments, rowsWithHoles } from './cases.ts'
import { relationsTiming } from './relations.ts'
import { simulate, simulateRows } from './simulate.ts'
import { stabilityTiming } from './stability.ts'
import { exponent, referenceLoop, type Timing, time } from './timing.ts'

const settings = { convention: 'normal' as const }
const scaledSettings = { convention: 'normal', statistic: 'mean-scaled', standardErrors: 'robust' } as const

function oneFit(p: number, m: number, n: number, repeats: number, target: number): Timing {
  const cells = oneGroupCells(p, m)
  const moments = simulate(p, m, [n], seededGenerator(p * 100 + m))
  return time(`one fit, ${p} indicators on ${m} factors, N = ${n}`, repeats, target, () => fitModel(cells, moments, settings))
}

function ladder(p: number, m: number, groups: number, n: number, repeats: number, target: number): Timing {
  const cells = ladderCells(p, m, groups)
  const sizes = Array.from({ length: groups }, () => n)
  const moments = simulate(p, m, sizes, seededGenerator(p * 100 + m))
  const name = `invariance ladder (4 rungs, 3 proofs), ${p} indicators on ${m} factors in ${groups} groups of ${n}`
  return time(name, repeats, target, () => {
    const fits = cells.map((c) => fitModel(c, moments, settings))
    for (let i = 1; i < cells.length; i++) {
      relationOf({
        general: cells[i - 1]!,
        generalGamma: fits[i - 1]!.gamma!,
        restricted: cells[i]!,
        restrictedGamma: fits[i]!.gamma!,
        sizes
      })
    }
    return fits
  })
}

/** Where the time of a fit goes: one evaluation of F alone, with gradient, with gradient and information; starts. */
function shares(p: number, m: number): Timing[] {
  const cells = oneGroupCells(p, m)
  const moments = simulate(p, m, [500], seededGenerator(p * 100 + m))
  const model = compileModel(cells)
  const start = startingValues(model, moments)
  const gradient = new Float64Array(model.parameters)
  const curvature = new Float64Array(model.parameters ** 2)
  const both = { short: normalObjective(model, moments, 'normal'), dense: normalObjective(model, moments, 'normal', 'dense') }
  const once = (objective: typeof both.short, ...into: [] | [Float64Array] | [Float64Array, Float64Array]) => {
    objective.evaluate(start)
    if (into[0] !== undefined) objective.derive(into[0], into[1])
  }
  const iterations = fitModel(cells, moments, settings).fit.convergence.iterations
  return [
    time(`  its parts: compile`, 50, null, () => compileModel(cells)),
    time(`  its parts: starting values`, 50, null, () => startingValues(model, moments)),
    time(`  its parts: F once`, 100, null, () => once(both.short)),
    time(`  its parts: F and gradient once`, 100, null, () => once(both.short, gradient)),
    time(`  its parts: F, gradient and information once (${iterations} iterations a fit)`, 100, null, () =>
      once(both.short, gradient, curvature)
    ),
    time(`  the same by the dense twin`, 100, null, () => once(both.dense, gradient, curvature))
  ]
}

function fullInformation(n: number, p: number, m: number, patterns: number, repeats: number): Timing[] {
  const values = rowsWithHoles(n, p, m, patterns)
  const cells = oneGroupCells(p, m)
  const moments = patternMoments(values, p)
  const found = moments.groups[0]!.patterns!.length
  const name = `full information, ${n} rows, ${p} indicators, ${found} patterns`
  return [
    time(`${name}: from rows to standard errors`, repeats, 500, () =>
      fitModel(cells, patternMoments(values, p), { ...settings, standardErrors: 'observed' })
    ),
    time('  its parts: patterns and unrestricted moments', repeats, null, () => patternMoments(values, p)),
    time('  its parts: the fit', repeats, null, () => fitModel(cells, moments, { ...settings, standardErrors: 'observed' }))
  ]
}

function scaledFit(n: number, p: number, m: number): { fit: () => unknown; name: string } {
  const rows = simulateRows(p, m, n, 0, seededGenerator(n + p))
  const cells = oneGroupCells(p, m)
  const indicators = cells.indicators
  const fit = () => {
    const moments: SampleMoments = { indicators, groups: [{ name: null, ...completeCaseMoments(rows, p) }] }
    return fitModel(cells, moments, scaledSettings, [rows])
  }
  return { fit, name: `scaled statistic and robust errors, ${n} rows, ${p} indicators` }
}

function scalarFit(p: number, m: number, groups: number, n: number, repeats: number, target: number): Timing {
  const cells = ladderCells(p, m, groups)[2]!
  const moments = simulate(
    p,
    m,
    groupNames(groups).map(() => n),
    seededGenerator(p)
  )
  const name = `equal intercepts, ${p} indicators on ${m} factors in ${groups} groups of ${n} (${compileModel(cells).parameters} parameters)`
  return time(name, repeats, target, () => fitModel(cells, moments, settings))
}

/** Fastest times over growing sizes, and the power that fits them. */
function growth(name: string, sizes: readonly number[], work: (size: number) => () => unknown): string {
  const times = sizes.map((size) => time('', 7, null, work(size)).fastest)
  const each = sizes.map((size, i) => `${size}: ${times[i]!.toFixed(2)} ms`).join(', ')
  return `time grows with ${name} to the power ${exponent(sizes, times).toFixed(2)} (${each})`
}

function growthOfFit(p: number, m: number): () => unknown {
  const cells = oneGroupCells(p, m)
  const moments = simulate(p, m, [1000], seededGenerator(p))
  return () => fitModel(cells, moments, settings)
}

const peakMemory = () => process.resourceUsage().maxRSS / 1024

const reference = time('reference loop: 1e6 multiply-adds of a dot product', 50, null, referenceLoop)

// First, so that the peak of memory is its own.
const scaled = scaledFit(10_000, 40, 4)
const memoryBefore = peakMemory()
const scaledTiming = time(scaled.name, 5, 1000, scaled.fit)
const memory = peakMemory() - memoryBefore

const timings = [
  reference,
  oneFit(9, 3, 500, 200, 1),
  ...shares(9, 3),
  oneFit(60, 6, 500, 30, 60),
  ...shares(60, 6),
  ladder(20, 4, 4, 300, 15, 250),
  ...fullInformation(5000, 20, 4, 200, 9),
  scaledTiming,
  scalarFit(120, 12, 6, 400, 3, 3000)
]
console.log('median ms  fastest ms   ratio to reference   target ms')
for (const { name, median: ms, fastest, target } of timings) {
  const numbers = [
    ms.toFixed(3).padStart(9),
    fastest.toFixed(3).padStart(11),
    (ms / reference.median).toFixed(2).padStart(20),
    (target === null ? '' : `< ${target}`).padStart(11)
  ]
  console.log(`${numbers.join(' ')}   ${name}`)
}
console.log(`peak memory of the scaled statistic: ${memory.toFixed(0)} MB more than before it (target < 300)`)

console.log(growth('p in one fit, ten indicators a factor', [20, 40, 80, 160], (p) => growthOfFit(p, p / 10)))
console.log(growth('N in a scaled statistic, 20 indicators', [1000, 4000, 16_000], (n) => scaledFit(n, 20, 4).fit))
console.log(growth('N in full information, 20 indicators, N / 25 patterns', [1000, 2000, 4000], fullInformationOf))
console.log(
  growth('q in one fit, 40 indicators with equal intercepts in 2, 4 and 8 groups', parametersOf([2, 4, 8]), fitWithParameters)
)

for (const { name, median, refits, pairs, target } of relationsTiming()) {
  const ratio = (median / reference.median).toFixed(0)
  console.log(
    `${name}: ${median.toFixed(0)} ms, ${ratio} times the reference (target < ${target} ms); ${refits} of ${pairs} pairs refitted`
  )
}

const stability = await stabilityTiming()
const seconds = (stability.milliseconds / 1000).toFixed(1)
console.log(
  `${stability.name}, ${stability.threads} threads: ${seconds} s, ${(stability.milliseconds / reference.median).toFixed(0)} times the reference (target < ${stability.target / 1000} s), ${stability.failed} fits failed`
)

/** q of equal intercepts in so many groups. */
function parametersOf(groups: readonly number[]): number[] {
  return groups.map((g) => compileModel(ladderCells(40, 4, g)[2]!).parameters)
}

function fitWithParameters(q: number): () => unknown {
  return groupsOf([2, 4, 8].find((groups) => parametersOf([groups])[0] === q)!)
}

function fullInformationOf(n: number): () => unknown {
  const moments = patternMoments(rowsWithHoles(n, 20, 4, n / 25), 20)
  const cells = oneGroupCells(20, 4)
  return () => fitModel(cells, moments, settings)
}

function groupsOf(groups: number): () => unknown {
  const cells = ladderCells(40, 4, groups)[2]!
  const moments = simulate(
    40,
    4,
    groupNames(groups).map(() => 300),
    seededGenerator(groups)
  )
  return () => fitModel(cells, moments, settings)
}

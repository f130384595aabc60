/**
 * `npm run bench`: medians over repeats, and ratios to a plain reference loop timed in the same run.
 *
 * The reference is one million multiply-adds of a dot product over a Float64Array of 1,000 numbers, in plain JavaScript:
 * what this machine does with the simplest loop there is. Times depend on the machine; ratios much less.
 */

import { relationOf } from '../../src-main/statistics/comparison/relation.ts'
import { seededGenerator } from '../../src-main/statistics/distributions/generator.ts'
import { normalObjective } from '../../src-main/statistics/estimation/normal-likelihood.ts'
import { startingValues } from '../../src-main/statistics/estimation/starts.ts'
import { fitModel } from '../../src-main/statistics/fit/fit.ts'
import { compileModel } from '../../src-main/statistics/model/compile.ts'
import { candidateCells, type ModelFrame, resolveCandidate } from '../../src-main/study/candidate-model.ts'
import { ladderCandidates } from '../../src-main/study/ladders.ts'
import type { Candidate } from '../../src-main/study/study.ts'
import { candidateSchema } from '../../src-main/study/study.ts'
import { simulate } from './simulate.ts'

interface Timing {
  name: string
  median: number
  repeats: number
  target: number | null
}

function median(values: number[]): number {
  const sorted = [...values].sort((a, b) => a - b)
  return (sorted[Math.floor((sorted.length - 1) / 2)]! + sorted[Math.ceil((sorted.length - 1) / 2)]!) / 2
}

/** Median milliseconds of `work` after a warm-up of a fifth of the repeats. */
function time(name: string, repeats: number, target: number | null, work: () => unknown): Timing {
  for (let i = 0; i < Math.ceil(repeats / 5); i++) work()
  const times: number[] = []
  for (let i = 0; i < repeats; i++) {
    const start = performance.now()
    work()
    times.push(performance.now() - start)
  }
  return { name, median: median(times), repeats, target }
}

const a = Float64Array.from({ length: 1000 }, (_, i) => Math.sin(i))
const b = Float64Array.from({ length: 1000 }, (_, i) => Math.cos(i))
function referenceLoop(): number {
  let sum = 0
  for (let round = 0; round < 1000; round++) for (let i = 0; i < 1000; i++) sum += a[i]! * b[i]!
  return sum
}

function simpleStructure(p: number, m: number): Candidate {
  const per = p / m
  const factors = Array.from({ length: m }, (_, k) => ({
    name: `F${k + 1}`,
    measures: Array.from({ length: per }, (_, i) => `y${k * per + i + 1}`)
  }))
  return candidateSchema.parse({ name: 'base', factors })
}

function frameOf(p: number, groups: (string | null)[]): ModelFrame {
  return {
    indicators: Array.from({ length: p }, (_, i) => `y${i + 1}`),
    grouping: groups.length > 1 ? 'group' : null,
    groups,
    means: true
  }
}

const settings = { convention: 'normal' as const }

function oneFit(p: number, m: number, n: number, repeats: number, target: number): Timing {
  const candidate = simpleStructure(p, m)
  const cells = candidateCells(resolveCandidate('base', [candidate]), frameOf(p, [null]))
  const moments = simulate(p, m, [n], seededGenerator(p * 100 + m))
  return time(`one fit, ${p} indicators on ${m} factors, N = ${n}`, repeats, target, () => fitModel(cells, moments, settings))
}

function ladder(p: number, m: number, groups: number, n: number, repeats: number, target: number): Timing {
  const base = simpleStructure(p, m)
  const names = Array.from({ length: groups }, (_, g) => `g${g + 1}`)
  const rungs = ladderCandidates({ name: 'ladder', invarianceOf: 'base', across: 'group', through: 'strict' }, [base])
  const family = [base, ...rungs]
  const cells = rungs.map((rung) => candidateCells(resolveCandidate(rung.name, family), frameOf(p, names)))
  const moments = simulate(
    p,
    m,
    names.map(() => n),
    seededGenerator(p * 100 + m)
  )
  return time(
    `invariance ladder (4 rungs, 3 proofs), ${p} indicators on ${m} factors in ${groups} groups of ${n}`,
    repeats,
    target,
    () => {
      const fits = cells.map((c) => fitModel(c, moments, settings))
      for (let i = 1; i < cells.length; i++) {
        relationOf({
          general: cells[i - 1]!,
          generalGamma: fits[i - 1]!.gamma!,
          restricted: cells[i]!,
          restrictedGamma: fits[i]!.gamma!,
          sizes: moments.groups.map((g) => g.n)
        })
      }
      return fits
    }
  )
}

/** Where the time of a fit goes: one evaluation of F alone, with gradient, with gradient and information; starts. */
function shares(p: number, m: number): Timing[] {
  const cells = candidateCells(resolveCandidate('base', [simpleStructure(p, m)]), frameOf(p, [null]))
  const moments = simulate(p, m, [500], seededGenerator(p * 100 + m))
  const model = compileModel(cells)
  const objective = normalObjective(model, moments, 'normal')
  const start = startingValues(model, moments)
  const gradient = new Float64Array(model.parameters)
  const curvature = new Float64Array(model.parameters ** 2)
  const derivatives = (...into: [Float64Array, Float64Array?]) => {
    objective.evaluate(start)
    objective.derive(...into)
  }
  const iterations = fitModel(cells, moments, settings).fit.convergence.iterations
  return [
    time(`  its parts: compile`, 50, null, () => compileModel(cells)),
    time(`  its parts: starting values`, 50, null, () => startingValues(model, moments)),
    time(`  its parts: F once`, 50, null, () => objective.evaluate(start)),
    time(`  its parts: F and gradient once`, 50, null, () => derivatives(gradient)),
    time(`  its parts: F, gradient and information once (${iterations} iterations a fit)`, 50, null, () =>
      derivatives(gradient, curvature)
    )
  ]
}

const reference = time('reference loop: 1e6 multiply-adds of a dot product', 50, null, referenceLoop)
const timings = [
  reference,
  oneFit(9, 3, 500, 200, 1),
  ...shares(9, 3),
  oneFit(60, 6, 500, 30, 60),
  ...shares(60, 6),
  ladder(20, 4, 4, 300, 15, 250)
]
console.log('median ms   ratio to reference   target ms')
for (const { name, median: ms, target } of timings) {
  const numbers = [
    ms.toFixed(3).padStart(9),
    (ms / reference.median).toFixed(2).padStart(20),
    (target === null ? '' : `< ${target}`).padStart(11)
  ]
  console.log(`${numbers.join(' ')}   ${name}`)
}

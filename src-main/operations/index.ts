/**
 * The workbench: every operation of the contract under its name, each with the schema of its input.
 *
 * Both shells call `call(name, input)` with what came over their wire; the schema decides whether it is an input at all.
 */
import { z } from 'zod'
import { InputError } from '../study/input-error.ts'
import { candidateSchema, estimationSchema, ladderPlanSchema, releaseSchema, rulesSchema } from '../study/study.ts'
import { Bench, type BenchParts } from './bench.ts'
import { listFolder, previewData } from './browse.ts'
import { addCandidate, addLadder, changeRules } from './change-study.ts'
import { checkCandidate } from './check-candidate.ts'
import type { Answer, OperationName, Operations, WorkEvent } from './contract.ts'
import { effectSizes } from './effect-sizes.ts'
import { familyRelations } from './family-relations.ts'
import { cancelWork, fitCandidates } from './fit-candidates.ts'
import { latentMeans } from './latent-means.ts'
import { currentStudy, newStudy, openPlan, openProject, openSample } from './open-study.ts'
import { recordDecision } from './record-decision.ts'
import { releaseByHand, releaseSearch } from './release-search.ts'
import { exportPlan, exportResult, saveProject } from './save-and-export.ts'
import { scoreTests } from './score-tests.ts'
import { stability } from './stability.ts'

export interface Workbench {
  /** @throws whatever is not bad input: an unknown name, a bug */
  call<N extends OperationName>(name: N, input: unknown): Promise<Answer<Operations[N]['result']>>
  call(name: string, input: unknown): Promise<Answer<unknown>>
  onWork(listener: (event: WorkEvent) => void): () => void
  /** Stops running work, keeps what was finished, ends the crew and closes the project. */
  close(): Promise<void>
}

export function createWorkbench(parts: BenchParts): Workbench {
  const bench = new Bench(parts)
  return {
    call: (name: string, input: unknown) => bench.during(() => answer(bench, name, input)),
    onWork: (listener) => bench.onWork(listener),
    close: () => bench.close()
  }
}

interface Operation<N extends OperationName> {
  input: z.ZodType<Operations[N]['input']>
  run: (bench: Bench, input: Operations[N]['input']) => Operations[N]['result'] | Promise<Operations[N]['result']>
}

const nothing = z.null()
const words = z.string().trim().min(1)
const path = z.strictObject({ path: z.string().min(1) })

const operations: { readonly [N in OperationName]: Operation<N> } = {
  currentStudy: { input: nothing, run: currentStudy },
  openSample: { input: nothing, run: openSample },
  openPlan: { input: path, run: openPlan },
  openProject: { input: path, run: openProject },
  listFolder: { input: z.strictObject({ path: z.string().min(1).nullable() }), run: listFolder },
  previewData: { input: z.strictObject({ path: z.string().min(1), missingCodes: z.array(z.string()) }), run: previewData },
  newStudy: {
    input: z.strictObject({
      study: words,
      path: z.string().min(1),
      indicators: z.array(words).min(1),
      group: words.nullable(),
      missingCodes: z.array(z.string()),
      estimation: estimationSchema,
      rules: rulesSchema
    }),
    run: newStudy
  },
  checkCandidate: { input: z.strictObject({ candidate: candidateSchema }), run: checkCandidate },
  addCandidate: { input: z.strictObject({ candidate: candidateSchema }), run: addCandidate },
  addLadder: { input: z.strictObject({ ladder: ladderPlanSchema }), run: addLadder },
  changeRules: { input: z.strictObject({ rules: rulesSchema }), run: changeRules },
  fitCandidates: { input: z.strictObject({ names: z.array(words).nullable() }), run: fitCandidates },
  cancelWork: { input: nothing, run: cancelWork },
  scoreTests: { input: z.strictObject({ candidate: words }), run: scoreTests },
  releaseByHand: {
    input: z.strictObject({ candidate: words, releases: z.array(releaseSchema).min(1) }),
    run: releaseByHand
  },
  releaseSearch: { input: z.strictObject({ ladder: words, rung: words }), run: releaseSearch },
  effectSizes: { input: z.strictObject({ candidate: words }), run: effectSizes },
  latentMeans: { input: z.strictObject({ candidate: words }), run: latentMeans },
  stability: {
    input: z.strictObject({ ladder: words, resamples: z.int().min(1).max(100_000), seed: z.int() }),
    run: stability
  },
  familyRelations: { input: nothing, run: familyRelations },
  recordDecision: { input: z.strictObject({ ladder: words, rung: words, reason: words }), run: recordDecision },
  saveProject: { input: path, run: saveProject },
  exportPlan: { input: path, run: exportPlan },
  exportResult: { input: path, run: exportResult }
}

async function answer(bench: Bench, name: string, input: unknown): Promise<Answer<never>> {
  if (!Object.hasOwn(operations, name)) throw new Error(`there is no operation "${name}"`)
  // The table pairs each schema with its own operation; the pairing is lost once the name is a variable.
  const operation = operations[name as OperationName] as unknown as {
    input: z.ZodType
    run: (bench: Bench, input: unknown) => unknown
  }
  try {
    return { ok: true, value: (await operation.run(bench, parsed(operation.input, input))) as never }
  } catch (error) {
    if (!(error instanceof InputError)) throw error
    return { ok: false, problem: { what: error.what, where: error.where, remedy: error.remedy } }
  }
}

function parsed(schema: z.ZodType, input: unknown): unknown {
  const result = schema.safeParse(input)
  if (result.success) return result.data
  const issue = result.error.issues[0]
  throw new InputError(issue?.message ?? 'this is not what was asked for', { where: issue?.path.join('.') || null })
}

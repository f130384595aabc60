/**
 * The open study: one project database, in memory until it is saved, and every change that can be made to it.
 *
 * Each change writes its data and its row of the trail in one transaction; what is read comes from the database, except
 * the data set and the outcomes of fits, which are kept once read (they never change).
 */
import { basename, resolve } from 'node:path'
import type Database from 'better-sqlite3'
import { ZodError } from 'zod'
import { digestOf as dataDigest } from '../importing/digest.ts'
import { InputError } from '../study/input-error.ts'
import type { LadderResult } from '../study/result.ts'
import {
  type Candidate,
  candidateSchema,
  type DataSet,
  type LadderPlan,
  ladderPlanSchema,
  type Origin,
  type Plan,
  planSchema,
  type Rules
} from '../study/study.ts'
import type { FitOutcome, RelationOutcome } from '../workers/jobs.ts'
import { canonicalJson, digestOf } from './canonical-json.ts'
import { hasData, readData, writeData } from './data-store.ts'
import { closeDatabase, refusedBySystem } from './database.ts'
import { copyInto, createFile, createInMemory, openFile } from './project-file.ts'
import type { Clock, Decision, RecordedFit, RecordedRelation } from './records.ts'
import { sentences } from './sentences.ts'
import { appendTrail, readTrail, type TrailBreak, type TrailEvent, type TrailRow, verifyTrail } from './trail.ts'

interface StudyRow {
  plan: string
  folder: string | null
  data_digest: string
}

/** An unsaved, empty project. */
export function createInMemoryProject(clock: Clock): Project {
  return new Project(createInMemory(), null, clock)
}

/**
 * A new, empty project file.
 *
 * @throws InputError when something is there already or the folder cannot be written.
 */
export function createProjectFile(path: string, clock: Clock): Project {
  return new Project(createFile(path), resolve(path), clock)
}

/**
 * Opens a project file and checks it: the data against their digest (a mismatch refuses the file), the trail against
 * itself (a break is told by `trailBreak`, the study still opens).
 *
 * @param judge looks at what the file holds (a copy of it) and throws to refuse it
 * @throws InputError for a file that is missing, not ours, of a newer version, damaged or locked. A refused file is
 *   left untouched, whoever refused it.
 */
export function openProjectFile(path: string, clock: Clock, judge: (project: Project) => void = () => {}): Project {
  const file = resolve(path)
  const check = (copy: Database.Database) => {
    const project = new Project(copy, file, clock)
    project.verifyContent()
    judge(project)
  }
  return new Project(openFile(file, check), file, clock)
}

export class Project {
  /** Absolute path of the file; null while the study lives in memory only. */
  readonly file: string | null
  /** What was wrong with the trail when the project was opened; null when it was intact. */
  readonly trailBreak: TrailBreak | null
  readonly #database: Database.Database
  readonly #clock: Clock
  #data: DataSet | null = null
  #fits: Map<string, FitOutcome> | null = null
  #relations: Map<string, RelationOutcome> | null = null

  constructor(database: Database.Database, file: string | null, clock: Clock) {
    this.#database = database
    this.file = file
    this.#clock = clock
    this.trailBreak = verifyTrail(database)
  }

  /** True until `start`. */
  get isEmpty(): boolean {
    return this.#studyRow() === undefined
  }

  /** True once anything was fitted: from then on the rules stand and what is added is "added after results". */
  get hasFits(): boolean {
    return this.#database.prepare('SELECT 1 FROM fit LIMIT 1').get() !== undefined
  }

  /** The whole plan, candidates and ladders in the order they were added. */
  plan(): Plan {
    const frame = JSON.parse(this.#requireStudy().plan) as unknown
    const plan = planSchema.parse(frame)
    return { ...plan, candidates: this.#list('candidate', candidateSchema), ladders: this.#list('ladder', ladderPlanSchema) }
  }

  /** The folder that the plan's data file is named from; null for published figures and for studies begun elsewhere. */
  folder(): string | null {
    return this.#requireStudy().folder
  }

  data(): DataSet {
    this.#data ??= readData(this.#database, this.#requireStudy().data_digest)
    return this.#data
  }

  candidateOrigins(): Map<string, Origin> {
    return this.#origins('candidate')
  }

  ladderOrigins(): Map<string, Origin> {
    return this.#origins('ladder')
  }

  /** Every fit so far by digest, failed ones included. The map is the project's own: add by `recordFit`. */
  fits(): ReadonlyMap<string, FitOutcome> {
    this.#fits ??= this.#outcomes<FitOutcome>('fit')
    return this.#fits
  }

  relations(): ReadonlyMap<string, RelationOutcome> {
    this.#relations ??= this.#outcomes<RelationOutcome>('relation')
    return this.#relations
  }

  /** All decisions, oldest first; a later one for the same ladder stands beside the earlier. */
  decisions(): (Decision & { at: string })[] {
    const rows = this.#database
      .prepare<[], { decision: string; at: string }>('SELECT decision, at FROM decision ORDER BY number')
      .all()
    return rows.map(({ decision, at }) => ({ ...(JSON.parse(decision) as Decision), at }))
  }

  trail(): TrailRow[] {
    return readTrail(this.#database)
  }

  /** Goes through the whole record again; null when it agrees with itself. */
  verify(): TrailBreak | null {
    return verifyTrail(this.#database)
  }

  /** Begins the study: the plan's frame, the data, the candidates and ladders, each with its row of the trail. */
  start(plan: Plan, data: DataSet, folder: string | null): void {
    if (!this.isEmpty) throw new Error('this project holds a study already')
    this.#write(() => this.#writePlan(plan, data, folder, 'study started', sentences.studyStarted(plan.study)))
  }

  /** Puts another plan in place of the one that is there, while nothing was fitted. */
  replacePlan(plan: Plan, data: DataSet, folder: string | null): void {
    if (this.hasFits) throw new Error('a plan with fits is not replaced')
    this.#write(() => {
      this.#database.exec('DELETE FROM candidate; DELETE FROM ladder; DELETE FROM study')
      this.#writePlan(plan, data, folder, 'plan changed', sentences.planChanged(plan.study))
    })
    this.#data = null
  }

  addCandidate(candidate: Candidate): void {
    this.#write(() => this.#insertNamed('candidate', candidate))
  }

  addLadder(ladder: LadderPlan): void {
    this.#write(() => this.#insertNamed('ladder', ladder))
  }

  /** @throws InputError once anything was fitted. */
  changeRules(rules: Rules): void {
    if (this.hasFits) {
      throw new InputError('The rules stand since the first candidate was fitted.', {
        where: 'rules',
        remedy: 'To judge by other rules, start a new study; this one keeps what was fixed before its results.'
      })
    }
    this.#write(() => {
      const study = this.#requireStudy()
      const plan = canonicalJson({ ...(JSON.parse(study.plan) as Plan), rules })
      const detail = { content: digestOf(plan), data_digest: study.data_digest, rules }
      const trailNumber = this.#append({ what: 'rules changed', sentence: sentences.rulesChanged(rules), detail })
      this.#database.prepare('UPDATE study SET plan = @plan, trail_number = @trailNumber').run({ plan, trailNumber })
    })
  }

  /** Keeps one outcome, whatever its state. A digest that is there already is left as it is. Returns what is kept. */
  recordFit(fit: RecordedFit): FitOutcome {
    const known = this.fits().get(fit.digest)
    if (known !== undefined) return known
    const outcome = JSON.stringify(fit.outcome)
    const kept = JSON.parse(outcome) as FitOutcome // what a later opening will read, to the last bit
    const row = {
      digest: fit.digest,
      candidate: fit.candidate,
      data_digest: this.#requireStudy().data_digest,
      settings: canonicalJson(fit.settings),
      version: fit.version,
      state: fit.outcome.fit.state
    }
    this.#write(() => {
      const { T, df, p } = kept.fit
      const detail = { ...row, T, df, p, content: digestOf(outcome) }
      const trailNumber = this.#append({
        what: 'candidate fitted',
        sentence: sentences.candidateFitted(fit.candidate, kept.fit),
        detail
      })
      this.#database
        .prepare(
          `INSERT INTO fit (digest, candidate, data_digest, settings, version, state, outcome, at, trail_number)
           VALUES (@digest, @candidate, @data_digest, @settings, @version, @state, @outcome, @at, @trailNumber)`
        )
        .run({ ...row, outcome, at: this.#now(), trailNumber })
    })
    this.#fits?.set(fit.digest, kept)
    return kept
  }

  recordRelation(relation: RecordedRelation): void {
    if (this.relations().has(relation.digest)) return
    const { digest, version } = relation
    const outcome = JSON.stringify(relation.outcome)
    const { restricted, general } = relation
    this.#write(() => {
      const sentence = sentences.relationSettled(restricted, general, relation.outcome.relation, relation.outcome.proof)
      const detail = { digest, version, restricted, general, ...relation.outcome, content: digestOf(outcome) }
      const trailNumber = this.#append({ what: 'relation settled', sentence, detail })
      this.#database
        .prepare('INSERT INTO relation (digest, outcome, version, trail_number) VALUES (@digest, @outcome, @version, @trailNumber)')
        .run({ digest, outcome, version, trailNumber })
    })
    this.#relations?.set(digest, JSON.parse(outcome) as RelationOutcome)
  }

  /** Notes how a ladder's steps were judged, unless the last note of that ladder says the very same. */
  recordJudgement(ladder: LadderResult, rules: Rules): void {
    const detail = JSON.parse(
      JSON.stringify({ ladder: ladder.name, standHere: ladder.standHere, steps: ladder.steps, rules })
    ) as Record<string, unknown>
    const last = this.trail().findLast((row) => row.what === 'ladder judged' && row.detail['ladder'] === ladder.name)
    if (last !== undefined && canonicalJson(last.detail) === canonicalJson(detail)) return
    this.note({ what: 'ladder judged', sentence: sentences.ladderJudged(ladder), detail })
  }

  recordDecision(decision: Decision): void {
    const text = canonicalJson(decision)
    this.#write(() => {
      const sentence = sentences.decisionRecorded(decision.ladder, decision.rung, decision.reason)
      const trailNumber = this.#append({ what: 'decision recorded', sentence, detail: { ...decision, content: digestOf(text) } })
      this.#database
        .prepare('INSERT INTO decision (decision, at, trail_number) VALUES (@text, @at, @trailNumber)')
        .run({ text, at: this.#now(), trailNumber })
    })
  }

  /** A row of the trail for something that changes nothing else. */
  note(event: TrailEvent): void {
    this.#write(() => this.#append(event))
  }

  /**
   * Saves the study as a file of its own and returns that project, open; this one stays open as it was.
   *
   * @throws InputError when the place is taken by a file that is not ours, or that holds records this study does not have.
   */
  saveAs(path: string): Project {
    copyInto(this.#database, path, (copy) => {
      appendTrail(copy, this.#now(), {
        what: 'project saved',
        sentence: sentences.projectSaved(basename(path)),
        detail: { file: basename(path) }
      })
    })
    return openProjectFile(path, this.#clock)
  }

  close(): void {
    closeDatabase(this.#database)
  }

  /**
   * Reads everything once and compares the data with their digest.
   *
   * @throws InputError when a stored value cannot be read or the data are not those of the study
   */
  verifyContent(): void {
    if (this.isEmpty) return
    if (this.#isReadable() && dataDigest(this.data()) === this.data().digest) return
    throw new InputError('What this project file holds was altered by another program and cannot be read.', {
      where: this.file,
      remedy: 'Open a copy of it from before.'
    })
  }

  #isReadable(): boolean {
    try {
      this.plan()
      this.data()
      this.fits()
      this.relations()
      this.decisions()
      this.trail()
      return true
    } catch (error) {
      if (error instanceof SyntaxError || error instanceof RangeError || error instanceof ZodError) return false
      throw error
    }
  }

  #studyRow(): StudyRow | undefined {
    return this.#database.prepare<[], StudyRow>('SELECT plan, folder, data_digest FROM study').get()
  }

  #requireStudy(): StudyRow {
    const row = this.#studyRow()
    if (row === undefined) {
      throw new InputError('This project file holds no study yet.', {
        where: this.file,
        remedy: 'Compare a plan with it as its project file, or open another one.'
      })
    }
    return row
  }

  #writePlan(plan: Plan, data: DataSet, folder: string | null, what: string, sentence: string): void {
    const frame = canonicalJson({ ...plan, candidates: [], ladders: [] })
    const { estimation, rules } = plan
    const detail = { content: digestOf(frame), data_digest: data.digest, estimation, rules }
    const trailNumber = this.#append({ what, sentence, detail })
    if (!hasData(this.#database, data.digest)) this.#insertData(data)
    this.#database
      .prepare('INSERT INTO study (id, plan, folder, data_digest, trail_number) VALUES (1, @frame, @folder, @digest, @trailNumber)')
      .run({ frame, folder, digest: data.digest, trailNumber })
    for (const candidate of plan.candidates) this.#insertNamed('candidate', candidate)
    for (const ladder of plan.ladders) this.#insertNamed('ladder', ladder)
  }

  #insertData(data: DataSet): void {
    const groups = data.groups.map(({ name, n }) => ({ name, n }))
    const detail = { digest: data.digest, source: data.source, indicators: data.indicators, groups, cautions: data.cautions }
    writeData(this.#database, data, this.#append({ what: 'data read', sentence: sentences.dataImported(data), detail }))
  }

  #insertNamed(table: 'candidate' | 'ladder', value: Candidate | LadderPlan): void {
    const { name } = value
    const origin: Origin = this.hasFits ? 'added after results' : 'planned'
    const content = canonicalJson(value)
    const sentence = table === 'candidate' ? sentences.candidateAdded(name, origin) : sentences.ladderAdded(name, origin)
    const trailNumber = this.#append({
      what: `${table} added`,
      sentence,
      detail: { name, origin, [table]: value, content: digestOf(content) }
    })
    this.#database
      .prepare(`INSERT INTO ${table} (name, origin, ${table}, trail_number) VALUES (@name, @origin, @content, @trailNumber)`)
      .run({ name, origin, content, trailNumber })
  }

  #list<T>(table: 'candidate' | 'ladder', schema: { parse(value: unknown): T }): T[] {
    const texts = this.#database.prepare<[], string>(`SELECT ${table} FROM ${table} ORDER BY position`).pluck().all()
    return texts.map((text) => schema.parse(JSON.parse(text)))
  }

  #origins(table: 'candidate' | 'ladder'): Map<string, Origin> {
    const rows = this.#database
      .prepare<[], { name: string; origin: Origin }>(`SELECT name, origin FROM ${table} ORDER BY position`)
      .all()
    return new Map(rows.map(({ name, origin }) => [name, origin]))
  }

  #outcomes<T>(table: 'fit' | 'relation'): Map<string, T> {
    const rows = this.#database
      .prepare<[], { digest: string; outcome: string }>(`SELECT digest, outcome FROM ${table} ORDER BY trail_number`)
      .all()
    return new Map(rows.map(({ digest, outcome }) => [digest, JSON.parse(outcome) as T]))
  }

  #append(event: TrailEvent): number {
    return appendTrail(this.#database, this.#now(), event)
  }

  #now(): string {
    return this.#clock().toISOString()
  }

  /** One transaction that takes the writer's lock at once, so that two windows cannot write the same row number. */
  #write<T>(work: () => T): T {
    return refusedBySystem(this.file ?? 'the unsaved study', () => this.#database.transaction(work).immediate())
  }
}

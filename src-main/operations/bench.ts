/**
 * What the operations work on: the open project and the running work of one workbench.
 */
import type { Project } from '../project/project.ts'
import type { Clock } from '../project/records.ts'
import { InputError } from '../study/input-error.ts'
import type { Crew } from '../workers/jobs.ts'
import type { StudyView, WorkEvent } from './contract.ts'
import { studyView } from './study-view.ts'

/** Reads a file the user named. @throws InputError when it cannot be read */
export type ReadFile = (path: string) => Uint8Array | Promise<Uint8Array>

export interface BenchParts {
  crew: Crew
  clock: Clock
  /** The plan that `openSample` opens. */
  samplePlanPath: string
  readFile: ReadFile
  version: string
}

/** What looking into a study needs: its project and who does the work. */
export interface OpenStudy {
  /** @throws InputError when no study is open */
  requireProject(): Project
  readonly parts: Pick<BenchParts, 'crew' | 'version'>
}

/** Owns the open project: one that is replaced is closed once no call works on it any more. */
export class Bench implements OpenStudy {
  readonly parts: BenchParts
  readonly #listeners = new Set<(event: WorkEvent) => void>()
  readonly #retired = new Set<Project>()
  readonly #waiting: (() => void)[] = []
  #project: Project | null = null
  #running: AbortController | null = null
  #calls = 0

  constructor(parts: BenchParts) {
    this.parts = parts
  }

  get project(): Project | null {
    return this.#project
  }

  /** @throws InputError when no study is open */
  requireProject(): Project {
    if (this.#project === null) {
      throw new InputError('No study is open.', { remedy: 'Open a plan or a project, or start a study on a data file.' })
    }
    return this.#project
  }

  /** Makes `project` the open one; the one before stays when the new one cannot be shown. @throws InputError while fits are running */
  async replace(project: Project): Promise<StudyView> {
    const before = this.#project
    try {
      this.requireRest()
      this.#project = project // at once, so that no call in between writes to the one that goes
      const view = await this.view()
      if (before !== null) this.#retired.add(before)
      return view
    } catch (error) {
      if (this.#project === project) this.#project = before
      this.#retired.add(project)
      throw error
    }
  }

  view(): Promise<StudyView> {
    return studyView(this.requireProject(), this.parts.crew, this.parts.version)
  }

  /** @throws InputError while fits are running */
  requireRest(): void {
    if (this.#running !== null) {
      throw new InputError('Candidates are being fitted.', { remedy: 'Wait until they are done, or stop them first.' })
    }
  }

  /** Runs one call; projects it leaves behind are closed when no other call is at work. */
  async during<T>(call: () => Promise<T>): Promise<T> {
    this.#calls++
    try {
      return await call()
    } finally {
      this.#calls--
      if (this.#calls === 0) this.#tidy()
    }
  }

  /** Runs one stretch of work that `stopWork` can abort. @throws InputError while another is running */
  async work<T>(task: (signal: AbortSignal) => Promise<T>): Promise<T> {
    this.requireRest()
    const running = new AbortController()
    this.#running = running
    try {
      return await task(running.signal)
    } finally {
      this.#running = null
    }
  }

  stopWork(): void {
    this.#running?.abort()
  }

  tell(event: WorkEvent): void {
    for (const listener of this.#listeners) listener(event)
  }

  onWork(listener: (event: WorkEvent) => void): () => void {
    this.#listeners.add(listener)
    return () => this.#listeners.delete(listener)
  }

  /** Stops running work, waits for every call to end, then closes crew and project. */
  async close(): Promise<void> {
    this.stopWork()
    if (this.#calls > 0) await new Promise<void>((idle) => this.#waiting.push(idle))
    await this.parts.crew.close()
    this.#project?.close()
    this.#project = null
  }

  #tidy(): void {
    for (const project of this.#retired) project.close()
    this.#retired.clear()
    for (const idle of this.#waiting.splice(0)) idle()
  }
}

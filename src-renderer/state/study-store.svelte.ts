/**
 * What the window knows: the open study as the program last told it, what is selected, what work is running.
 *
 * Components read from here and send commands; a command asks the program and puts its answer in `view`. Bad input
 * comes back as a problem for the component that asked; anything else that fails is a fault and shown as one.
 */
import type {
  Answer,
  Client,
  OperationName,
  Operations,
  ReleaseSearchView,
  StabilityResult,
  StudyView,
  WorkEvent
} from '../../src-main/operations/contract.ts'

export type Problem = Extract<Answer<unknown>, { ok: false }>['problem']

export interface RunningWork {
  doing: 'Fitting' | 'Resampling'
  done: number
  total: number
  secondsLeft: number | null
  stopping: boolean
}

export const places = ['Ladder', 'Table', 'Family', 'Data'] as const
export type Place = (typeof places)[number]

type StudyOperation = {
  [N in OperationName]: Operations[N]['result'] extends StudyView ? N : never
}[OperationName]

export class StudyStore {
  view = $state.raw<StudyView | null>(null)
  /** Name of the candidate the details show. */
  selected = $state<string | null>(null)
  /** Name of the ladder in the middle. */
  ladder = $state<string | null>(null)
  /** What the middle shows. */
  place = $state<Place>('Ladder')
  /** The group that every list by group shows, where a candidate has it. */
  group = $state<string | null>(null)
  work = $state.raw<RunningWork | null>(null)
  /** What the last resampling of a ladder of this study showed. */
  stability = $state.raw<StabilityResult | null>(null)
  /** Bad input of a command that has no field of its own. */
  problem = $state.raw<Problem | null>(null)
  /** Something the program did not foresee. */
  fault = $state<string | null>(null)
  /** True until the first study, or the answer that there is none, is here. */
  starting = $state(true)

  readonly #client: Client
  /** Whether the user chose what is selected; until then it follows where one can stand. */
  #chosen = false

  constructor(client: Client) {
    this.#client = client
    client.onWork((event) => this.#work(event))
  }

  /** Shows the study the program was started with, else the sample, which is fitted at once. */
  async start(): Promise<void> {
    const current = await this.ask('currentStudy', null)
    if (current.ok && current.value !== null) this.#show(current.value)
    else if (current.ok) await this.openSample()
    this.starting = false
  }

  async openSample(): Promise<void> {
    const problem = await this.change('openSample', null)
    this.problem = problem
    this.starting = false
    if (problem === null && this.drafts.length > 0) await this.fit(null)
  }

  /** Asks the program; never rejects. A fault is shown and answered as a problem, so that no dialog closes on it. */
  async ask<N extends OperationName>(name: N, input: Operations[N]['input']): Promise<Answer<Operations[N]['result']>> {
    try {
      return await this.#client.call(name, input)
    } catch (error) {
      this.fault = error instanceof Error ? error.message : String(error)
      return { ok: false, problem: { what: 'The program could not answer', where: null, remedy: null } }
    }
  }

  /** Runs an operation that yields the study anew; answers the problem, or null when it was done. */
  async change<N extends StudyOperation>(name: N, input: Operations[N]['input']): Promise<Problem | null> {
    const answer = await this.ask(name, input)
    if (!answer.ok) return answer.problem
    this.#show(answer.value as StudyView)
    return null
  }

  async fit(names: string[] | null): Promise<void> {
    this.work = { doing: 'Fitting', done: 0, total: names?.length ?? this.drafts.length, secondsLeft: null, stopping: false }
    this.problem = await this.change('fitCandidates', { names })
    this.work = null
  }

  /** Searches what to let go of a failed step; the study with what was found is shown, its new ladder first. */
  async searchReleases(input: Operations['releaseSearch']['input']): Promise<Answer<ReleaseSearchView>> {
    this.work = { doing: 'Fitting', done: 0, total: 1, secondsLeft: null, stopping: false }
    const answer = await this.ask('releaseSearch', input)
    this.work = null
    if (!answer.ok) return answer
    const { search, view } = answer.value
    this.#show(view)
    this.ladder = search.partialLadder ?? this.ladder
    return { ok: true, value: search }
  }

  /** Resamples a ladder; the trail that tells of it is fetched with it. */
  async resample(input: Operations['stability']['input']): Promise<Answer<StabilityResult>> {
    this.work = { doing: 'Resampling', done: 0, total: input.resamples, secondsLeft: null, stopping: false }
    const answer = await this.ask('stability', input)
    this.work = null
    const current = await this.ask('currentStudy', null)
    if (current.ok && current.value !== null) this.#show(current.value)
    if (answer.ok) this.stability = answer.value
    return answer
  }

  async stop(): Promise<void> {
    if (this.work !== null) this.work = { ...this.work, stopping: true }
    await this.ask('cancelWork', null)
  }

  select(name: string): void {
    this.#chosen = true
    this.selected = name
  }

  get drafts(): string[] {
    return (this.view?.candidates ?? []).filter((c) => c.state === 'draft').map((c) => c.candidate.name)
  }

  /** A new study starts with its first ladder and where one can stand on it; the same study keeps what is looked at. */
  #show(view: StudyView): void {
    const names = view.candidates.map((c) => c.candidate.name)
    const sameStudy = this.view?.study === view.study && this.view.result.data.digest === view.result.data.digest
    this.view = view
    this.fault = null
    if (!view.ladders.some((ladder) => ladder.name === this.ladder)) this.ladder = view.ladders.at(-1)?.name ?? null
    this.#chosen &&= sameStudy && this.selected !== null && names.includes(this.selected)
    if (!sameStudy) {
      this.place = 'Ladder'
      this.stability = null
    }
    if (!this.#chosen) this.selected = this.#firstLook(view) ?? names[0] ?? null
  }

  #firstLook(view: StudyView): string | null {
    return view.result.ladders.find((ladder) => ladder.name === this.ladder)?.standHere ?? null
  }

  #work(event: WorkEvent): void {
    const { stopping, doing } = this.work ?? { stopping: false, doing: 'Fitting' as const }
    if (event.kind === 'started') this.work = { doing, done: 0, total: event.total, secondsLeft: null, stopping }
    else if (event.kind === 'fitted' || event.kind === 'resampled') {
      this.work = { doing, done: event.done, total: event.total, secondsLeft: event.secondsLeft, stopping }
    } else this.work = null
  }
}

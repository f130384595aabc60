/** A stand-in for the program, for developing the window: answers from the hand-made study, remembers what is added. */
import type { Answer, Client, OperationName, Operations, StudyView, WorkEvent } from '../../../src-main/operations/contract.ts'
import { harbourScoreTests, harbourStudy } from './harbour.ts'

const wait = (ms: number): Promise<void> => new Promise((done) => setTimeout(done, ms))

export function mockClient(options: { empty?: boolean; slow?: boolean } = {}): Client {
  let view: StudyView = harbourStudy()
  let cancelled = false
  const listeners = new Set<(event: WorkEvent) => void>()
  const tell = (event: WorkEvent): void => {
    for (const listener of listeners) listener(event)
  }
  const answers: { [N in OperationName]?: (input: Operations[N]['input']) => Promise<unknown> } = {
    currentStudy: async () => {
      if (options.empty)
        view = { ...view, candidates: [], ladders: [], rulesOpen: true, result: { ...view.result, candidates: [], ladders: [] } }
      return view
    },
    openSample: async () => view,
    checkCandidate: async () => ({ parameters: 21, df: 24, identified: true, unidentified: [], sentence: 'As typed.', cells: [] }),
    addCandidate: async ({ candidate }) => {
      view = {
        ...view,
        candidates: [
          ...view.candidates,
          {
            candidate,
            state: 'draft',
            origin: 'added after results',
            generated: false,
            sentence: 'as written.',
            parameters: 31,
            df: 23
          }
        ]
      }
      return view
    },
    addLadder: async ({ ladder }) => {
      view = { ...view, ladders: [...view.ladders, ladder] }
      return view
    },
    recordDecision: async (decision) => {
      view = { ...view, decisions: [...view.decisions, { ...decision, at: new Date().toISOString() }] }
      return view
    },
    fitCandidates: async () => {
      cancelled = false
      tell({ kind: 'started', total: 7 })
      for (let done = 1; done <= 7 && !cancelled; done += 1) {
        await wait(options.slow ? 1500 : 100)
        tell({ kind: 'fitted', candidate: 'x', state: 'fitted', done, total: 7, secondsLeft: (7 - done) * 0.6 })
      }
      tell({ kind: 'finished', cancelled })
      view = { ...view, candidates: view.candidates.map((c) => ({ ...c, state: 'fitted' as const })) }
      return view
    },
    scoreTests: async ({ candidate }) => ({ leftOut: 3, tests: harbourScoreTests(candidate) }),
    cancelWork: async () => {
      cancelled = true
      return null
    },
    listFolder: async () => ({
      path: '/home/reader/studies',
      parent: '/home/reader',
      entries: [
        { name: 'older', path: '/home/reader/studies/older', kind: 'folder' },
        { name: 'harbour.csv', path: '/home/reader/studies/harbour.csv', kind: 'data' },
        { name: 'harbour.yaml', path: '/home/reader/studies/harbour.yaml', kind: 'plan' },
        { name: 'intake.rungwise', path: '/home/reader/studies/intake.rungwise', kind: 'project' }
      ]
    }),
    previewData: async ({ path }) => ({
      path,
      rows: 912,
      columns: ['clinic', ...view.data.indicators].map((name, i) => ({
        name,
        kind: i === 0 ? ('text' as const) : ('numeric' as const),
        missing: i % 3,
        distinct: i === 0 ? 3 : 5,
        sample: i === 0 ? ['Harbour', 'Harbour', 'Quay'] : ['3', '4', '1', '2']
      })),
      cautions: []
    })
  }
  return {
    async call<N extends OperationName>(name: N, input: Operations[N]['input']): Promise<Answer<Operations[N]['result']>> {
      const answer = answers[name] as ((input: Operations[N]['input']) => Promise<unknown>) | undefined
      if (answer === undefined) return { ok: false, problem: { what: `The stand-in cannot do ${name}`, where: null, remedy: null } }
      return { ok: true, value: (await answer(input)) as Operations[N]['result'] }
    },
    onWork(listener) {
      listeners.add(listener)
      return () => listeners.delete(listener)
    }
  }
}

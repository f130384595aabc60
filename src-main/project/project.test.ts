import { createHash } from 'node:crypto'
import { mkdtempSync, readdirSync, readFileSync, rmSync, truncateSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import Database from 'better-sqlite3'
import { afterEach, beforeEach, describe, expect, it } from 'vitest'
import { InputError } from '../study/input-error.ts'
import { planSchema } from '../study/study.ts'
import { createInMemoryProject, createProjectFile, openProjectFile, type Project } from './project.ts'
import { applicationId, migrate, schemaOf, schemaVersion } from './schema.ts'
import { furtherCandidate, smallData, smallOutcome, smallPlan, tickingClock } from './test-study.ts'

let folder: string
let path: string
const clock = tickingClock()

beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'rungwise-project-'))
  path = join(folder, 'noise.rungwise')
})
afterEach(() => rmSync(folder, { recursive: true, force: true }))

const firstFit = {
  digest: 'sha256:one',
  candidate: 'One noise',
  settings: { convention: 'normal' },
  version: '0.1.0',
  outcome: smallOutcome()
}
const failedFit = {
  ...firstFit,
  digest: 'sha256:two',
  candidate: 'One noise, even',
  outcome: { fit: smallOutcome({ state: 'not converged', reason: 'The steps ran out', T: null, p: null }).fit, gamma: null }
}
const firstRelation = {
  digest: 'sha256:pair',
  restricted: 'One noise, even',
  general: 'One noise',
  version: '0.1.0',
  outcome: { relation: 'nested' as const, proof: 'constraints' as const }
}

function filled(project: Project): Project {
  project.start(smallPlan(), smallData(), '/somewhere')
  project.recordFit(firstFit)
  project.recordFit(failedFit)
  project.recordRelation(firstRelation)
  project.addCandidate(furtherCandidate)
  project.recordDecision({ ladder: 'Evenness', rung: 'One noise', reason: 'The even one has no solution' })
  return project
}

/** Everything a project can tell. */
function told(project: Project) {
  return {
    plan: project.plan(),
    data: project.data(),
    folder: project.folder(),
    origins: [...project.candidateOrigins(), ...project.ladderOrigins()],
    fits: [...project.fits()],
    relations: [...project.relations()],
    decisions: project.decisions(),
    trail: project.trail(),
    hasFits: project.hasFits
  }
}

/** Works on the file behind the project's back. */
function tamper(statements: string): void {
  const database = new Database(path)
  database.pragma('foreign_keys = OFF')
  database.exec(statements)
  database.close()
}

/** Digests of everything in the folder, to prove that nothing was touched or left behind. */
function everything(): Record<string, string> {
  return Object.fromEntries(
    readdirSync(folder).map((name) => [
      name,
      createHash('sha256')
        .update(readFileSync(join(folder, name)))
        .digest('hex')
    ])
  )
}

/** Opening must fail with this message and leave the folder as it is. */
function expectRefused(message: RegExp): void {
  const before = everything()
  const attempt = () => openProjectFile(path, clock)
  expect(attempt).toThrow(InputError)
  expect(attempt).toThrow(message)
  expect(everything()).toEqual(before)
}

describe('a project file', () => {
  it('tells the same after closing and opening, to the last bit of every number', () => {
    const project = filled(createProjectFile(path, clock))
    const before = told(project)
    project.close()
    const again = openProjectFile(path, clock)
    expect(told(again)).toEqual(before)
    expect(again.fits().get('sha256:one')?.fit.p).toBe(0.1 / 3)
    again.close()
  })

  it('is one file without companions once it is closed', () => {
    filled(createProjectFile(path, clock)).close()
    expect(readdirSync(folder)).toEqual(['noise.rungwise'])
  })

  it('keeps published figures with their divisor, means and names', () => {
    const summary = {
      kind: 'summary' as const,
      indicators: ['a', 'b'],
      grouping: 'form',
      divisor: 'n-1' as const,
      groups: [
        { name: 'first', n: 20, covariance: Float64Array.from([1, 0.5, 0.5, 2]), mean: Float64Array.from([0.1, 0.2]) },
        { name: 'second', n: 30, covariance: Float64Array.from([2, 0.5, 0.5, 2]), mean: null }
      ],
      source: 'published summary',
      cautions: [],
      digest: 'sha256:figures'
    }
    const project = createInMemoryProject(clock)
    project.start(smallPlan(), summary, null)
    const saved = project.saveAs.bind(project)
    expect(() => saved(path)).toThrow(/altered by another program/) // its digest is made up, and opening checks it
    expect(project.data()).toEqual(summary)
    project.close()
  })

  it('keeps a failed fit as it keeps every other', () => {
    const project = filled(createProjectFile(path, clock))
    expect(project.fits().get('sha256:two')?.fit.state).toBe('not converged')
    const row = project
      .trail()
      .find((entry) => entry.detail['candidate'] === 'One noise, even' && entry.what === 'candidate fitted')
    expect(row?.sentence).toBe(
      'The candidate “One noise, even” was tried and has no usable solution (not converged): The steps ran out.'
    )
    project.close()
  })

  it('calls what is added after the first fit by its name, and fixes the rules', () => {
    const project = createInMemoryProject(clock)
    project.start(smallPlan(), smallData(), null)
    project.changeRules({ ...smallPlan().rules, alpha: 0.01 })
    expect(project.plan().rules.alpha).toBe(0.01)
    project.recordFit(firstFit)
    project.addCandidate(furtherCandidate)
    expect(project.candidateOrigins().get('One noise')).toBe('planned')
    expect(project.candidateOrigins().get('Two noises')).toBe('added after results')
    expect(() => project.changeRules(smallPlan().rules)).toThrow(/The rules stand since the first candidate was fitted/)
    expect(project.plan().rules.alpha).toBe(0.01)
    project.close()
  })

  it('writes neither the change nor its row of the trail when either cannot be written', () => {
    const project = createInMemoryProject(clock)
    project.start(smallPlan(), smallData(), null)
    const before = told(project)
    expect(() => project.addCandidate({ ...furtherCandidate, name: 'One noise' })).toThrow(/UNIQUE/)
    const stateless = {
      ...firstFit,
      outcome: { ...firstFit.outcome, fit: { ...firstFit.outcome.fit, state: 'unheard of' as 'fitted' } }
    }
    expect(() => project.recordFit(stateless)).toThrow(/CHECK/)
    expect(told(project)).toEqual(before)
    expect(project.verify()).toBeNull()
    project.close()
  })

  it('starts whole or not at all', () => {
    const project = createInMemoryProject(clock)
    const twice = smallPlan({ candidates: [furtherCandidate, furtherCandidate] })
    expect(() => project.start(twice, smallData(), null)).toThrow(/UNIQUE/)
    expect(project.isEmpty).toBe(true)
    expect(project.trail()).toEqual([])
    project.close()
  })

  it('notes a ladder again only when it is judged otherwise', () => {
    const project = createInMemoryProject(clock)
    project.start(smallPlan(), smallData(), null)
    const ladder = { name: 'Evenness', rungs: ['One noise'], standHere: 'One noise', steps: [] }
    project.recordJudgement(ladder, smallPlan().rules)
    project.recordJudgement(ladder, smallPlan().rules)
    project.recordJudgement({ ...ladder, standHere: null }, smallPlan().rules)
    expect(project.trail().filter((row) => row.what === 'ladder judged')).toHaveLength(2)
    project.close()
  })

  it('lets two windows write to one file without breaking the trail', () => {
    const one = filled(createProjectFile(path, clock))
    const other = openProjectFile(path, clock)
    one.note({ what: 'test', sentence: 'From one.', detail: {} })
    other.note({ what: 'test', sentence: 'From the other.', detail: {} })
    one.note({ what: 'test', sentence: 'From one again.', detail: {} })
    expect(other.verify()).toBeNull()
    expect(
      other
        .trail()
        .slice(-3)
        .map((row) => row.sentence)
    ).toEqual(['From one.', 'From the other.', 'From one again.'])
    other.close()
    one.close()
    expect(readdirSync(folder)).toEqual(['noise.rungwise'])
  })
})

describe('the trail', () => {
  it('has one row for everything that happened, in order', () => {
    const project = filled(createInMemoryProject(clock))
    expect(project.trail().map(({ number, what, sentence }) => `${number} ${what}: ${sentence}`)).toMatchInlineSnapshot(`
      [
        "1 study started: The study “Evening noise” was started.",
        "2 data read: The data “noise.csv” were read: 4 indicators, 3 cases.",
        "3 candidate added: The candidate “One noise” was added to the plan.",
        "4 candidate added: The candidate “One noise, even” was added to the plan.",
        "5 ladder added: The ladder “Evenness” was added to the plan.",
        "6 candidate fitted: The candidate “One noise” was fitted: T = 12.35 on 2 degrees of freedom, p = .033.",
        "7 candidate fitted: The candidate “One noise, even” was tried and has no usable solution (not converged): The steps ran out.",
        "8 relation settled: “One noise, even” is nested in “One noise”, as shown by their constraints.",
        "9 candidate added: The candidate “Two noises” was added after results had been seen.",
        "10 decision recorded: On the ladder “Evenness” it was decided to stand on “One noise”. The reason given: The even one has no solution.",
      ]
    `)
    project.close()
  })

  it('cannot be changed, shortened or written out of order, and neither can what was fitted', () => {
    filled(createProjectFile(path, clock)).close()
    for (const [statement, message] of [
      ["UPDATE trail SET sentence = 'x' WHERE number = 3", /stays as it is/],
      ['DELETE FROM trail WHERE number = 3', /stays as it is/],
      ["INSERT OR REPLACE INTO trail VALUES (3, 'x', 'x', 'x', '{}', 'x')", /only grows at its end/],
      ["INSERT INTO trail VALUES (99, 'x', 'x', 'x', '{}', 'x')", /only grows at its end/],
      ["UPDATE fit SET state = 'fitted'", /stays as it is/],
      ['DELETE FROM fit', /stays as it is/],
      ['DELETE FROM decision', /stays as it is/],
      ["UPDATE data_group SET matrix = x''", /stays as it is/]
    ] as const) {
      expect(() => tamper(statement), statement).toThrow(message)
    }
    const project = openProjectFile(path, clock)
    expect(project.trailBreak).toBeNull()
    project.close()
  })

  /** Takes a table's guard away, changes something, and puts the guard back, so that only the content can tell. */
  function forge(table: string, verb: 'update' | 'delete', statement: string): void {
    const database = new Database(path)
    const guard = database
      .prepare<[string], string>('SELECT sql FROM sqlite_master WHERE name = ?')
      .pluck()
      .get(`${table}_no_${verb}`)
    database.close()
    tamper(`DROP TRIGGER ${table}_no_${verb}; ${statement}; ${guard};`)
  }

  it.each([
    [
      'a sentence rewritten',
      'trail',
      'update',
      "UPDATE trail SET sentence = 'Nothing.' WHERE number = 4",
      { number: 4, why: /row 4 does not match its digest/ }
    ],
    [
      'a time moved',
      'trail',
      'update',
      "UPDATE trail SET at = '2030-01-01T00:00:00.000Z' WHERE number = 2",
      { number: 2, why: /row 2 does not match/ }
    ],
    [
      'an outcome rewritten',
      'fit',
      'update',
      "UPDATE fit SET outcome = replace(outcome, '12.34', '1.34') WHERE number = 1",
      { number: 6, why: /the fit that row 6 tells of/ }
    ],
    [
      'a failed fit called fitted',
      'fit',
      'update',
      "UPDATE fit SET state = 'fitted' WHERE number = 2",
      { number: 7, why: /the fit that row 7 tells of/ }
    ]
  ] as const)('names the first broken row: %s', (_case, table, verb, statement, found) => {
    filled(createProjectFile(path, clock)).close()
    forge(table, verb, statement)
    const project = openProjectFile(path, clock)
    expect(project.trailBreak?.number).toBe(found.number)
    expect(project.trailBreak?.why).toMatch(found.why)
    project.close()
  })

  it('notices a candidate that was dated back to the plan', () => {
    filled(createProjectFile(path, clock)).close()
    tamper("UPDATE candidate SET origin = 'planned' WHERE name = 'Two noises'")
    const project = openProjectFile(path, clock)
    expect(project.trailBreak?.why).toMatch(/the candidate that row 9 tells of has been changed/)
    project.close()
  })

  it('notices rules that were changed in the file', () => {
    filled(createProjectFile(path, clock)).close()
    tamper(`UPDATE study SET plan = replace(plan, '"alpha":0.05', '"alpha":0.01')`)
    const project = openProjectFile(path, clock)
    expect(project.plan().rules.alpha).toBe(0.01)
    expect(project.trailBreak).toEqual({ number: 1, why: 'the study that row 1 tells of has been changed since' })
    project.close()
  })

  it('notices that its guards were taken away', () => {
    filled(createProjectFile(path, clock)).close()
    tamper('DROP TRIGGER fit_no_delete')
    const project = openProjectFile(path, clock)
    expect(project.trailBreak?.why).toMatch(/the guard "fit_no_delete"/)
    project.close()
  })
})

describe('a file that cannot be trusted is refused and keeps every byte', () => {
  it('when there is none', () => expectRefused(/There is no such file/))

  it('when it is a folder', () => {
    rmSync(folder, { recursive: true })
    folder = mkdtempSync(join(tmpdir(), 'rungwise-project-'))
    path = folder
    expectRefused(/This is not a file/)
  })

  it.each([
    ['empty', ''],
    ['text', 'study: Evening noise\n'.repeat(40)],
    ['text that begins like a database', 'SQLite format 3\0but no more']
  ])('when it is %s', (_case, content) => {
    writeFileSync(path, content)
    expectRefused(/This is not a Rungwise project file/)
  })

  it('when it is the database of another program', () => {
    tamper('PRAGMA journal_mode = WAL; CREATE TABLE notes (text TEXT)')
    expectRefused(/a database of another program/)
  })

  it('when it is of a newer version', () => {
    filled(createProjectFile(path, clock)).close()
    tamper(`PRAGMA user_version = ${schemaVersion + 1}`)
    expectRefused(/written by a newer Rungwise \(file version 2; this program reads up to 1\)/)
  })

  it('when a newer version left its last changes beside the file', () => {
    filled(createProjectFile(path, clock)).close()
    const newer = new Database(path)
    newer.pragma('journal_mode = WAL')
    newer.pragma('wal_autocheckpoint = 0')
    newer.pragma(`user_version = ${schemaVersion + 1}`)
    const [file, log] = [readFileSync(path), readFileSync(`${path}-wal`)]
    newer.close()
    writeFileSync(path, file)
    writeFileSync(`${path}-wal`, log)
    expectRefused(/written by a newer Rungwise/)
  })

  it('when its end is missing', () => {
    filled(createProjectFile(path, clock)).close()
    truncateSync(path, Math.floor(readFileSync(path).length / 2))
    expectRefused(/damaged/)
  })

  it('when only its first page is left', () => {
    filled(createProjectFile(path, clock)).close()
    truncateSync(path, 4096)
    expectRefused(/damaged/)
  })

  it('when a page in the middle is overwritten', () => {
    filled(createProjectFile(path, clock)).close()
    const bytes = readFileSync(path)
    bytes.fill(0x5a, 2 * 4096, 3 * 4096)
    writeFileSync(path, bytes)
    expectRefused(/damaged/)
  })

  it('when a table is missing', () => {
    filled(createProjectFile(path, clock)).close()
    tamper('DROP TABLE decision')
    expectRefused(/damaged/)
  })

  it('when it only claims to be ours', () => {
    tamper(`PRAGMA application_id = ${applicationId}; PRAGMA user_version = 1; CREATE TABLE notes (text TEXT)`)
    expectRefused(/damaged/)
  })

  it('when a row of the trail that data refer to is gone', () => {
    filled(createProjectFile(path, clock)).close()
    tamper('DROP TRIGGER trail_no_delete; DELETE FROM trail WHERE number = 10')
    expectRefused(/damaged/)
  })

  it.each([
    ['its data were changed', "UPDATE data_group SET matrix = x'000000000000f03f'", 'data_group'],
    ['its data are no numbers', "UPDATE data_group SET matrix = x'0011'", 'data_group'],
    ['an outcome is no JSON', "UPDATE fit SET outcome = '{'", 'fit']
  ])('when %s', (_case, statement, table) => {
    filled(createProjectFile(path, clock)).close()
    tamper(`DROP TRIGGER ${table}_no_update; ${statement}`)
    expectRefused(/altered by another program/)
  })
})

describe('saving', () => {
  it('makes a file that tells what the unsaved study told, and that it was saved', () => {
    const project = filled(createInMemoryProject(clock))
    const before = told(project)
    const saved = project.saveAs(path)
    const after = told(saved)
    expect({ ...after, trail: after.trail.slice(0, -1) }).toEqual(before)
    expect(after.trail.at(-1)?.sentence).toBe('The study was saved as “noise.rungwise”.')
    expect(saved.file).toBe(path)
    expect(saved.trailBreak).toBeNull()
    saved.close()
    project.close()
    expect(readdirSync(folder)).toEqual(['noise.rungwise'])
  })

  it('never replaces a file that is not a project', () => {
    writeFileSync(path, 'important notes')
    const project = filled(createInMemoryProject(clock))
    const before = everything()
    expect(() => project.saveAs(path)).toThrow(/This is not a Rungwise project file/)
    expect(everything()).toEqual(before)
    project.close()
  })

  it('never replaces a project whose records it does not have', () => {
    filled(createProjectFile(path, clock)).close()
    const before = everything()
    const project = filled(createInMemoryProject(clock))
    expect(() => project.saveAs(path)).toThrow(/holds records that the open study does not have/)
    expect(everything()).toEqual(before)
    project.close()
  })

  it('replaces an earlier copy of the same study', () => {
    const original = filled(createProjectFile(join(folder, 'original.rungwise'), clock))
    writeFileSync(path, '')
    rmSync(path)
    original.close()
    writeFileSync(path, readFileSync(join(folder, 'original.rungwise')))
    const again = openProjectFile(join(folder, 'original.rungwise'), clock)
    again.recordDecision({ ladder: 'Evenness', rung: 'One noise', reason: 'Thought about it again' })
    const saved = again.saveAs(path)
    expect(saved.decisions()).toHaveLength(2)
    saved.close()
    again.close()
  })

  it('says so when the folder is not there', () => {
    const project = filled(createInMemoryProject(clock))
    expect(() => project.saveAs(join(folder, 'nowhere', 'noise.rungwise'))).toThrow(/There is no such folder/)
    expect(() => createProjectFile(join(folder, 'nowhere', 'noise.rungwise'), clock)).toThrow(/There is no such folder/)
    project.close()
  })

  it('takes a name with a quotation mark', () => {
    const project = filled(createInMemoryProject(clock))
    const saved = project.saveAs(join(folder, "tonight's noise.rungwise"))
    expect(saved.plan()).toEqual(project.plan())
    saved.close()
    project.close()
  })
})

describe('the schema', () => {
  it('is the one that released files have: add a migration instead of changing this', () => {
    const database = new Database(':memory:')
    migrate(database)
    expect(schemaOf(database)).toMatchSnapshot()
    expect(database.pragma('user_version', { simple: true })).toBe(schemaVersion)
    expect(database.pragma('application_id', { simple: true })).toBe(applicationId)
    database.close()
  })

  it('holds every plan that the schema of plans allows, by JSON', () => {
    expect(planSchema.parse(JSON.parse(JSON.stringify(smallPlan())))).toEqual(smallPlan())
  })
})

/** The layer rule is only worth its words if breaking it fails: each case is one forbidden import, checked as `npm run check` does. */
import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { createRequire } from 'node:module'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { cruise, type ICruiseResult } from 'dependency-cruiser'
import { afterAll, beforeAll, expect, test } from 'vitest'

const rules = createRequire(import.meta.url)('../.dependency-cruiser.cjs')

/** A small copy of the house: what stands at the end of each forbidden import. */
const house: Readonly<Record<string, string>> = {
  'src-main/study/study.ts': 'export const study = 1\n',
  'src-main/statistics/fit/fit.ts': 'export const fit = 1\n',
  'src-main/statistics/model/cells.ts': 'export const cells = 1\n',
  'src-main/statistics/moments/moments.ts': 'export const moments = 1\n',
  'src-main/operations/contract.ts': 'export type Contract = number\n',
  'src-main/operations/index.ts': 'export const operations = 1\n',
  'src-main/project/project.ts': 'export const project = 1\n',
  'src-main/study/n.ts': "import './m.ts'\nexport const n = 1\n",
  'src-renderer/page.ts': 'export const page = 1\n'
}

const broken: readonly { from: string; line: string; rule: string }[] = [
  { from: 'src-main/statistics/fit/a.ts', line: "import '../../study/study.ts'", rule: 'statistics-imports-only-below' },
  { from: 'src-main/statistics/fit/b.ts', line: "import 'node:fs'", rule: 'statistics-imports-only-statistics' },
  { from: 'src-main/statistics/model/c.ts', line: "import '../fit/fit.ts'", rule: 'statistics-model-imports-only-below' },
  { from: 'src-main/statistics/model/d.ts', line: "import '../moments/moments.ts'", rule: 'statistics-model-imports-only-below' },
  { from: 'src-main/study/e.ts', line: "import '../project/project.ts'", rule: 'study-imports-only-below' },
  {
    from: 'src-main/reporting/f.ts',
    line: "import type { Contract } from '../operations/contract.ts'\nexport type F = Contract",
    rule: 'reporting-imports-only-below'
  },
  { from: 'src-main/operations/g.ts', line: "import '../../src-renderer/page.ts'", rule: 'operations-imports-only-below' },
  { from: 'src-renderer/h.ts', line: "import '../src-main/operations/index.ts'", rule: 'window-knows-only-the-contract' },
  {
    from: 'src-renderer/i.ts',
    line: "import '../src-main/operations/contract.ts'",
    rule: 'window-imports-only-types-from-the-contract'
  },
  { from: 'src-renderer/j.ts', line: "import 'node:path'", rule: 'window-uses-no-node' },
  { from: 'src-main/operations/k.ts', line: "import 'electron'", rule: 'only-shells-import-electron' },
  { from: 'src-main/shells/l.ts', line: "import '../../src-renderer/page.ts'", rule: 'shells-import-no-window' },
  { from: 'src-main/study/m.ts', line: "import './n.ts'\nexport const m = 1", rule: 'no-circles' },
  { from: 'src-main/study/o.ts', line: "import './not-there.ts'", rule: 'imports-are-found' }
]

let folder = ''
let violations: { from: string; rule: string }[] = []

beforeAll(async () => {
  folder = mkdtempSync(join(tmpdir(), 'rungwise-layers-'))
  const write = (file: string, text: string) => {
    mkdirSync(dirname(join(folder, file)), { recursive: true })
    writeFileSync(join(folder, file), text)
  }
  for (const [file, text] of Object.entries(house)) write(file, text)
  for (const { from, line } of broken) write(from, `${line}\n`)
  write(
    'src-renderer/allowed.ts',
    "import type { Contract } from '../src-main/operations/contract.ts'\nexport type Allowed = Contract"
  )
  const { tsConfig: _unused, ...options } = rules.options
  const report = await cruise(['src-main', 'src-renderer'], {
    ...options,
    baseDir: folder,
    validate: true,
    ruleSet: { forbidden: rules.forbidden }
  })
  violations = (report.output as ICruiseResult).summary.violations.map(({ from, rule }) => ({ from, rule: rule.name }))
})
afterAll(() => rmSync(folder, { recursive: true, force: true }))

test.each(broken)('$from breaks $rule', ({ from, rule }) => {
  expect(violations).toContainEqual({ from, rule })
})

test('what the rules allow is not reported', () => {
  expect(violations.filter(({ from }) => from in house || from === 'src-renderer/allowed.ts')).toEqual([])
})

test('every rule stops the check', () => {
  expect(rules.forbidden.map((rule: { severity: string }) => rule.severity)).toEqual(rules.forbidden.map(() => 'error'))
})

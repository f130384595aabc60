/**
 * Broken plans, data files and matrices, each with the distinctive part of the message a user must see.
 *
 * A case is a folder: plan.yaml and the files beside it. The table is walked by bad-input.test.ts.
 */

export interface BadInput {
  /** What is wrong, as a sentence about the input. */
  name: string
  /** By name, the files beside the plan. */
  files: Record<string, string>
  /** Text of plan.yaml. */
  plan: string
  /** Part of the one message; what stands before it is the plan's file name, if anything. */
  message: string
}

const HEADER = 'a,b,c,d,site'
const ROWS = [
  '1,5,3,6,north',
  '2,3,4,2,north',
  '4,4,1,5,north',
  '6,1,2,3,north',
  '3,6,6,1,north',
  '5,2,5,4,north',
  '2,5,1,4,south',
  '1,2,6,5,south',
  '6,3,3,1,south',
  '4,6,2,2,south',
  '5,1,4,6,south',
  '3,4,5,3,south'
]

const csv = (rows: readonly string[] = ROWS, header = HEADER): string => [header, ...rows, ''].join('\n')
const GOOD: Record<string, string> = { 'a.csv': csv() }

const HEAD = `study: Broken
data:
  file: a.csv
  indicators: [a, b, c, d]
  group: site
`
const CANDIDATES = `candidates:
  Two:
    factors:
      F: [a, b]
      G: [c, d]
`
const GOOD_PLAN = HEAD + CANDIDATES

/** A good plan with one part replaced. Throws when the part is not in it, so that no case is broken by accident only. */
function replaced(part: string, by: string, plan = GOOD_PLAN): string {
  if (!plan.includes(part)) throw new Error(`"${part}" is not in the plan`)
  return plan.replace(part, by)
}

/** A case whose plan is broken. */
const plan = (name: string, text: string, message: string): BadInput => ({ name, files: GOOD, plan: text, message })
/** A case with one thing added to the good plan. */
const added = (name: string, text: string, message: string): BadInput => plan(name, GOOD_PLAN + text, message)
/** A case whose data file is broken. */
const data = (name: string, text: string, message: string): BadInput => ({
  name,
  files: { 'a.csv': text },
  plan: GOOD_PLAN,
  message
})
/** The good file with row `i` (from 0) replaced. */
const row = (name: string, i: number, text: string, message: string): BadInput => data(name, csv(ROWS.with(i, text)), message)

/** A published summary of three indicators. `spread` and what follows it stand under the group. */
const SUMMARY = `study: Broken
data:
  indicators: [a, b, c]
  divisor: n
  summary:
    - n: 100
      covariance: [[2], [0.5, 3], [0.4, 0.6, 1]]
candidates:
  One:
    factors: { F: [a, b, c] }
`
const summary = (name: string, part: string, by: string, message: string): BadInput => ({
  name,
  files: {},
  plan: replaced(part, by, SUMMARY),
  message
})

const asText: BadInput[] = [
  plan('an empty plan', '', 'line 1, column 1: The plan is empty.'),
  plan('a plan of comments only', '# nothing yet\n', 'The plan is empty.'),
  plan(
    'a plan that is a list',
    '- study: Broken\n',
    'line 1, column 1: The plan must be a mapping ("key: value"), but a list stands here.'
  ),
  plan('a plan that is a word', 'study', 'The plan must be a mapping ("key: value"), but "study" stands here.'),
  plan(
    'a bracket that is not closed',
    replaced('[a, b, c, d]', '[a, b, c, d'),
    'line 5, column 3: This is not one document of valid YAML:'
  ),
  plan('a tab as indentation', replaced('  file: a.csv', '\tfile: a.csv'), 'Tabs are not allowed as indentation'),
  plan(
    'two documents',
    `${GOOD_PLAN}---\nstudy: Another\n`,
    'This is not one document of valid YAML: a second document starts here.'
  ),
  plan('an alias without an anchor', replaced('indicators: [a, b, c, d]', 'indicators: *all'), '"*all" stands for nothing'),
  plan(
    'a mistyped key',
    replaced('study:', 'studdy:'),
    'line 1, column 1: Unknown key "studdy" in the plan. The nearest known key is "study"'
  ),
  plan(
    'a key that stands twice',
    `${GOOD_PLAN}study: Again\n`,
    'line 11, column 1: "study" stands twice in the plan, first in line 1.'
  ),
  plan('no study', replaced('study: Broken\n', ''), 'The plan has no "study".'),
  plan('a study without a name', replaced('study: Broken', 'study:'), 'line 1, column 7: The study is empty.'),
  plan('no data', `study: Broken\n${CANDIDATES}`, 'The plan has no "data".'),
  plan('no candidates', HEAD, 'The plan has no "candidates".')
]

const inData: BadInput[] = [
  plan(
    'an unknown key in the data',
    replaced('  group: site', '  grup: site'),
    'line 5, column 3: Unknown key "grup" in the data. The nearest known key is "group"'
  ),
  plan('neither file nor summary', replaced('  file: a.csv\n', ''), 'The data name neither a file nor a summary.'),
  plan('file and summary at once', replaced('  group: site', '  summary: []'), 'The data name a file and a summary.'),
  plan('a divisor beside a file', replaced('  group: site', '  divisor: n'), '"divisor" does not go with "file".'),
  plan('no indicators', replaced('[a, b, c, d]', '[]'), 'There are no indicators.'),
  plan(
    'indicators that are no list',
    replaced('[a, b, c, d]', 'a, b, c, d'),
    'line 4, column 15: The indicators must be a list, but "a, b, c, d" stands here.'
  ),
  plan(
    'an indicator listed twice',
    replaced('[a, b, c, d]', '[a, b, c, a]'),
    'line 4, column 25: The indicator "a" is listed twice.'
  ),
  plan(
    'an indicator that is a mapping',
    replaced('[a, b, c, d]', '[a, b, c, { d: 1 }]'),
    'An indicator must be a name, but a mapping stands here.'
  ),
  plan(
    'an indicator that is the grouping',
    replaced('group: site', 'group: a'),
    'line 5, column 10: "a" is an indicator and the grouping.'
  ),
  plan(
    'missing codes that are no list',
    replaced('group: site', 'missing codes: NA'),
    'The missing codes must be a list, but "NA" stands here.'
  )
]

const inCandidates: BadInput[] = [
  plan(
    'a candidate that stands twice',
    `${GOOD_PLAN}  Two:\n    from: Two\n`,
    'line 11, column 3: "Two" stands twice in the candidates, first in line 7.'
  ),
  plan('a candidate with nothing in it', `${GOOD_PLAN}  Empty: {}\n`, '"Empty" has neither factors nor a parent.'),
  plan(
    'an unknown key in a candidate',
    `${GOOD_PLAN}  Bad:\n    form: Two\n`,
    'line 12, column 5: Unknown key "form" in "Bad". The nearest known key is "from"'
  ),
  added(
    'an unknown parent',
    '  Bad: { from: Twoo }\n',
    'line 11, column 16: "Bad" is derived from "Twoo", which is not a candidate. Did you mean "Two"?'
  ),
  added('a candidate derived from itself', '  Bad: { from: Bad }\n', 'The derivation runs in a circle: "Bad" from "Bad".'),
  added(
    'derivations in a circle',
    '  X: { from: Y }\n  Y: { from: Z }\n  Z: { from: X }\n',
    'The derivation runs in a circle: "X" from "Y" from "Z" from "X".'
  ),
  added(
    'a parent and factors at once',
    '  Bad: { from: Two, factors: { F: [a] } }\n',
    '"Bad" is derived from "Two", so it cannot list factors of its own.'
  ),
  plan(
    'no factor at all',
    replaced('    factors:\n      F: [a, b]\n      G: [c, d]\n', '    factors: {}\n'),
    'There are no factors.'
  ),
  plan('a factor that measures nothing', replaced('G: [c, d]', 'G: []'), 'The factor "G" measures nothing.'),
  plan(
    'a factor that is no list',
    replaced('G: [c, d]', 'G: c'),
    'line 10, column 10: The indicators of "G" must be a list, but "c" stands here.'
  ),
  plan(
    'a factor of an unknown indicator',
    replaced('G: [c, d]', 'G: [c, e]'),
    'line 10, column 14: The factor "G" measures "e", which is neither an indicator nor a factor.'
  ),
  plan('a factor called like an indicator', replaced('G: [c, d]', 'd: [c, d]'), '"d" is an indicator and a factor.'),
  plan('a factor that measures itself', replaced('G: [c, d]', 'G: [c, G]'), 'The factor "G" measures itself.'),
  plan('an indicator twice in a factor', replaced('G: [c, d]', 'G: [c, d, c]'), 'line 10, column 17: "c" stands twice under "G".'),
  plan(
    'factors in a circle',
    replaced('G: [c, d]', 'G: [c, d, H]\n      H: [F, K]\n      K: [G]'),
    'Factors measure each other in a circle: "G" measures "H" measures "K" measures "G".'
  ),
  plan(
    'a mistyped scaling',
    `${GOOD_PLAN}    scaling: first loadings\n`,
    'line 11, column 14: The scaling cannot be "first loadings". Did you mean "first loading"?'
  ),
  added('factor covariances neither free nor zero', '    factor covariances: none\n', 'The factor covariances cannot be "none".'),
  added(
    'an unknown set held equal',
    '    across: site\n    equal across groups: [loading]\n',
    'What is equal across groups cannot be "loading". Did you mean "loadings"?'
  ),
  added(
    'a set held equal that is no list',
    '    across: site\n    equal across groups: loadings\n',
    'What is equal across groups must be a list'
  ),
  added('a set held equal twice', '    across: site\n    equal across groups: [loadings, loadings]\n', '"loadings" stands twice.'),
  added('something held equal without groups', '    equal across groups: [loadings]\n', '"Two" is not across groups.'),
  added(
    "a grouping that is not the data's",
    '    across: clinic\n',
    'line 11, column 13: "clinic" is not the grouping of the data. The grouping is "site".'
  ),
  plan(
    'a grouping where there is none',
    replaced('  group: site\n', '', `${GOOD_PLAN}    across: site\n`),
    'There are no groups in the data to go across "site".'
  ),
  added(
    'an exception without an equality',
    '    across: site\n    except: [{ loading: [b, F] }]\n',
    'holds nothing equal across groups, so nothing can be excepted.'
  ),
  added(
    'an exception from what is not held equal',
    '    across: site\n    equal across groups: [loadings]\n    except: [{ intercept: b }]\n',
    'The intercept is excepted, but intercepts are not held equal across groups.'
  ),
  added(
    'an exception in an unknown group',
    '    across: site\n    equal across groups: [loadings]\n    except: [{ loading: [b, F], group: nroth }]\n',
    'There is no group "nroth" in the data. Did you mean "north"?'
  )
]

const change = (text: string): string => `  Bad:\n    from: Two\n    change:\n      - ${text}\n`

const inChanges: BadInput[] = [
  added('a change that says nothing', change('{ at: 0 }'), 'line 14, column 9: This change says neither free, fix nor equal.'),
  added(
    'a mistyped change',
    change('fre: { loading: [a, G] }'),
    'line 14, column 9: Unknown key "fre" in a change. The nearest known key is "free"'
  ),
  added(
    'two changes in one',
    change('{ free: { loading: [a, G] }, fix: { loading: [b, G] } }'),
    'One change cannot free and fix at once.'
  ),
  added('a fixed cell without its value', change('fix: { loading: [a, G] }'), 'A fixed cell needs its value.'),
  added(
    'a value that is no number',
    change('{ fix: { loading: [a, G] }, at: one }'),
    'The value of a fixed cell must be a number, but "one" stands here.'
  ),
  added('a value with a decimal comma', change('{ fix: { loading: [a, G] }, at: "0,5" }'), 'Write decimals with a point.'),
  added(
    'a value beyond all numbers',
    change('{ fix: { loading: [a, G] }, at: .inf }'),
    'The value of a fixed cell must be a number, but ".inf" stands here.'
  ),
  added('a value for a free cell', change('{ free: { loading: [a, G] }, at: 1 }'), '"at" goes with "fix", not with "free".'),
  added(
    'a variance fixed below zero',
    change('{ fix: { residual variance: a }, at: -1 }'),
    'A residual variance cannot be fixed at -1: a variance is never negative.'
  ),
  added(
    'an unknown part of the model',
    change('free: { residual covarance: [a, c] }'),
    'Unknown key "residual covarance" in a cell. The nearest known key is "residual covariance"'
  ),
  added(
    'a cell of two parts',
    change('free: { loading: [a, G], intercept: a }'),
    'A cell names 2 parts of the model (loading, intercept).'
  ),
  added('a loading with one name', change('free: { loading: [a] }'), 'A loading takes two names, but 1 stand here.'),
  added(
    'a loading with a bare name',
    change('free: { loading: a }'),
    'The names of a loading must be a list, but "a" stands here.'
  ),
  added(
    'a residual variance with two names',
    change('free: { residual variance: [a, b] }'),
    'A residual variance takes one name, but 2 stand here.'
  ),
  added(
    'a loading the wrong way round',
    change('free: { loading: [G, a] }'),
    '"G" is a factor, but the loading wants an indicator there. A loading takes [indicator, factor].'
  ),
  added(
    'a loading between factors',
    change('free: { loading: [F, G] }'),
    'What a factor measures of another is a "factor regression: [F, G]".'
  ),
  added(
    'a cell of an unknown indicator',
    change('free: { residual covariance: [a, e] }'),
    'line 14, column 9: There is no indicator "e".'
  ),
  added('a cell of an unknown factor', change('free: { factor covariance: [F, H] }'), 'There is no factor "H".'),
  added(
    'a covariance of one name with itself',
    change('free: { residual covariance: [a, a] }'),
    'A residual covariance joins two different names, not "a" with itself. Write "residual variance: a".'
  ),
  added('an equality of one cell', change('equal: { residual variance: [a] }'), 'An equality needs at least two cells.'),
  added(
    'an equality of a cell with itself',
    change('equal: { residual covariance: [[a, c], [c, a]] }'),
    'stands twice in one equality.'
  ),
  added(
    'an equality of bare names',
    change('equal: { loading: [a, b] }'),
    'The names of a loading must be a list, but "a" stands here.'
  ),
  added(
    'a change in one group of a candidate that has none',
    change('{ free: { loading: [a, G] }, group: north }'),
    'The group "north" is named, but this candidate is not across groups.'
  )
]

const inTheRest: BadInput[] = [
  added(
    'an unknown candidate on a ladder',
    'ladders:\n  Up: [Two, One]\n',
    'line 12, column 13: The ladder "Up" names "One", which is not a candidate.'
  ),
  added('a candidate twice on a ladder', 'ladders:\n  Up: [Two, Two]\n', '"Two" stands twice on the ladder "Up".'),
  added('an empty ladder', 'ladders:\n  Up: []\n', 'The ladder "Up" has no rung.'),
  added('a ladder that is a word', 'ladders:\n  Up: Two\n', 'The ladder "Up" must list candidates, or say "invariance of:".'),
  added(
    'an invariance ladder of an unknown candidate',
    'ladders:\n  Up: { invariance of: To, across: site, through: strict }\n',
    'The ladder "Up" names "To", which is not a candidate. Did you mean "Two"?'
  ),
  added(
    'an invariance ladder through an unknown step',
    'ladders:\n  Up: { invariance of: Two, across: site, through: scaler }\n',
    'The highest step cannot be "scaler". Did you mean "scalar"?'
  ),
  added(
    'an invariance ladder without its grouping',
    'ladders:\n  Up: { invariance of: Two, through: strict }\n',
    'The ladder "Up" has no "across".'
  ),
  added(
    'an invariance ladder across another column',
    'ladders:\n  Up: { invariance of: Two, across: sex, through: strict }\n',
    '"sex" is not the grouping of the data.'
  ),
  added('alpha of five', 'rules: { alpha: 5 }\n', 'line 11, column 17: alpha must lie between 0 and 1, not at 5.'),
  added('alpha of zero', 'rules: { alpha: 0 }\n', 'alpha must lie between 0 and 1, not at 0.'),
  added('alpha as text', 'rules: { alpha: "0.05" }\n', 'alpha must be a number, but "0.05" stands here.'),
  added('an unknown adjustment', 'rules: { adjust: hollm }\n', 'The adjustment cannot be "hollm". Did you mean "holm"?'),
  added(
    'a threshold with the wrong sign',
    'rules: { change in fit: { cfi: 0.01 } }\n',
    'The threshold of cfi is the lowest change that still holds: zero or negative, not 0.01. Write -0.01.'
  ),
  added('a decision by thresholds that are not there', 'rules: { decide by: both }\n', '"decide by: both" needs thresholds.'),
  added('an unknown rule', 'rules: { alfa: 0.05 }\n', 'Unknown key "alfa" in the rules. The nearest known key is "alpha"'),
  added('an unknown method', 'estimation: { method: least squares }\n', 'The method cannot be "least squares".'),
  added(
    'the mean-scaled statistic',
    'estimation: { statistic: mean-scaled }\n',
    '"statistic: mean-scaled" is not available yet in this version.'
  ),
  added(
    'full information',
    'estimation: { missing: full information }\n',
    'line 11, column 24: "missing: full information" is not available yet in this version.'
  ),
  added(
    'robust standard errors',
    'estimation: { standard errors: robust }\n',
    '"standard errors: robust" is not available yet in this version.'
  ),
  added(
    'the wishart convention with raw data',
    'estimation: { convention: wishart }\n',
    'The wishart convention does not go with a file of raw data.'
  )
]

const inFiles: BadInput[] = [
  { name: 'no such file', files: {}, plan: GOOD_PLAN, message: 'a.csv: There is no such file.' },
  data('an empty file', '', 'a.csv: The file is empty.'),
  data('a header without rows', csv([]), 'a.csv: The file has a header but no rows.'),
  data(
    'rows without a header',
    csv(
      ROWS.map((one) => one.replace(/[a-z]+$/, '1')),
      '1,2,3,4,5'
    ),
    'the header seems to be missing.'
  ),
  data('a column that stands twice', csv(ROWS, 'a,b,a,d,site'), 'a.csv, line 1: Columns 1 and 3 are both called "a".'),
  data(
    'a missing column',
    csv(ROWS, 'a,b,c,dd,site'),
    'a.csv, line 1: There is no column "d" (wanted as indicator). The columns are "a", "b", "c", "dd" and "site".'
  ),
  data('a missing grouping column', csv(ROWS, 'a,b,c,d,place'), 'There is no column "site" (wanted as grouping).'),
  data('columns separated by semicolons', csv().replaceAll(',', ';'), 'a.csv, line 1: The columns are separated by semicolons.'),
  row('a row with a cell too many', 3, '6,1,2,3,north,7', 'a.csv, line 5: The row has 6 cells, but the header has 5.'),
  row('a row with a cell too few', 3, '6,1,2,north', 'a.csv, line 5: The row has 4 cells, but the header has 5.'),
  row(
    'a decimal comma',
    1,
    '"2,5",3,4,2,north',
    'a.csv, line 3, column "a": "2,5" is written with a decimal comma. Write decimals with a point.'
  ),
  row(
    'a decimal comma without quotes',
    1,
    '2,5,3,4,2,north',
    'The row has 6 cells, but the header has 5. A cell that holds the separator must stand in quotes; decimals must be written with a point.'
  ),
  row(
    'text among the numbers',
    2,
    '4,often,1,5,north',
    'a.csv, line 4, column "b": "often" is not a number. If it stands for a missing answer, add it to the missing codes.'
  ),
  row('infinity', 2, '4,Infinity,1,5,north', '"Infinity" is not a finite number.'),
  row('a number beyond all numbers', 2, '4,1e999,1,5,north', '"1e999" is not a finite number.'),
  row('a hexadecimal number', 2, '4,0x1F,1,5,north', '"0x1F" is not a decimal number.'),
  row('thousands separators', 2, '4,"1,234",1,5,north', 'a.csv, line 4, column "b": "1,234" is written with thousands separators.'),
  row('a percentage', 2, '4,50%,1,5,north', '"50%" is not a number.'),
  row('not-a-number in so many words', 2, '4,NaN,1,5,north', '"NaN" is not a number.'),
  row('a quote that is not closed', 5, '5,2,5,"4,north', 'a.csv, line 7: A quote is opened and never closed.'),
  row('a quote inside a cell', 5, '5,2,5,4"1,north', 'a.csv, line 7: A quote stands inside a cell that is not quoted.'),
  row('text after a closing quote', 5, '5,2,5,"4"1,north', 'a.csv, line 7: Text follows a closing quote.'),
  {
    name: 'an empty cell that is no missing code',
    files: { 'a.csv': csv(ROWS.with(0, ',5,3,6,north')) },
    plan: replaced('group: site', 'group: site\n  missing codes: [NA]'),
    message: 'a.csv, line 2, column "a": The answer is empty. Add "" to the missing codes'
  },
  data(
    'a constant indicator',
    csv(ROWS.map((one) => `7${one.slice(1)}`)),
    'a.csv, column "a": "a" is constant: every answer is 7.'
  ),
  data('an indicator without any answer', csv(ROWS.map((one) => one.slice(1))), '"a" has no answers at all.'),
  data(
    'an indicator constant in one group',
    csv(ROWS.map((one) => (one.endsWith('south') ? `7${one.slice(1)}` : one))),
    '"a" is constant among the complete cases in group "south".'
  ),
  data('too few cases in a group', csv(ROWS.slice(0, 10)), 'Too few cases in group "south": 4 for 4 indicators.'),
  data(
    'too few complete cases in a group',
    csv(ROWS.map((one, i) => (i > 9 ? `NA${one.slice(1)}` : one))),
    'Too few cases in group "south": 4 for 4 indicators.'
  ),
  data('no group at all', csv(ROWS.map((one) => one.replace(/[a-z]+$/, ''))), 'No row has'),
  data(
    'an indicator that repeats another',
    csv(ROWS.map((one) => `${one[0]},${one[0]}${one.slice(3)}`)),
    '"a" and "b" determine each other exactly in group "north": one is a linear combination of the rest.'
  ),
  data(
    'an indicator that is the sum of two others',
    csv(ROWS.map((one) => `${one.slice(0, 6)}${Number(one[0]) + Number(one[2])},${one.split(',')[4]}`)),
    'a.csv, column "d": "a", "b" and "d" determine each other exactly in group "north"'
  ),
  {
    name: 'one group only, and a candidate across it',
    files: { 'a.csv': csv(ROWS.map((one) => one.replace('south', 'north'))) },
    plan: `${GOOD_PLAN}    across: site\n`,
    message: '"site" holds one group only, so there is nothing to compare across it.'
  }
]

const inSummaries: BadInput[] = [
  summary('no divisor', '  divisor: n\n', '', 'The divisor of the covariances is not given.'),
  summary('an unknown divisor', 'divisor: n', 'divisor: N-1', 'The divisor cannot be "N-1". Did you mean "n-1"?'),
  summary('missing codes beside a summary', 'divisor: n', 'missing codes: [NA]', '"missing codes" does not go with "summary".'),
  summary('no n', 'n: 100\n      cov', 'cov', 'A group of the summary has no "n".'),
  summary('half a case', 'n: 100', 'n: 99.5', 'n must be a whole number of cases, not 99.5.'),
  summary('fewer cases than indicators', 'n: 100', 'n: 3', 'Too few cases: 3 for 3 indicators.'),
  summary('no matrix', 'covariance: [[2], [0.5, 3], [0.4, 0.6, 1]]', 'mean: [1, 2, 3]', 'neither covariances nor correlations.'),
  summary('a row too few', ', [0.4, 0.6, 1]]', ']', 'The covariance matrix has 2 rows, but there are 3 indicators.'),
  summary(
    'a whole square matrix',
    '[[2], [0.5, 3]',
    '[[2, 0.5, 0.4], [0.5, 3, 0.6]',
    'line 7, column 20: Row 1 of the covariance matrix ("a") has 3 numbers, but 1 are wanted. Give the lower triangle by rows'
  ),
  summary('a matrix with a word in it', '0.5, 3', 'x, 3', 'The covariance of "b" and "a" must be a number, but "x" stands here.'),
  summary('a variance of zero', '0.5, 3', '0.5, 0', 'The variance of "b" must be positive, not 0.'),
  summary(
    'correlations without standard deviations',
    'covariance: [[2], [0.5, 3], [0.4, 0.6, 1]]',
    'correlation: [[1], [0.5, 1], [0.4, 0.6, 1]]',
    'Correlations need their standard deviations.'
  ),
  summary(
    'standard deviations beside covariances',
    'n: 100',
    'n: 100\n      sd: [1, 1, 1]',
    'Standard deviations go with correlations, not with covariances.'
  ),
  summary(
    'covariances and correlations at once',
    'n: 100',
    'n: 100\n      correlation: [[1]]',
    'Covariances and correlations are both given.'
  ),
  summary(
    'a correlation with itself other than one',
    'covariance: [[2], [0.5, 3], [0.4, 0.6, 1]]',
    'sd: [1, 2, 3]\n      correlation: [[1], [0.5, 2], [0.4, 0.6, 1]]',
    'The correlation of "b" with itself must be 1, not 2.'
  ),
  summary(
    'a correlation beyond one',
    'covariance: [[2], [0.5, 3], [0.4, 0.6, 1]]',
    'sd: [1, 2, 3]\n      correlation: [[1], [1.5, 1], [0.4, 0.6, 1]]',
    'The correlation of "b" and "a" is 1.5, beyond 1.'
  ),
  summary(
    'a standard deviation below zero',
    'covariance: [[2], [0.5, 3], [0.4, 0.6, 1]]',
    'sd: [1, -2, 3]\n      correlation: [[1], [0.5, 1], [0.4, 0.6, 1]]',
    'The standard deviation of "b" must be positive, not -2.'
  ),
  summary('too few means', 'n: 100', 'n: 100\n      mean: [1, 2]', 'The means are 2, but there are 3 indicators.'),
  summary(
    'a matrix that is not positive definite',
    '[0.5, 3], [0.4, 0.6, 1]',
    '[0.5, 3], [2, 0.6, 1]',
    'The matrix is not positive definite: the smallest eigenvalue of its correlations is -0.4'
  ),
  summary(
    'a singular matrix',
    '[[2], [0.5, 3], [0.4, 0.6, 1]]',
    '[[1], [0, 1], [1, 1, 2]]',
    'not positive definite: the smallest eigenvalue of its correlations is 0.'
  ),
  summary(
    'two groups of one name',
    '    - n: 100',
    '    - { group: x, n: 50, covariance: [[1], [0, 1], [0, 0, 1]] }\n    - group: x\n      n: 100',
    'The group "x" stands twice.'
  ),
  summary(
    'two groups without names',
    '    - n: 100',
    '    - { n: 50, covariance: [[1], [0, 1], [0, 0, 1]] }\n    - n: 100',
    'A group of the summary has no "group".'
  ),
  summary(
    'means in one group of two',
    '    - n: 100',
    '    - { group: x, n: 50, mean: [1, 2, 3], covariance: [[1], [0, 1], [0, 0, 1]] }\n    - group: y\n      n: 100',
    'Means are given for some groups only.'
  ),
  summary(
    'a candidate across groups of a summary of one',
    '{ F: [a, b, c] }',
    '{ F: [a, b, c] }\n    across: group',
    'There are no groups in the data to go across "group". Give the summary of each group.'
  ),
  summary(
    'an intercept without means',
    '{ F: [a, b, c] }',
    '{ F: [a, b, c] }\n    change: [{ fix: { intercept: a }, at: 0 }]',
    'There are no means in the data, so there is no intercept to change.'
  ),
  {
    name: 'the wishart convention with means',
    files: {},
    plan: `${replaced('n: 100', 'n: 100\n      mean: [1, 2, 3]', SUMMARY)}estimation: { convention: wishart }\n`,
    message: 'The wishart convention does not go with means.'
  },
  {
    name: 'a ladder of intercepts without means',
    files: {},
    plan: `${replaced('    - n: 100', '    - { group: x, n: 50, covariance: [[1], [0, 1], [0, 0, 1]] }\n    - group: y\n      n: 100', SUMMARY)}ladders:\n  Up: { invariance of: One, across: group, through: scalar }\n`,
    message: 'There are no means in the data, so the ladder cannot go through scalar.'
  }
]

export const badInputs: BadInput[] = [...asText, ...inData, ...inCandidates, ...inChanges, ...inTheRest, ...inFiles, ...inSummaries]

/** The same folder without a fault, to show that it is the fault that is refused. */
export const soundInputs: Omit<BadInput, 'message'>[] = [
  { name: 'the plan the cases break', files: GOOD, plan: GOOD_PLAN },
  { name: 'the summary the cases break', files: {}, plan: SUMMARY }
]

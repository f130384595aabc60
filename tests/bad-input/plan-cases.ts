/** Broken plans: the text, the data it names, candidates, changes, ladders, rules and estimation. */
import { type BadInput, CANDIDATES, GOOD, GOOD_PLAN, HEAD, replaced } from './sound.ts'

/** A case whose plan is broken. */
const plan = (name: string, text: string, message: string): BadInput => ({ name, files: GOOD, plan: text, message })
/** A case with one thing added to the good plan. */
const added = (name: string, text: string, message: string): BadInput => plan(name, GOOD_PLAN + text, message)

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
  added(
    'a change that says nothing',
    change('{ at: 0 }'),
    'line 14, column 9: This change says neither free, fix, equal, constrain nor bound.'
  ),
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
    'a mistyped kind of change',
    change('{ constrane: [], to: 0 }'),
    'line 14, column 11: Unknown key "constrane" in a change. The nearest known key is "constrain"'
  ),
  added(
    'a constraint of one term',
    change('{ constrain: [{ loading: [b, F] }], to: 1 }'),
    'line 14, column 22: A constraint needs at least two terms.'
  ),
  added(
    'a constraint that is no list',
    change('{ constrain: { loading: [b, F] }, to: 1 }'),
    'The terms of a constraint must be a list, but a mapping stands here.'
  ),
  added(
    'a constraint without its sum',
    change('constrain: [{ loading: [b, F] }, { loading: [d, G] }]'),
    'line 14, column 9: A constraint needs the value that its terms sum to. Add "to: 0", say.'
  ),
  added(
    'a mistyped key of a term',
    change('{ constrain: [{ loading: [b, F], time: 2 }, { loading: [d, G] }], to: 0 }'),
    'line 14, column 42: Unknown key "time" in a term. The nearest known key is "times"'
  ),
  added(
    'a term taken no times',
    change('{ constrain: [{ loading: [b, F], times: 0 }, { loading: [d, G] }], to: 0 }'),
    'line 14, column 49: A cell taken 0 times constrains nothing.'
  ),
  added(
    'a term taken a word of times',
    change('{ constrain: [{ loading: [b, F], times: two }, { loading: [d, G] }], to: 0 }'),
    'How many times a cell is taken must be a number, but "two" stands here.'
  ),
  added(
    'a term of an unknown indicator',
    change('{ constrain: [{ loading: [b, F] }, { loading: [e, G] }], to: 0 }'),
    'line 14, column 9: There is no indicator "e".'
  ),
  added(
    'a cell twice in a constraint',
    change('{ constrain: [{ residual covariance: [a, c] }, { residual covariance: [c, a] }], to: 0 }'),
    'The residual covariance of "c" and "a" stands twice in one constraint. Add the two up.'
  ),
  added(
    'a constraint on a cell that is not in the model',
    change('{ constrain: [{ loading: [a, G] }, { loading: [b, F] }], to: 0 }'),
    'candidate "Bad": the loading of a on G is not in the model, so it cannot be constrained. Free it first.'
  ),
  added(
    'a constraint on fixed cells only',
    change('{ constrain: [{ loading: [a, F] }, { loading: [c, G] }], to: 2 }'),
    'every cell of this constraint is fixed, so it constrains nothing.'
  ),
  added(
    'constraints that contradict each other',
    `${change('{ constrain: [{ loading: [b, F] }, { loading: [d, G], times: -1 }], to: 0 }')}      - { constrain: [{ loading: [b, F], times: 2 }, { loading: [d, G], times: -2 }], to: 1 }\n`,
    'is 1 contradicts the fixed cells and constraints before it.'
  ),
  added(
    'groups on some terms only',
    `    across: site\n${change('{ constrain: [{ intercept: a, group: north }, { intercept: b }], to: 0 }')}`,
    'Some terms of this constraint name a group and some do not.'
  ),
  added(
    'groups on the terms and on the constraint',
    `    across: site\n${change('{ constrain: [{ intercept: a, group: north }, { intercept: a, group: south }], to: 0, group: north }')}`,
    'The constraint stands in "north", and its terms name groups too.'
  ),
  added(
    'an unknown group of a term',
    `    across: site\n${change('{ constrain: [{ intercept: a, group: north }, { intercept: a, group: sooth }], to: 0 }')}`,
    'There is no group "sooth" in the data. Did you mean "south"?'
  ),
  added(
    'a bound without a limit',
    change('bound: { residual variance: a }'),
    'line 14, column 9: A bounded cell needs its bound. Add "at least: 0", say.'
  ),
  added(
    'a bound that is a word',
    change('{ bound: { residual variance: a }, at least: zero }'),
    'The bound "at least" must be a number, but "zero" stands here.'
  ),
  added(
    'bounds the wrong way round',
    change('{ bound: { residual variance: a }, at least: 2, at most: 1 }'),
    'Nothing lies between at least 2 and at most 1. Exchange the two.'
  ),
  added(
    'bounds that leave one value',
    change('{ bound: { residual variance: a }, at least: 1, at most: 1 }'),
    'Nothing lies between at least 1 and at most 1. Write "fix:" and "at: 1".'
  ),
  added(
    'a variance bounded from above at nothing',
    change('{ bound: { factor variance: F }, at most: 0 }'),
    'A factor variance cannot be bounded at most at 0: a variance is never negative.'
  ),
  added(
    'a bound of a fixed cell',
    change('{ bound: { loading: [a, F] }, at least: 0 }'),
    'candidate "Bad": the loading of a on F is fixed at 1, so it cannot be bounded. Free it first.'
  ),
  added(
    'a bound of a change that is none',
    change('{ free: { loading: [a, G] }, at most: 1 }'),
    '"at most" goes with "bound", not with "free".'
  ),
  added(
    'a change in one group of a candidate that has none',
    change('{ free: { loading: [a, G] }, group: north }'),
    'The group "north" is named, but this candidate is not across groups.'
  )
]

/** The good plan, one more candidate by a and b alone, and a ladder of it over time. */
const HALF = '  Half:\n    factors: { F: [a, b] }\n'
const repeated = (name: string, over: string, message: string, more = ''): BadInput =>
  added(name, `${HALF}ladders:\n  Up: { invariance of: Half, over: ${over}, through: metric${more} }\n`, message)

const overTime: BadInput[] = [
  repeated(
    'occasions of unequal length',
    '{ May: [a, b], June: [c] }',
    'line 14, column 51: "May" lists 2 indicators and "June" lists 1. List the same indicators at every occasion, in the same order.'
  ),
  repeated(
    'an unknown indicator at an occasion',
    '{ May: [a, b], June: [c, dd] }',
    'line 14, column 61: There is no indicator "dd". Did you mean "d"?'
  ),
  repeated(
    'an indicator at two occasions',
    '{ May: [a, b], June: [c, a] }',
    'line 14, column 61: The indicator "a" stands at "May" and at "June".'
  ),
  repeated('one occasion', '{ May: [a, b] }', 'The ladder "Up" needs two occasions or more.'),
  repeated('occasions as a list', '[a, b]', 'The occasions'),
  repeated('an occasion without indicators', '{ May: [], June: [] }', 'No indicator is listed at "May".'),
  repeated(
    'a candidate stated for another occasion',
    '{ May: [c, d], June: [a, b] }',
    'line 14, column 38: "Half" measures by "a", which is not listed at "May".'
  ),
  repeated(
    'occasions and a grouping',
    '{ May: [a, b], June: [c, d] }',
    'goes across groups or over occasions, not both.',
    ', across: site'
  ),
  added(
    'a candidate across groups over time',
    '  Half:\n    factors: { F: [a, b] }\n    across: site\nladders:\n  Up: { invariance of: Half, over: { May: [a, b], June: [c, d] }, through: metric }\n',
    '"Half" is modelled across "site", and a ladder over time describes all cases together.'
  ),
  added(
    'an indicator that the candidate over time does not use',
    `${HALF.replace('[a, b]', '[a]')}ladders:\n  Up: { invariance of: Half, over: { May: [a, b], June: [c, d] }, through: metric }\n`,
    '"b" is listed at "May", but "Half" does not measure by it.'
  ),
  added(
    'a candidate from a rung that its ladder does not reach',
    `${HALF}  Partly: { from: "Half, scalar over time" }\nladders:\n  Up: { invariance of: Half, over: { May: [a, b], June: [c, d] }, through: metric }\n`,
    '"Partly" is derived from "Half, scalar over time", which is not a candidate.'
  ),
  added(
    'a cell that a rung over time does not have',
    `${HALF}  Partly:\n    from: Half, metric over time\n    change: [{ free: { loading: [d, F] } }]\nladders:\n  Up: { invariance of: Half, over: { May: [a, b], June: [c, d] }, through: metric }\n`,
    'line 15, column 14: There is no factor "F". The factors are "F at May" and "F at June".'
  ),
  added(
    'a ladder of a candidate that derives from a rung',
    `${HALF}  Partly: { from: "Half, metric over time" }\nladders:\n  Up: { invariance of: Half, over: { May: [a, b], June: [c, d] }, through: metric }\n  On: { invariance of: Partly, over: { May: [a, b], June: [c, d] }, through: metric }\n`,
    '"Partly" derives from a rung of a ladder, and cannot carry a ladder itself.'
  ),
  added(
    'two ladders of one candidate over different occasions',
    `${HALF}ladders:\n  Up: { invariance of: Half, over: { May: [a, b], June: [c, d] }, through: metric }\n  On: { invariance of: Half, over: { May: [a, b], July: [c, d] }, through: metric }\n`,
    'The ladder "On" takes "Half" over other occasions.'
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
    'the wishart convention with raw data',
    'estimation: { convention: wishart }\n',
    'The wishart convention does not go with a file of raw data.'
  )
]

export const planCases: BadInput[] = [...asText, ...inData, ...inCandidates, ...inChanges, ...overTime, ...inTheRest]

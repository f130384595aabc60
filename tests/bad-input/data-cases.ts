/** Broken data files and published figures. */
import { type BadInput, csv, GOOD_PLAN, ROWS, replaced } from './sound.ts'

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
export const SUMMARY = `study: Broken
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

const inFiles: BadInput[] = [
  { name: 'no such file', files: {}, plan: GOOD_PLAN, message: 'here is no such file' },
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
  ...[
    ['statistic', 'mean-scaled'],
    ['missing', 'full information'],
    ['standard errors', 'robust']
  ].map(([key, value]) =>
    summary(
      `${value} on a published summary`,
      'candidates:',
      `estimation: { ${key}: ${value} }\ncandidates:`,
      `"${key}: ${value}" needs the answers themselves, and published covariances have none.`
    )
  ),
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

export const dataCases: BadInput[] = [...inFiles, ...inSummaries]

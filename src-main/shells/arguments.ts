/**
 * What was typed after `rungwise`, as a command. Anything not understood is bad input that names the nearest word it knows.
 */
import { InputError } from '../study/input-error.ts'
import { didYouMean } from '../study/nearest.ts'

export type Command =
  | { do: 'help' }
  | { do: 'version' }
  | {
      do: 'compare'
      plan: string
      project: string | null
      json: string | null
      resampling: { resamples: number; seed: number } | null
      inspect: string | null
    }
  | { do: 'open'; file: string | null }

export const helpText = `rungwise: compares nested measurement models and shows how far up the ladder
one can stand.

Usage:
  rungwise compare PLAN.yaml [--project FILE] [--json FILE]
                             [--resamples NUMBER] [--seed NUMBER]
                             [--inspect CANDIDATE]
  rungwise open [FILE]
  rungwise --help
  rungwise --version

compare   fits the plan's candidates and prints each ladder, top rung first.
  --project FILE   also record data, candidates, fits and steps in this project
                   file (made if it is not there)
  --json FILE      also write the result as JSON; "-" writes it to standard
                   output in place of the text
  --resamples N    also refit each ladder to so many resamples of the cases, and
                   tell how often each step holds
  --seed N         which resamples are drawn (1 unless given)
  --inspect NAME   also look into this candidate: score tests, effect sizes,
                   differences of factor means
open      opens the window on a plan, a project file, or the sample study.

Exit status: 0 done, 1 a fault of the program, 2 bad input (one message on
standard error, nothing written), 130 interrupted.
`

const commands = ['compare', 'open', 'help', 'version'] as const
const optionsOf = {
  compare: ['--project', '--json', '--resamples', '--seed', '--inspect', '--help', '--version'],
  open: ['--help', '--version']
} as const

/** @throws InputError on an unknown command or option, a missing or surplus word. */
export function readArguments(words: readonly string[]): Command {
  const [first, ...rest] = words
  switch (first) {
    case undefined:
    case 'help':
    case '--help':
    case '-h':
      return { do: 'help' }
    case 'version':
    case '--version':
    case '-V':
      return { do: 'version' }
    case 'compare':
      return readCompare(rest)
    case 'open':
      return readOpen(rest)
    default:
      throw first.startsWith('-') ? unknownWord('option', first, ['--help', '--version']) : unknownWord('command', first, commands)
  }
}

function readCompare(words: readonly string[]): Command {
  const { files, values, asked } = sortWords(words, optionsOf.compare, [
    '--project',
    '--json',
    '--resamples',
    '--seed',
    '--inspect'
  ])
  if (asked !== null) return { do: asked }
  const plan = onlyFile(files, 'compare')
  if (plan === null) throw new InputError('compare needs a plan file.', { remedy: 'Write: rungwise compare PLAN.yaml' })
  const project = values.get('--project') ?? null
  if (project === '-') throw new InputError('--project needs a file; a project cannot go to standard output.')
  return {
    do: 'compare',
    plan,
    project,
    json: values.get('--json') ?? null,
    resampling: readResampling(values),
    inspect: values.get('--inspect') ?? null
  }
}

const mostResamples = 100_000

function readResampling(values: ReadonlyMap<string, string>): { resamples: number; seed: number } | null {
  const resamples = wholeNumber(values, '--resamples', 1, mostResamples)
  const seed = wholeNumber(values, '--seed', 0, 2 ** 31 - 1)
  if (resamples !== null) return { resamples, seed: seed ?? 1 }
  if (seed !== null) throw new InputError('--seed goes with --resamples.', { remedy: 'Write: --resamples 1000 --seed 1' })
  return null
}

function wholeNumber(values: ReadonlyMap<string, string>, option: string, least: number, most: number): number | null {
  const text = values.get(option)
  if (text === undefined) return null
  const number = Number(text)
  if (!/^\d+$/.test(text) || number < least || number > most)
    throw new InputError(`${option} takes a whole number from ${least} to ${most}, not "${text}".`)
  return number
}

function readOpen(words: readonly string[]): Command {
  const { files, asked } = sortWords(words, optionsOf.open, [])
  return asked !== null ? { do: asked } : { do: 'open', file: onlyFile(files, 'open') }
}

interface SortedWords {
  files: string[]
  values: Map<string, string>
  asked: 'help' | 'version' | null
}

/** Splits words into files and options; `--name value` and `--name=value` are the same, after `--` every word is a file. */
function sortWords(words: readonly string[], known: readonly string[], withValue: readonly string[]): SortedWords {
  const sorted: SortedWords = { files: [], values: new Map(), asked: null }
  for (let place = 0; place < words.length; place++) {
    const word = words[place]!
    if (word === '--') {
      sorted.files.push(...words.slice(place + 1))
      break
    }
    if (!word.startsWith('-') || word === '-') {
      sorted.files.push(word)
      continue
    }
    const [option, ...tail] = word.split('=')
    if (!known.includes(option!)) throw unknownWord('option', option!, known)
    if (!withValue.includes(option!)) {
      sorted.asked ??= option === '--help' ? 'help' : 'version'
      continue
    }
    const value = tail.length > 0 ? tail.join('=') : words[++place]
    takeValue(sorted.values, option!, value)
  }
  return sorted
}

const numbered = ['--resamples', '--seed']

function takeValue(values: Map<string, string>, option: string, value: string | undefined): void {
  if (value === undefined || value === '' || (value.startsWith('-') && value !== '-')) {
    const wanted = numbered.includes(option) ? 'number' : option === '--inspect' ? "candidate's name" : 'file name'
    throw new InputError(`${option} needs a ${wanted} after it.`)
  }
  if (values.has(option)) throw new InputError(`${option} is given twice.`)
  values.set(option, value)
}

function onlyFile(files: string[], command: string): string | null {
  if (files.length > 1) throw new InputError(`${command} takes one file, and ${files.length} were given: ${files.join(', ')}.`)
  if (files[0] === '') throw new InputError(`${command} was given an empty file name.`)
  return files[0] ?? null
}

function unknownWord(kind: 'option' | 'command', word: string, known: readonly string[]): InputError {
  return new InputError(`There is no ${kind} "${word}".`, { remedy: didYouMean(word, known, `${kind}s`) })
}

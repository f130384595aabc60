import { describe, expect, test } from 'vitest'
import { InputError } from '../study/input-error.ts'
import { readArguments } from './arguments.ts'

describe('the words after rungwise', () => {
  test.each([
    [[], { do: 'help' }],
    [['--help'], { do: 'help' }],
    [['--version'], { do: 'version' }],
    [['compare', '--help'], { do: 'help' }],
    [['open'], { do: 'open', file: null }],
    [['open', 'a.rungwise'], { do: 'open', file: 'a.rungwise' }],
    [['compare', 'p.yaml'], { do: 'compare', plan: 'p.yaml', project: null, json: null, resampling: null, inspect: null }],
    [
      ['compare', '--json', '-', 'p.yaml'],
      { do: 'compare', plan: 'p.yaml', project: null, json: '-', resampling: null, inspect: null }
    ],
    [
      ['compare', 'p.yaml', '--project=s.rungwise', '--json=r=1.json'],
      { do: 'compare', plan: 'p.yaml', project: 's.rungwise', json: 'r=1.json', resampling: null, inspect: null }
    ],
    [
      ['compare', 'p.yaml', '--resamples', '500', '--seed=7'],
      { do: 'compare', plan: 'p.yaml', project: null, json: null, resampling: { resamples: 500, seed: 7 }, inspect: null }
    ],
    [
      ['compare', 'p.yaml', '--resamples=500'],
      { do: 'compare', plan: 'p.yaml', project: null, json: null, resampling: { resamples: 500, seed: 1 }, inspect: null }
    ],
    [
      ['compare', 'p.yaml', '--inspect', 'Two factors'],
      { do: 'compare', plan: 'p.yaml', project: null, json: null, resampling: null, inspect: 'Two factors' }
    ],
    [
      ['compare', '--', '--odd.yaml'],
      { do: 'compare', plan: '--odd.yaml', project: null, json: null, resampling: null, inspect: null }
    ]
  ])('%j is understood', (words, command) => {
    expect(readArguments(words)).toEqual(command)
  })

  test.each([
    [['compair', 'p.yaml'], 'Did you mean "compare"?'],
    [['--hlep'], 'Did you mean "--help"?'],
    [['compare', 'p.yaml', '--jsno', 'r.json'], 'Did you mean "--json"?'],
    [['compare', 'p.yaml', '--projet=s'], 'Did you mean "--project"?'],
    [['open', '--json', 'r.json'], 'There is no option "--json".'],
    [['compare'], 'compare needs a plan file'],
    [['compare', 'a.yaml', 'b.yaml'], 'takes one file, and 2 were given'],
    [['open', 'a', 'b'], 'takes one file, and 2 were given'],
    [['compare', 'a.yaml', '--json'], '--json needs a file name'],
    [['compare', 'a.yaml', '--inspect'], "--inspect needs a candidate's name"],
    [['compare', 'a.yaml', '--json', '--project', 's'], '--json needs a file name'],
    [['compare', 'a.yaml', '--project', '-'], 'cannot go to standard output'],
    [['compare', 'a.yaml', '--json', 'b', '--json', 'c'], 'given twice'],
    [['compare', ''], 'empty file name'],
    [['compare', 'a.yaml', '--resamples'], '--resamples needs a number'],
    [['compare', 'a.yaml', '--resamples', '0'], '--resamples takes a whole number from 1 to 100000, not "0"'],
    [['compare', 'a.yaml', '--resamples', 'many'], 'not "many"'],
    [['compare', 'a.yaml', '--seed', '3'], '--seed goes with --resamples']
  ])('%j is refused with a way out', (words, message) => {
    expect(() => readArguments(words)).toThrow(InputError)
    expect(() => readArguments(words)).toThrow(message)
  })
})

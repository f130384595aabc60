/**
 * The command line: reads the words typed after `rungwise`, does the command, answers with an exit status.
 *
 * Runs under Node, started by bin/rungwise.cjs. 0 done, 1 a bug, 2 bad input, 130 interrupted.
 */
import { InputError } from '../study/input-error.ts'
import { helpText, readArguments } from './arguments.ts'
import { type CrewMaker, compare } from './compare.ts'
import { programFiles } from './files.ts'
import { open } from './open.ts'
import type { Surroundings } from './surroundings.ts'

const interrupted = 130

/** Runs the process's own command and sets its exit status. The second Ctrl-C ends at once. */
export async function run(words: readonly string[], root: string): Promise<void> {
  const stop = new AbortController()
  for (const signal of ['SIGINT', 'SIGTERM', 'SIGHUP'] as const) {
    process.on(signal, () => {
      if (stop.signal.aborted) process.exit(interrupted)
      stop.abort()
    })
  }
  // A reader that has seen enough (`| head`) closes the pipe; that is no fault.
  process.stdout.on('error', (error: NodeJS.ErrnoException) => process.exit(error.code === 'EPIPE' ? 0 : 1))
  const { stdout, stderr, env } = process
  process.exitCode = await main(words, { root, folder: process.cwd(), environment: env, stdout, stderr, signal: stop.signal })
}

/** Does one command. Bad input and bugs become a message on `stderr` and an exit status; nothing is thrown. */
export async function main(words: readonly string[], around: Surroundings, crewMaker?: CrewMaker): Promise<number> {
  try {
    return await doCommand(words, around, crewMaker)
  } catch (error) {
    return explain(error, around)
  }
}

async function doCommand(words: readonly string[], around: Surroundings, crewMaker: CrewMaker | undefined): Promise<number> {
  const command = readArguments(words)
  switch (command.do) {
    case 'help':
      around.stdout.write(helpText)
      return 0
    case 'version':
      around.stdout.write(`${programFiles(around.root).version}\n`)
      return 0
    case 'compare':
      return await compare(command, around, crewMaker)
    case 'open':
      return await open(command.file, around)
  }
}

function explain(error: unknown, around: Surroundings): number {
  if (around.signal.aborted) {
    around.stderr.write('Stopped.\n')
    return interrupted
  }
  if (error instanceof InputError) {
    around.stderr.write(`${error.message}\n`)
    return 2
  }
  const told = error instanceof Error ? (error.stack ?? error.message) : String(error)
  around.stderr.write(`A fault in rungwise, please report it:\n${told}\n`)
  return 1
}

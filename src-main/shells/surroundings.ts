/** What a command finds around it: streams, folders, environment and the way it is told to stop. Handed in, so that tests can. */
export interface Surroundings {
  /** The program's top folder. */
  root: string
  /** The folder the user works in; relative paths start here. */
  folder: string
  environment: NodeJS.ProcessEnv
  stdout: Output
  stderr: Output
  /** Aborts when the user interrupts. */
  signal: AbortSignal
}

export interface Output {
  write(text: string): unknown
  isTTY?: boolean
  columns?: number
}

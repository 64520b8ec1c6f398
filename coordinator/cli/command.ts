// What a command is: a row of table.ts. And the world it may write to, so that tests can listen.

/** Where a command writes; process-wide things stay out of the commands. */
export interface Output {
  /** --json: exactly one JSON object on standard output, nothing else there. */
  readonly json: boolean
  /** Standard output is a terminal whose lines can be redrawn. */
  readonly isTerminal: boolean
  readonly columns: number
  /** The terminal shows characters beyond ASCII. */
  readonly unicode: boolean
  /** A line, or several, to standard output. */
  readonly print: (text: string) => void
  /** A line, or several, to standard error: warnings, phases. */
  readonly note: (text: string) => void
  /** Bytes to standard output as they are, for redrawing. */
  readonly raw: (text: string) => void
  /** Aborted on SIGINT, SIGTERM and SIGUSR1. */
  readonly signal: AbortSignal
}

export interface ArgumentRow {
  readonly name: string
  readonly help: string
}
export interface OptionRow {
  /** '--cores' */
  readonly flag: string
  /** 'N', 'DIR'; absent for a switch. */
  readonly value?: string
  readonly kind: 'switch' | 'text' | 'count'
  readonly help: string
}

export interface CommandInput {
  readonly arguments: { readonly [name: string]: string }
  readonly switches: { readonly [flag: string]: boolean }
  readonly texts: { readonly [flag: string]: string | undefined }
  readonly counts: { readonly [flag: string]: number | undefined }
  readonly output: Output
}

export interface Command {
  readonly name: string
  readonly summary: string
  readonly arguments: readonly ArgumentRow[]
  readonly options: readonly OptionRow[]
  readonly examples: readonly string[]
  /** Exit code (exitCodes of shared/refusals.ts). Refusals are thrown. */
  readonly run: (input: CommandInput) => Promise<number>
}

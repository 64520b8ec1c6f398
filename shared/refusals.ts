// What the world may do wrong: bad files, full disks, faulty plug-ins. One row of `refusals` a case, with the
// exit code of the process it ends and the plain sentence people read. Our own mistakes are check.ts; the two
// are never mixed.
//
// Exit codes are those of sysexits.h (4.3BSD, 1993), so that schedulers can tell "try again" from "mend first".

/** Exit codes of every command, in one place. */
export const exitCodes = {
  done: 0,
  usage: 64,
  badData: 65,
  unreachable: 69,
  brokenPromise: 70,
  inputOutput: 74,
  interrupted: 75,
  protocol: 76,
  notPermitted: 77,
  configuration: 78,
} as const

interface RefusalRow {
  readonly exitCode: number
  /** What happened, for a person, without full stop: the detail follows after a colon. */
  readonly text: string
  /** What to do next, unless the thrower knows better. */
  readonly cure: string
}

const {
  usage,
  badData,
  unreachable,
  brokenPromise,
  inputOutput,
  interrupted,
  protocol,
  notPermitted,
  configuration,
} = exitCodes

/** The table of coded refusals. Codes are part of the interface: a row may be added, never renamed. */
export const refusals = {
  // Command line
  usage: {
    exitCode: usage,
    text: 'The command was not understood',
    cure: 'Run it with --help to see what it takes.',
  },

  // Search file
  'file-not-found': {
    exitCode: configuration,
    text: 'The file was not found',
    cure: 'Check the path; `skerry new DIR` writes a search file that runs at once.',
  },
  'file-unreadable': {
    exitCode: configuration,
    text: 'The file could not be read',
    cure: 'Check that it is a file and that you may read it.',
  },
  'file-too-large': {
    exitCode: configuration,
    text: 'The file is larger than a search file may be',
    cure: 'Check that this is the search file; data belong beside it, not in it.',
  },
  'not-yaml': {
    exitCode: configuration,
    text: 'The search file is not valid YAML',
    cure: 'Mend the line named above; often it is the indentation, a missing space after a colon or a quote.',
  },
  'alias-refused': {
    exitCode: configuration,
    text: 'YAML anchors and aliases are not taken in search files',
    cure: 'Write the value out where the alias stands.',
  },
  'duplicate-key': {
    exitCode: configuration,
    text: 'The same field is given twice',
    cure: 'Keep one of the two lines.',
  },
  'unknown-field': {
    exitCode: configuration,
    text: 'There is no such field',
    cure: 'Correct the name or remove the line.',
  },
  'missing-field': { exitCode: configuration, text: 'A field is missing', cure: 'Add the field.' },
  'wrong-type': {
    exitCode: configuration,
    text: 'The value is of the wrong type',
    cure: 'Write a value of the expected type.',
  },
  'impossible-value': {
    exitCode: configuration,
    text: 'The value cannot be used',
    cure: 'Choose a value in the range that is named above.',
  },
  'changed-search-file': {
    exitCode: configuration,
    text: 'The search file is not the one that this record was started with',
    cure: 'Undo the edit, start a new record, or accept the listed changes with --accept-changes.',
  },

  // Problem (plug-in)
  'problem-not-found': {
    exitCode: configuration,
    text: 'The problem was not found',
    cure: 'Check the path after `problem:`; it is relative to the search file.',
  },
  'problem-does-not-bundle': {
    exitCode: configuration,
    text: 'The problem could not be bundled into one module',
    cure: 'Mend the error named above; the imports of the problem must be installed beside it.',
  },
  'problem-throws': {
    exitCode: configuration,
    text: 'The problem threw an error',
    cure: 'Mend the problem; `skerry check FILE` repeats what was run here.',
  },
  'not-a-problem': {
    exitCode: configuration,
    text: 'The plug-in does not describe a problem',
    cure: 'Export the result of defineProblem({...}) as the default export.',
  },
  'wrong-results': {
    exitCode: configuration,
    text: 'The problem returned results of the wrong shape',
    cure: 'Return one outcome for each situation, with every declared objective and measure as a finite number.',
  },
  'not-deterministic': {
    exitCode: configuration,
    text: 'The problem gave another result the second time',
    cure: 'Remove clocks, random numbers that are not drawn from the condition, and state kept between calls.',
  },
  'cannot-be-made': {
    exitCode: configuration,
    text: 'No machine of this problem can be made',
    cure: 'Widen the process that the problem declares, or let its repair leave only what can be made.',
  },
  'plug-in-differs': {
    exitCode: configuration,
    text: 'The problem differs from the copy pinned in the record',
    cure: 'The pinned copy goes on being used; start a new record to use the edited problem.',
  },

  // Record
  'record-missing': {
    exitCode: configuration,
    text: 'There is no record here',
    cure: 'Check the folder; `skerry run FILE` makes a record.',
  },
  'record-in-use': {
    exitCode: notPermitted,
    text: 'Another coordinator holds this record',
    cure: 'Wait for it to end, or stop the process named above.',
  },
  'record-of-another-search': {
    exitCode: configuration,
    text: 'The record belongs to another search',
    cure: 'Name another folder with --record, or use the search file of this record.',
  },
  'record-corrupted': {
    exitCode: badData,
    text: 'The record is damaged',
    cure: 'Keep the folder as it is and restore it from a backup; without one, begin the search anew in another folder: the same file and seed give the same search.',
  },
  'record-newer': {
    exitCode: protocol,
    text: 'The record was written by a newer version',
    cure: 'Use that version or a later one; nothing was changed.',
  },
  'record-fenced': {
    exitCode: notPermitted,
    text: 'Another coordinator has taken over this record',
    cure: 'Nothing was written after the takeover; look at the coordinator that holds the record now.',
  },
  'network-file-system': {
    exitCode: configuration,
    text: 'A record cannot lie on a network file system',
    cure: 'Name a folder on a local disk with --record; copy the finished record where you like.',
  },
  'sqlite-unsafe': {
    exitCode: configuration,
    text: 'This version of SQLite can damage a record',
    cure: 'Install the packages again with `npm ci`, which brings the version that was tested.',
  },
  'record-differs': {
    exitCode: badData,
    text: 'Recomputing the search gave another digest than the record holds',
    cure: 'Keep the record; the first entry that differs is named above.',
  },
  'bytes-malformed': {
    exitCode: badData,
    text: 'Stored or sent bytes cannot be read',
    cure: 'The file or message is damaged or of another kind; restore it or let it be made again.',
  },
  'results-disagree': {
    exitCode: badData,
    text: 'The same simulation gave two different results',
    cure: 'Check the machine named above (memory, overclocking) and whether the problem is deterministic.',
  },

  // Disk
  'disk-full': {
    exitCode: inputOutput,
    text: 'The disk is full',
    cure: 'Make room and run the same command again; nothing acknowledged is lost.',
  },
  'disk-read-only': {
    exitCode: inputOutput,
    text: 'The disk cannot be written',
    cure: 'Make the folder writable and run the same command again; nothing acknowledged is lost.',
  },
  'disk-error': {
    exitCode: inputOutput,
    text: 'The disk reported an error',
    cure: 'Check the disk, then run the same command again; nothing acknowledged is lost.',
  },

  // Cluster
  'queue-unreachable': {
    exitCode: unreachable,
    text: 'Redis cannot be reached',
    cure: 'Check host and port, and that Redis runs there; the same command goes on when it does.',
  },
  'queue-access': {
    exitCode: notPermitted,
    text: 'Redis does not let us in',
    cure: 'Check user and password (SKERRY_REDIS or --redis) and what its access rules allow.',
  },
  'queue-unfit': {
    exitCode: configuration,
    text: 'This Redis cannot carry a search safely',
    cure: 'Mend the setting named above; `skerry preflight --redis URL` checks all of them.',
  },
  'queue-full': {
    exitCode: unreachable,
    text: 'The memory of Redis is full',
    cure: 'Give it more memory (maxmemory) or free some; the search goes on when there is room, nothing is lost.',
  },
  'queue-tls': {
    exitCode: configuration,
    text: 'Redis cannot be reached safely',
    cure: 'Mend the address (--redis or SKERRY_REDIS): rediss:// for a Redis with TLS, redis:// without.',
  },
  'protocol-mismatch': {
    exitCode: protocol,
    text: 'Coordinator and worker speak different versions',
    cure: 'Install the same version of Skerry on both sides.',
  },
  'search-name-taken': {
    exitCode: configuration,
    text: 'Another search of this name runs on this Redis',
    cure: 'Give one of them another name in its search file, or use another Redis.',
  },
  'plugin-untrusted': {
    exitCode: notPermitted,
    text: 'The problem of this search is not signed with the key of this site',
    cure: 'Give coordinator and workers the same key file with --key.',
  },
  'key-unfit': {
    exitCode: configuration,
    text: 'The key file cannot be used',
    cure: 'Make one, once for the whole site: (umask 077; openssl rand -hex 32 > FILE)',
  },
  'takes-no-work': {
    exitCode: unreachable,
    text: 'Work is waiting, cores are free, and this worker gets none',
    cure: 'Start it again; the supervisor does that by itself when it restarts on exit code 69.',
  },
  'too-large-to-send': {
    exitCode: configuration,
    text: 'An evaluation is too large for the queue',
    cure: 'Make the genome smaller, or read large data from a file beside the problem.',
  },
  'rendezvous-missing': {
    exitCode: unreachable,
    text: 'No coordinator has said where it is',
    cure: 'Start `skerry run FILE --record DIR --own-redis`; workers that wait find it.',
  },

  // Simulating
  'no-workers': {
    exitCode: unreachable,
    text: 'No worker could be started',
    cure: 'Read the reason named above; `skerry check FILE` tries one simulation by itself.',
  },
  'machine-too-small': {
    exitCode: configuration,
    text: 'This machine has no room for one simulation of this problem',
    cure: 'Use a larger machine, or --redis with workers on machines that are large enough.',
  },
  interrupted: {
    exitCode: interrupted,
    text: 'Stopped before the end',
    cure: 'Run the same command again to continue from here.',
  },
  internal: {
    exitCode: brokenPromise,
    text: 'Skerry broke a promise to itself',
    cure: 'This is a defect of Skerry: please report it with the lines above. The record is safe to continue from.',
  },
} as const satisfies { readonly [code: string]: RefusalRow }

export type RefusalCode = keyof typeof refusals

/** Where the trouble is, as far as it is known. Line and column count from 1. */
export interface Where {
  readonly file?: string
  readonly line?: number
  readonly column?: number
  /** Path of a field, e.g. 'islands[0].population'. */
  readonly field?: string
}

export interface RefusalDetail {
  /** What was found and what was expected, in one or two sentences. */
  readonly detail: string
  readonly where?: Where
  /** What to do next; the row's own cure when absent. */
  readonly cure?: string
  readonly cause?: unknown
}

/** Something the world did that ends what was asked for. Made by refuse(); carries everything a person needs. */
export class Refusal extends Error {
  override readonly name = 'Refusal'
  readonly code: RefusalCode
  readonly exitCode: number
  readonly detail: string
  readonly where: Where | undefined
  readonly cure: string

  constructor(code: RefusalCode, { detail, where, cure, cause }: RefusalDetail) {
    const row: RefusalRow = refusals[code]
    super(`${row.text}: ${detail}`, cause === undefined ? undefined : { cause })
    this.code = code
    this.exitCode = row.exitCode
    this.detail = detail
    this.where = where
    this.cure = cure ?? row.cure
  }
}

/** The refusal to throw (or to hand on as a value). */
export function refuse(code: RefusalCode, detail: RefusalDetail): Refusal {
  return new Refusal(code, detail)
}

/**
 * Text made safe for terminals, logs and pages: control characters (also the escape that starts a terminal
 * command) and the invisible characters that turn the direction of text become a space each.
 */
export function plainText(text: string): string {
  return text.replace(/[\p{Cc}\p{Zl}\p{Zp}\u061c\u200e\u200f\u202a-\u202e\u2066-\u2069]/gu, ' ')
}

/** 'search.yaml, line 3, column 5, field islands[0].population', or '' when nothing is known. */
export function renderWhere(where: Where | undefined): string {
  if (!where) return ''
  const parts: string[] = []
  if (where.file !== undefined) parts.push(where.file)
  if (where.line !== undefined) parts.push(`line ${where.line}`)
  if (where.column !== undefined) parts.push(`column ${where.column}`)
  if (where.field !== undefined) parts.push(`field ${where.field}`)
  return plainText(parts.join(', '))
}

/**
 * A few short lines for a person: what happened, where, what to do next, and the code to search for. Further
 * lines of the message are indented deeper than the labels, so that no text from outside looks like one.
 */
export function renderRefusal(refusal: Refusal): string {
  const lines = refusal.message.split('\n').map((line, i) => (i === 0 ? '' : '    ') + plainText(line))
  const where = renderWhere(refusal.where)
  if (where) lines.push(`  where: ${where}`)
  lines.push(
    ...refusal.cure.split('\n').map((line, i) => `  ${i === 0 ? 'next:  ' : '       '}${plainText(line)}`),
  )
  lines.push(`  code:  ${refusal.code}`)
  return lines.join('\n')
}

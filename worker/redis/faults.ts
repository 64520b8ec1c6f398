// What Redis and the network answer when something is wrong, as refusals for people. One table: the first row that
// fits counts.

import { Refusal, type RefusalCode, refuse } from '../../shared/refusals.js'

interface FaultRow {
  readonly like: RegExp
  readonly code: RefusalCode
  readonly says: string
  readonly cure?: string
  /** Trying again cannot help: the connection is given up. */
  readonly final?: true
  /** True of many faults: another one that is known as well says more. */
  readonly vague?: true
}

const ownWords =
  'Mend the address (--redis or SKERRY_REDIS): rediss:// for a Redis with TLS, redis:// without.'

/** Error replies of Redis begin with a word in capitals; network errors of Node carry a code. */
const faultRows: readonly FaultRow[] = [
  {
    like: /WRONGPASS|invalid username-password/i,
    code: 'queue-access',
    says: 'user or password is wrong',
    final: true,
  },
  {
    like: /NOAUTH|HELLO must be called with the client already authenticated/i,
    code: 'queue-access',
    says: 'it asks for a password and none was given',
    final: true,
  },
  {
    like: /AUTH.*without any password configured/i,
    code: 'queue-access',
    says: 'a password was given, but this Redis has none set',
    final: true,
  },
  { like: /NOPERM/i, code: 'queue-access', says: 'its access rules forbid this user what a search needs' },
  {
    like: /max number of clients/i,
    code: 'queue-unreachable',
    says: 'it has as many clients as it takes (maxclients)',
    cure: 'Raise maxclients in its configuration, or run fewer workers on it.',
  },
  {
    like: /DENIED Redis is running in protected mode/i,
    code: 'queue-access',
    says: 'it runs in protected mode and takes connections of its own machine only',
    cure: 'Set a password (ACL users or requirepass) in its configuration.',
    final: true,
  },
  { like: /OOM command not allowed/i, code: 'queue-full', says: 'its memory is used up (maxmemory)' },
  {
    like: /READONLY/i,
    code: 'queue-unreachable',
    says: 'this is a replica now, which takes no writes',
    cure: 'Wait for the primary to come back, or name the primary in --redis.',
  },
  {
    like: /MISCONF/i,
    code: 'queue-unreachable',
    says: 'it cannot save its data to disk and takes no writes',
    cure: 'Make room on its disk, or switch saving off (save "").',
  },
  { like: /LOADING/i, code: 'queue-unreachable', says: 'it is still loading its data' },
  {
    like: /ENOTFOUND|EAI_AGAIN|EAI_NONAME/,
    code: 'queue-unreachable',
    says: 'there is no host of this name',
    cure: 'Check the name of the host in --redis, and that this machine can resolve it.',
  },
  {
    like: /max retries per request|ECONNRESET|EPIPE|Connection is closed|isn't writeable/i,
    code: 'queue-unreachable',
    says: 'the connection was lost',
    vague: true,
  },
  { like: /ECONNREFUSED/, code: 'queue-unreachable', says: 'nothing listens there' },
  {
    like: /EHOSTUNREACH|ENETUNREACH|EADDRNOTAVAIL/,
    code: 'queue-unreachable',
    says: 'there is no way to that machine',
  },
  {
    like: /wrong version number|EPROTO|ssl3_|SSL routines|packet length too long/i,
    code: 'queue-tls',
    says: 'the address says TLS (rediss://) and the other side does not speak it',
    cure: ownWords,
    final: true,
  },
  {
    like: /Protocol error, got|Unknown RESP type/i,
    code: 'queue-tls',
    says: 'what answers there does not speak as Redis does',
    cure: ownWords,
    final: true,
  },
  {
    like: /self.signed|unable to (get|verify)|DEPTH_ZERO|UNABLE_TO_|CERT_|certificate|altnames/i,
    code: 'queue-tls',
    says: 'its certificate is not trusted here',
    cure: 'Name the file of certificates of your site in SKERRY_REDIS_CA, and address Redis by the name in its certificate.',
    final: true,
  },
]

/** The refusal for an error of the network, of Redis or of the client library. `where`: the address as people may see it. */
export function asRefusal(fault: unknown, where: string): Refusal {
  if (fault instanceof Refusal) return fault
  const words = wordsOf(fault)
  const row = faultRows.find(({ like }) => like.test(words))
  if (!row) return refuse('queue-unreachable', { detail: `${where}: ${firstLine(words)}`, cause: fault })
  return refuse(row.code, {
    detail: `${where}: ${row.says}`,
    ...(row.cure === undefined ? {} : { cure: row.cure }),
    cause: fault,
  })
}

/** True when trying again cannot help. */
export function isFinal(fault: unknown): boolean {
  const words = wordsOf(fault)
  return faultRows.find(({ like }) => like.test(words))?.final ?? false
}

/** True when the fault says by itself what is wrong. */
export function isPlain(fault: unknown): boolean {
  const words = wordsOf(fault)
  return faultRows.some(({ like, vague }) => !vague && like.test(words))
}

function wordsOf(fault: unknown): string {
  if (!(fault instanceof Error)) return String(fault)
  const { code } = fault as { readonly code?: unknown }
  const more = fault instanceof AggregateError ? fault.errors.map(wordsOf).join(' ') : ''
  return [typeof code === 'string' ? code : '', fault.message, more].join(' ').trim()
}

function firstLine(words: string): string {
  return words.split('\n')[0]!.slice(0, 200) || 'no answer'
}

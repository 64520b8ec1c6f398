// Whether a Redis is fit to carry a search: new enough, never forgetting by itself, and closed to strangers. Each
// refusal says what was found and how to mend it.

import { refuse } from '../../shared/refusals.js'
import { isLoopback, type RedisAddress } from './address.js'
import type { Link } from './link.js'

/** Streams that forget acknowledged entries for good, ACL users and LPOS came by then (Redis release notes). */
const oldest = [6, 2] as const

export interface ServerFacts {
  readonly version: string
  /** Undefined where access rules hide it. */
  readonly policy: string | undefined
  readonly role: string
}

export async function readServer(link: Link): Promise<ServerFacts> {
  const info = await link.run((client) => client.info())
  const [policy] = await link.run((client) =>
    client.config('GET', 'maxmemory-policy').then(
      (pair) => [(pair as string[])[1]],
      (fault: Error) => {
        if (/NOPERM|unknown command|not allowed/i.test(fault.message)) return [undefined]
        throw fault
      },
    ),
  )
  return {
    version: field(info, 'redis_version') ?? '0',
    policy: policy ?? field(info, 'maxmemory_policy'),
    role: field(info, 'role') ?? 'master',
  }
}

/** @throws Refusal 'queue-unfit' with the setting that is wrong and how to mend it. */
export async function checkServer(
  link: Link,
  { address, unprotected }: { readonly address: RedisAddress; readonly unprotected: boolean },
): Promise<ServerFacts> {
  const facts = await readServer(link)
  const unfit = (found: string, cure: string) =>
    refuse('queue-unfit', { detail: `${link.shown}: ${found}`, cure })
  if (!isNewEnough(facts.version))
    throw unfit(
      `it is version ${facts.version}; at least ${oldest.join('.')} is needed`,
      'Install a newer Redis.',
    )
  if (facts.policy !== undefined && facts.policy !== 'noeviction') {
    throw unfit(
      `its maxmemory-policy is ${facts.policy}, which lets it forget work when memory runs short`,
      'Set it: redis-cli CONFIG SET maxmemory-policy noeviction; and in its configuration file.',
    )
  }
  if (facts.role !== 'master')
    throw unfit('it is a replica, which takes no writes', 'Name the primary in the address.')
  if (!unprotected && !isLoopback(address) && address.password === undefined) {
    throw unfit(
      'other machines reach it, and it asks for no password: whoever finds it can read and change the search',
      'Set a password (worker/deploy/redis/users.acl shows users with few rights) and put it into SKERRY_REDIS; on a network that you trust, --redis-unprotected takes it as it is.',
    )
  }
  return facts
}

export function isNewEnough(version: string): boolean {
  const [major = 0, minor = 0] = version.split('.').map(Number)
  return major > oldest[0] || (major === oldest[0] && minor >= oldest[1])
}

function field(info: string, name: string): string | undefined {
  return new RegExp(`^${name}:(.*?)\\r?$`, 'm').exec(info)?.[1]
}

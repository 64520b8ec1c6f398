// Licences that a whole site shares: <prefix>:tokens:<name> is a hash from the receipt of whoever holds some to how
// many and until when, by Redis's own clock. Counted and taken in one script, so that no two agents take the last one.

import { randomBytes } from 'node:crypto'
import { tokensKey } from '../../shared/cluster/keys.js'
import type { Link } from './link.js'

/** KEYS: one hash a token. ARGV: receipt, lifetime in ms, then count and limit of each token. 1 when all were there. */
const takeScript = `
local time = redis.call('TIME')
local now = time[1] * 1000 + math.floor(time[2] / 1000)
for i, key in ipairs(KEYS) do
  local used = 0
  local entries = redis.call('HGETALL', key)
  for j = 1, #entries, 2 do
    local count, untilMs = string.match(entries[j + 1], '^(%d+) (%d+)$')
    if untilMs == nil or tonumber(untilMs) < now then redis.call('HDEL', key, entries[j])
    else used = used + tonumber(count) end
  end
  if used + tonumber(ARGV[1 + 2 * i]) > tonumber(ARGV[2 + 2 * i]) then return 0 end
end
for i, key in ipairs(KEYS) do
  redis.call('HSET', key, ARGV[1], ARGV[1 + 2 * i] .. ' ' .. string.format('%.0f', now + tonumber(ARGV[2])))
end
return 1`

/** KEYS: the hashes. ARGV: receipt, lifetime. 1 when all are still held. */
const renewScript = `
local time = redis.call('TIME')
local now = time[1] * 1000 + math.floor(time[2] / 1000)
for _, key in ipairs(KEYS) do
  local entry = redis.call('HGET', key, ARGV[1])
  if not entry then return 0 end
end
for _, key in ipairs(KEYS) do
  local count = string.match(redis.call('HGET', key, ARGV[1]), '^(%d+) ')
  redis.call('HSET', key, ARGV[1], count .. ' ' .. string.format('%.0f', now + tonumber(ARGV[2])))
end
return 1`

const returnScript = `for _, key in ipairs(KEYS) do redis.call('HDEL', key, ARGV[1]) end return 1`

export class Tokens {
  readonly #link: Link
  readonly #prefix: string
  readonly #lifeMs: number
  /** Names of the tokens by receipt. */
  readonly #held = new Map<string, readonly string[]>()

  constructor(link: Link, prefix: string, lifeMs: number) {
    this.#link = link
    this.#prefix = prefix
    this.#lifeMs = lifeMs
  }

  /** So many of each, all or none; undefined when there are not enough. A token without a limit has none to give. */
  async take(
    tokens: Readonly<Record<string, number>>,
    limits: Readonly<Record<string, number>>,
  ): Promise<string | undefined> {
    const names = Object.keys(tokens)
    const receipt = randomBytes(12).toString('hex')
    const counts = names.flatMap((name) => [tokens[name]!, limits[name] ?? 0])
    if (names.length > 0 && (await this.#eval(takeScript, names, [receipt, this.#lifeMs, ...counts])) !== 1)
      return undefined
    this.#held.set(receipt, names)
    return receipt
  }

  /** False when they are not ours any more: the time between two renewals was too long. */
  async renew(receipt: string): Promise<boolean> {
    const names = this.#held.get(receipt)
    if (names === undefined) return false
    return names.length === 0 || (await this.#eval(renewScript, names, [receipt, this.#lifeMs])) === 1
  }

  async giveBack(receipt: string): Promise<void> {
    const names = this.#held.get(receipt)
    this.#held.delete(receipt)
    if (names && names.length > 0) await this.#eval(returnScript, names, [receipt])
  }

  #eval(script: string, names: readonly string[], values: readonly (string | number)[]): Promise<unknown> {
    const keys = names.map((name) => tokensKey(this.#prefix, name))
    return this.#link.run((client) => client.eval(script, keys.length, ...keys, ...values))
  }
}

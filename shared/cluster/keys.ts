// Names in Redis. Everything of ours lies under one prefix, everything of one search under its own, so that access
// rules can be written by prefix (worker/deploy has them).
//
//   <prefix>:searches                 hash   name of a search -> Announcement (JSON)
//   <prefix>:agents                   hash   agent -> Heartbeat (JSON)
//   <prefix>:tokens:<name>            hash   licence tokens in use across the site
//   <prefix>:s:<search>:instance      text   which filling of this Redis it is; another value: it was emptied
//   <prefix>:s:<search>:plugin        bytes  the pinned bundle
//   <prefix>:s:<search>:results       stream results, read through the group `coordinator`
//   <prefix>:s:<search>:work:*        BullMQ's own keys of the queue that any agent takes from
//   <prefix>:s:<search>:to-<agent>:*  BullMQ's own keys of the queue of one agent

import { check } from '../check.js'

export const defaultPrefix = 'skerry'
export const resultsGroup = 'coordinator'
export const openQueue = 'work'

/** Name of the queue that only this agent takes from. */
export function queueOf(agent: string): string {
  return `to-${agent}`
}

export interface SearchKeys {
  /** Prefix handed to BullMQ for the queues of this search. */
  readonly queues: string
  readonly instance: string
  readonly plugin: string
  readonly results: string
}

export function searchKeys(prefix: string, search: string): SearchKeys {
  check(isKeyName(search), 'a search has a name that can be part of a key')
  const own = `${prefix}:s:${search}`
  return { queues: own, instance: `${own}:instance`, plugin: `${own}:plugin`, results: `${own}:results` }
}

export const searchesKey = (prefix: string): string => `${prefix}:searches`
export const agentsKey = (prefix: string): string => `${prefix}:agents`
export const tokensKey = (prefix: string, token: string): string => `${prefix}:tokens:${token}`

/** Letters, digits, '-', '_' and '.': what a name may consist of to stand in a key. */
export function isKeyName(text: string): boolean {
  return /^[\p{L}\p{N}._-]{1,128}$/u.test(text)
}

/** A host name or other text as part of a key: everything else becomes '-'. */
export function keyName(text: string): string {
  return text.replace(/[^\p{L}\p{N}._-]/gu, '-').slice(0, 64) || 'unnamed'
}

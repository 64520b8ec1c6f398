import { expect, test } from 'vitest'
import { type AgentState, agentStates } from '../../shared/cluster/messages.js'
import { AgentCondition, type Conditions } from './states.js'

type Step = readonly [news: Partial<Conditions>, state: AgentState]
const open = { opened: true, connected: true }

/** Every way from one state to another, each with how an agent gets to the first. */
const transitions: { readonly [name: string]: readonly Step[] } = {
  'starting to idle: Redis answered': [[open, 'idle']],
  'starting to leaving: told to end before Redis answered': [[{ leaving: true }, 'leaving']],
  'idle to working: a simulation began': [
    [open, 'idle'],
    [{ busy: true }, 'working'],
  ],
  'working to idle: nothing left': [
    [{ ...open, busy: true }, 'working'],
    [{ busy: false }, 'idle'],
  ],
  'idle to cut-off and back': [
    [open, 'idle'],
    [{ connected: false }, 'cut-off'],
    [{ connected: true }, 'idle'],
  ],
  'working to cut-off and back to work': [
    [{ ...open, busy: true }, 'working'],
    [{ connected: false }, 'cut-off'],
    [{ connected: true }, 'working'],
  ],
  'cut-off to idle: what it had ran dry meanwhile': [
    [{ ...open, busy: true }, 'working'],
    [{ connected: false }, 'cut-off'],
    [{ busy: false }, 'cut-off'],
    [{ connected: true }, 'idle'],
  ],
  'idle to draining and back': [
    [open, 'idle'],
    [{ draining: true }, 'draining'],
    [{ draining: false }, 'idle'],
  ],
  'working to draining, and back to work': [
    [{ ...open, busy: true }, 'working'],
    [{ draining: true }, 'draining'],
    [{ draining: false }, 'working'],
  ],
  'draining to cut-off and back to draining': [
    [{ ...open, draining: true }, 'draining'],
    [{ connected: false }, 'cut-off'],
    [{ connected: true }, 'draining'],
  ],
  'idle to leaving': [
    [open, 'idle'],
    [{ leaving: true }, 'leaving'],
  ],
  'working to leaving': [
    [{ ...open, busy: true }, 'working'],
    [{ leaving: true }, 'leaving'],
  ],
  'draining to leaving': [
    [{ ...open, draining: true }, 'draining'],
    [{ leaving: true }, 'leaving'],
  ],
  'cut-off to leaving': [
    [open, 'idle'],
    [{ connected: false }, 'cut-off'],
    [{ leaving: true }, 'leaving'],
  ],
  'leaving stays, whatever happens': [
    [{ ...open, leaving: true }, 'leaving'],
    [{ connected: false, busy: true, draining: true }, 'leaving'],
    [open, 'leaving'],
  ],
}

test.each(Object.entries(transitions))('%s', (_, steps) => {
  const agent = new AgentCondition(
    () => 0,
    () => undefined,
  )
  for (const [news, state] of steps) {
    agent.note(news)
    expect(agent.state).toBe(state)
  }
})

test('every state is reached, and every pair of states that can follow one another is tried', () => {
  const pairs = new Set<string>()
  for (const steps of Object.values(transitions)) {
    const agent = new AgentCondition(
      () => 0,
      (state, before) => pairs.add(`${before}>${state}`),
    )
    for (const [news] of steps) agent.note(news)
  }
  const live = Object.keys(agentStates).filter((state) => state !== 'starting' && state !== 'leaving')
  const missing = live.filter((state) => !pairs.has(`${state}>leaving`))
  expect(missing).toEqual([])
  for (const pair of ['starting>idle', 'idle>cut-off', 'cut-off>working', 'cut-off>draining'])
    expect(pairs).toContain(pair)
})

test('the seconds count from the last change of state, not of a condition', () => {
  let nowMs = 0
  const agent = new AgentCondition(
    () => nowMs,
    () => undefined,
  )
  agent.note(open)
  nowMs = 3000
  agent.note({ connected: true })
  expect(agent.seconds).toBe(3)
  agent.note({ busy: true })
  expect(agent.seconds).toBe(0)
})

test('leaving and starting cannot be taken back', () => {
  const agent = new AgentCondition(
    () => 0,
    () => undefined,
  )
  agent.note({ ...open, leaving: true })
  expect(() => agent.note({ leaving: false })).toThrow('does not come back')
  expect(() => agent.note({ opened: false })).toThrow('starts once')
})

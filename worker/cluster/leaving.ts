// How an agent leaves: nothing more is taken or begun; what is short may end; finished answers go out; jobs that nobody
// has touched go back whole, the rest of the others as losses nobody is blamed for; then the processes are ended and
// the connection is closed. Each step has its share of the time, whether the server answers or not.

import { exitCodes } from '../../shared/refusals.js'
import type { Agent, AgentEnd, Ending } from './agent.js'
import { pause } from './server.js'

/** Part of the time for handing back in which short simulations may still end. */
const drainPart = 0.15
const lookMs = 20

export async function leave(agent: Agent, { sentence, exitCode }: Ending): Promise<AgentEnd> {
  const { nowMs, times } = agent.options
  const startMs = nowMs()
  const leftMs = (ms: number) => Math.max(0, startMs + ms - nowMs())
  const inTime = (work: Promise<unknown>, ms: number) => Promise.race([work, pause(leftMs(ms))])

  agent.condition.note({ leaving: true })
  void agent.sayAlive()
  await inTime(agent.feeder.stop(), drainPart * times.handBackMs)
  await drained(agent, () => leftMs(drainPart * times.handBackMs))
  const unfinished = await giveUp(agent, (work) => inTime(work, 0.9 * times.handBackMs))
  const { agent: name } = agent.options
  const goodbye = [agent.licences.returnAll(), agent.server.ask((queue) => queue.leave(name))]
  await inTime(Promise.all(goodbye), times.handBackMs)
  const closing = [...agent.hands.lanes.keys()].map((lane) => lane.close())
  await inTime(Promise.all(closing), (times.handBackMs + times.leaveMs) / 2)
  for (const box of agent.hands.lanes.values()) box.close()
  await agent.server.close()
  const rest = unfinished > 0 ? ` ${unfinished} evaluations went back unfinished.` : ''
  return {
    sentence: `${sentence}${rest}`,
    exitCode: exitCode ?? (unfinished > 0 ? exitCodes.interrupted : exitCodes.done),
  }
}

/** Short simulations may end. */
async function drained(agent: Agent, leftMs: () => number): Promise<void> {
  while (leftMs() > 0 && [...agent.hands.lanes.keys()].some((lane) => lane.isBusy && lane.isFast))
    await pause(Math.min(lookMs, leftMs()))
}

/** Hands everything back that is not answered; how many evaluations that were. */
async function giveUp(agent: Agent, inTime: (work: Promise<unknown>) => Promise<unknown>): Promise<number> {
  let unfinished = 0
  const work: Promise<unknown>[] = []
  for (const [lane, box] of agent.hands.lanes) {
    const given = agent.hands.giveUp(lane, 'for-others')
    unfinished += given.unfinished
    work.push(
      given.told,
      box.flush().then(() => agent.hands.finished()),
    )
  }
  await inTime(Promise.all(work))
  // Answers that the server does not have are as good as never simulated.
  for (const box of agent.hands.lanes.values()) unfinished += box.answers
  return unfinished
}

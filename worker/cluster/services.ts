// The searches that are announced, and what this agent makes of each: it serves it through a lane, or it does not, for
// a reason that a person can read.
//
//   announced ──▶ refused: another version, not signed, too large for this machine, shut out, cannot be loaded
//       └──▶ served ──(another record or problem under the same name)──▶ served anew
//                └──(no new beat for a while)──▶ over

import { type Announcement, protocolVersion } from '../../shared/cluster/messages.js'
import { exitCodes, Refusal, refuse } from '../../shared/refusals.js'
import type { SearchLane } from './lane.js'
import type { Room } from './room.js'

export interface Service {
  announcement: Announcement
  lane: SearchLane | undefined
  /** Being fetched and checked. */
  preparing: boolean
  refused: Refused | undefined
  /** When its beat was last seen to move, and when it was last in the list. */
  beatMs: number
  /** Its coordinator has been quiet for long. */
  silent: boolean
  listedMs: number
}

export interface Refused {
  readonly sentence: string
  /** With which this process ends when nothing else is to be done; undefined: no reason to end. */
  readonly exitCode: number | undefined
  /** Tried again after that time. */
  readonly untilMs: number
}

export type Dismissal = 'replaced' | 'over' | 'silent' | 'shut-out'

export interface ServicesOptions {
  readonly agent: string
  readonly host: string
  readonly room: Room
  readonly nowMs: () => number
  readonly silentMs: number
  /** Fetches and checks its problem and makes a lane; undefined when the queue does not have it yet. */
  readonly prepare: (announcement: Announcement) => Promise<SearchLane | undefined>
  /** The lane serves no more: 'replaced' and 'over' lanes end at once, 'silent' ones finish what runs. */
  readonly dismiss: (lane: SearchLane, why: Dismissal) => void
  readonly changed: (service: Service) => void
  readonly say: (sentence: string) => void
}

const retryMs = 600_000

export class Services {
  readonly bySearch = new Map<string, Service>()
  private readonly options: ServicesOptions
  private refusedSinceMs: number | undefined

  constructor(options: ServicesOptions) {
    this.options = options
  }

  /** Lanes that are served now. */
  lanes(): SearchLane[] {
    return [...this.bySearch.values()].flatMap(({ lane, refused }) =>
      lane === undefined || refused !== undefined ? [] : [lane],
    )
  }

  of(lane: SearchLane): Service | undefined {
    const service = this.bySearch.get(lane.search)
    return service?.lane === lane ? service : undefined
  }

  isDraining({ announcement: { draining } }: Service): boolean {
    return draining.includes(this.options.agent) || draining.includes(this.options.host)
  }

  /** What stands in Redis now. */
  update(announcements: readonly Announcement[]): void {
    const nowMs = this.options.nowMs()
    for (const announcement of announcements) this.see(announcement, nowMs)
    for (const service of [...this.bySearch.values()]) this.age(service, nowMs)
  }

  refuse(service: Service, refusal: Refusal): void {
    this.note(
      service,
      `Search ${service.announcement.search} gets no work done here: ${refusal.message}`,
      refusal.exitCode,
    )
  }

  /** The code to end with because everything announced has been refused for so long; undefined otherwise. */
  hopeless(patienceMs: number): { readonly exitCode: number; readonly sentence: string } | undefined {
    const services = [...this.bySearch.values()].filter(({ silent }) => !silent)
    const fatal = services.flatMap(({ refused }) => (refused?.exitCode === undefined ? [] : [refused]))
    const [first] = fatal
    if (first === undefined || services.some(({ refused }) => refused?.exitCode === undefined)) {
      this.refusedSinceMs = undefined
      return undefined
    }
    this.refusedSinceMs ??= this.options.nowMs()
    if (this.options.nowMs() - this.refusedSinceMs < patienceMs) return undefined
    const mismatch = fatal.find(({ exitCode }) => exitCode === exitCodes.protocol) ?? first
    return { exitCode: mismatch.exitCode ?? exitCodes.unreachable, sentence: mismatch.sentence }
  }

  private see(announcement: Announcement, nowMs: number): void {
    const { search } = announcement
    const known = this.bySearch.get(search)
    if (known === undefined) {
      const service: Service = {
        announcement,
        lane: undefined,
        preparing: false,
        refused: undefined,
        beatMs: nowMs,
        silent: false,
        listedMs: nowMs,
      }
      this.bySearch.set(search, service)
      this.judge(service)
      return
    }
    const before = known.announcement
    known.announcement = announcement
    known.listedMs = nowMs
    if (announcement.beat !== before.beat || announcement.holder !== before.holder) {
      known.beatMs = nowMs
      known.silent = false
    }
    if (known.silent) return
    if (editionOf(announcement) !== editionOf(before)) {
      known.refused = undefined
      this.dismiss(known, 'replaced')
    }
    this.judge(known)
  }

  private judge(service: Service): void {
    const { announcement, lane } = service
    const { shutOut, search } = announcement
    if (shutOut.includes(this.options.host) || shutOut.includes(this.options.agent)) {
      if (lane !== undefined) this.dismiss(service, 'shut-out')
      this.note(service, `Search ${search} has shut this machine out: its results were wrong.`, undefined)
      return
    }
    if (announcement.protocol !== protocolVersion) {
      const sentence = `Search ${search} speaks version ${announcement.protocol} of the protocol (Skerry ${announcement.skerry}), this worker version ${protocolVersion}. Install the same version of Skerry on both sides.`
      this.note(service, sentence, exitCodes.protocol)
      return
    }
    if (this.options.room.width(announcement.needs) < 1) {
      const { cores, memoryMB } = announcement.needs
      const { room } = this.options
      const sentence = `A simulation of search ${search} needs ${cores} cores and ${memoryMB} MB; this worker has ${room.cores} cores and ${Math.floor(room.memoryMB)} MB.`
      this.note(service, sentence, undefined)
      return
    }
    if (service.refused !== undefined && service.refused.untilMs <= this.options.nowMs())
      service.refused = undefined
    if (service.lane === undefined && service.refused === undefined && !service.preparing)
      void this.prepare(service)
    this.options.changed(service)
  }

  private async prepare(service: Service): Promise<void> {
    service.preparing = true
    const { announcement } = service
    try {
      const lane = await this.options.prepare(announcement)
      const isStill =
        this.bySearch.get(announcement.search) === service &&
        editionOf(service.announcement) === editionOf(announcement)
      if (isStill && service.refused === undefined) service.lane = lane
    } catch (error) {
      const refusal =
        error instanceof Refusal ? error : refuse('internal', { detail: String(error), cause: error })
      this.note(
        service,
        `Search ${announcement.search} gets no work done here: ${refusal.message}`,
        refusal.exitCode,
      )
    } finally {
      service.preparing = false
    }
    this.options.changed(service)
  }

  private age(service: Service, nowMs: number): void {
    const { silentMs } = this.options
    const isUnlisted = nowMs - service.listedMs > silentMs
    const isSilent = nowMs - service.beatMs > silentMs
    if (!isUnlisted && !isSilent) return
    this.dismiss(service, isUnlisted ? 'over' : 'silent')
    // A silent one stays known, so that it is not taken for a new one as long as its entry lies there.
    if (isUnlisted) this.bySearch.delete(service.announcement.search)
    else if (!service.silent)
      this.options.say(`The coordinator of search ${service.announcement.search} is silent.`)
    service.silent = true
    this.options.changed(service)
  }

  private dismiss(service: Service, why: Dismissal): void {
    const { lane } = service
    service.lane = undefined
    if (lane !== undefined) this.options.dismiss(lane, why)
  }

  private note(service: Service, sentence: string, exitCode: number | undefined): void {
    const untilMs = this.options.nowMs() + retryMs
    if (service.refused?.sentence !== sentence) this.options.say(sentence)
    service.refused = { sentence, exitCode, untilMs }
  }
}

/** What a lane was made for. */
function editionOf({
  record,
  pluginDigest,
  signature,
  seed,
  sharedConditions,
  needs,
  protocol,
}: Announcement): string {
  return JSON.stringify([record, pluginDigest, signature, seed, sharedConditions, needs, protocol])
}

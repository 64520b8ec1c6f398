// What a cluster's dispatcher counts, for metrics and reports.

export interface Counters {
  /** Jobs put into the queue. */
  jobs: number
  /** Answers that an item waited for. */
  answers: number
  /** Answers to an earlier coordinator's jobs that were of use. */
  inherited: number
  /** Answers of an earlier try, or of an item answered before. */
  late: number
  /** Entries of the results stream that nobody of ours can have written. */
  malformed: number
  /** Answers for another record, another problem, or of another protocol. */
  foreign: number
  /** Items sent again because the server was emptied or their job had vanished. */
  resent: number
  /** Times the server was found empty or replaced. */
  resets: number
  /** Jobs that were found nowhere. */
  vanished: number
  /** Times the server stopped answering. */
  stalls: number
  /** Times this process itself was stopped. */
  pauses: number
  agentsLost: number
  agentsLeft: number
  /** Items given back to the engine because nobody there may do them. */
  handedBack: number
}

export function newCounters(): Counters {
  return {
    jobs: 0,
    answers: 0,
    inherited: 0,
    late: 0,
    malformed: 0,
    foreign: 0,
    resent: 0,
    resets: 0,
    vanished: 0,
    stalls: 0,
    pauses: 0,
    agentsLost: 0,
    agentsLeft: 0,
    handedBack: 0,
  }
}

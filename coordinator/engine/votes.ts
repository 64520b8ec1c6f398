// Which of several simulations of one evaluation is believed. Honest machines of one processor class agree (as exactly
// as the problem promises), so two voters that agree settle it, and whoever contradicts two of whom one is of its own
// class is wrong. Where answers follow the class, the problem depends on the processor and nobody is wrong. A voter
// that contradicts itself says nothing; when two do, the problem does not repeat.
//
// A voter is a machine, or a process where there is only one machine (trust.ts).

import type { EvaluationResult, Executor } from '../../shared/result.js'

export interface Vote {
  readonly result: EvaluationResult
  readonly digest: Uint8Array
  readonly executor: Executor
}

/** How votes are read. */
export interface Reading {
  readonly voterOf: (by: Executor) => string
  readonly classOf: (by: Executor) => string
  /** False for whoever is shut out: it may agree, its objection counts for nothing. */
  readonly counts: (by: Executor) => boolean
  readonly agree: (a: Vote, b: Vote) => boolean
  /** Could another machine be asked, beside these, of this class if one is named? */
  readonly hasOthers: (hosts: ReadonlySet<string>, processor?: string) => boolean
}

export type Verdict =
  | { readonly kind: 'open' }
  /** One voter, nobody against it. */
  | { readonly kind: 'unconfirmed'; readonly vote: Vote }
  | {
      readonly kind: 'confirmed'
      readonly vote: Vote
      readonly agreeing: readonly Vote[]
      readonly wrong: readonly Vote[]
      readonly by: 'process' | 'host'
    }
  /** Another must be asked, best on one of these classes, in this order. */
  | { readonly kind: 'disputed'; readonly onProcessors: readonly string[] }
  /** Two classes, first the one with more voters. */
  | {
      readonly kind: 'processor-dependent'
      readonly processors: readonly {
        readonly processor: string
        readonly voters: number
        readonly vote: Vote
      }[]
    }
  | { readonly kind: 'not-deterministic' }

/** More different answers than this and no worker is to blame: the simulation itself does not repeat. */
export const answersTolerated = 4

interface Voter {
  readonly processor: string
  readonly host: string
  readonly votes: Vote[]
  /** Different answers it gave. */
  readonly answers: Vote[]
}

interface Group {
  readonly vote: Vote
  readonly voters: Voter[]
}

export function verdictOf(votes: readonly Vote[], reading: Reading): Verdict {
  if (votes.length === 1) return { kind: 'unconfirmed', vote: votes[0]! }
  if (answersOf(votes, reading).length > answersTolerated) return { kind: 'not-deterministic' }
  const voters = votersOf(
    votes.filter(({ executor }) => reading.counts(executor)),
    reading,
  )
  if (voters.length === 0) return { kind: 'open' }
  const torn = voters.filter(({ answers }) => answers.length > 1)
  if (torn.length > 1) return { kind: 'not-deterministic' }
  const groups = groupsOf(
    voters.filter(({ answers }) => answers.length === 1),
    reading,
  )
  const winner = winnerOf(groups)
  if (winner) return confirmed(winner, votes, reading)
  const lone = groups.length === 1 ? groups[0]! : undefined
  if (lone && torn.length === 0) {
    // Somebody shut out may have said the same.
    const said = confirmed(lone, votes, reading)
    if (said.agreeing.some(({ executor }) => !reading.counts(executor))) return said
    if (votes.every((vote) => reading.agree(vote, lone.vote))) return { kind: 'unconfirmed', vote: lone.vote }
  }
  // Nobody else can be asked: who repeats itself is believed against who does not.
  const hosts = new Set(votes.map(({ executor }) => executor.host))
  if (lone && torn.length === 1 && lone.voters[0]!.votes.length > 1 && !reading.hasOthers(hosts)) {
    return confirmed(lone, votes, reading)
  }
  return dependenceOf(groups, votes, reading) ?? { kind: 'disputed', onProcessors: doubted(groups) }
}

/** Different answers, each by the first vote that gave it. */
export function answersOf(votes: readonly Vote[], { agree }: Pick<Reading, 'agree'>): Vote[] {
  return votes.filter((vote, at) => votes.findIndex((other) => agree(other, vote)) === at)
}

function votersOf(votes: readonly Vote[], reading: Reading): Voter[] {
  const voters = new Map<string, Voter>()
  for (const vote of votes) {
    const key = reading.voterOf(vote.executor)
    const voter = voters.get(key) ?? {
      processor: reading.classOf(vote.executor),
      host: vote.executor.host,
      votes: [],
      answers: [],
    }
    voters.set(key, voter)
    voter.votes.push(vote)
    if (!voter.answers.some((answer) => reading.agree(answer, vote))) voter.answers.push(vote)
  }
  return [...voters.values()]
}

function groupsOf(voters: readonly Voter[], { agree }: Reading): Group[] {
  const groups: Group[] = []
  for (const voter of voters) {
    const group = groups.find(({ vote }) => agree(vote, voter.answers[0]!))
    if (group) group.voters.push(voter)
    else groups.push({ vote: voter.answers[0]!, voters: [voter] })
  }
  return groups
}

const isOn = (group: Group, processor: string) => group.voters.some((voter) => voter.processor === processor)

/** Two voters or more, more than any other, and one of the class of everybody who objects. */
function winnerOf(groups: readonly Group[]): Group | undefined {
  const [first, second] = [...groups].sort((a, b) => b.voters.length - a.voters.length)
  if (!first || first.voters.length < 2 || second?.voters.length === first.voters.length) return undefined
  const others = groups.filter((group) => group !== first).flatMap(({ voters }) => voters)
  return others.every(({ processor }) => isOn(first, processor)) ? first : undefined
}

function confirmed(winner: Group, votes: readonly Vote[], { agree, counts }: Reading) {
  const agreeing = votes.filter((vote) => agree(winner.vote, vote))
  const hosts = new Set(agreeing.map(({ executor }) => executor.host))
  return {
    kind: 'confirmed',
    vote: winner.vote,
    agreeing,
    // Of another class than is used, or shut out already: that is no new offence.
    wrong: votes.filter((vote) => !agree(winner.vote, vote) && counts(vote.executor)),
    by: hosts.size > 1 ? 'host' : 'process',
  } as const
}

/** Classes that are of one mind each, and differ: at least one by two voters, the others as far as they can be asked. */
function dependenceOf(
  groups: readonly Group[],
  votes: readonly Vote[],
  reading: Reading,
): Verdict | undefined {
  if (groups.length < 2) return undefined
  const hosts = new Set(votes.map(({ executor }) => executor.host))
  const ofOneMind = groups.flatMap((group) => {
    const processors = new Set(group.voters.map(({ processor }) => processor))
    return [...processors]
      .filter((one) => groups.every((other) => other === group || !isOn(other, one)))
      .map((processor) => ({
        processor,
        group,
        voters: group.voters.filter((voter) => voter.processor === processor),
      }))
  })
  const isAsked = ({ processor, voters }: (typeof ofOneMind)[number]) =>
    voters.length > 1 ||
    // Its only machine has said it twice, in two processes.
    (!reading.hasOthers(hosts, processor) && voters.some((voter) => voter.votes.length > 1))
  const alone = ({ processor, voters }: (typeof ofOneMind)[number]) =>
    voters.length === 1 && !reading.hasOthers(hosts, processor)
  for (const one of ofOneMind) {
    const other = ofOneMind.find(({ group }) => group !== one.group)
    if (!other) continue
    const settled = one.voters.length > 1 && (other.voters.length > 1 || alone(other))
    if (settled || (isAsked(one) && isAsked(other))) {
      const processors = [one, other]
        .map(({ processor, voters, group }) => ({ processor, voters: voters.length, vote: group.vote }))
        .sort((a, b) => b.voters - a.voters)
      return { kind: 'processor-dependent', processors }
    }
  }
  return undefined
}

/** Classes for which one voter speaks, against others: first that of the vote that came first. */
function doubted(groups: readonly Group[]): string[] {
  const classes = groups.flatMap(({ voters }) => voters.map(({ processor }) => processor))
  const single = groups.flatMap(({ voters }) =>
    voters.length === 1 ? voters.map(({ processor }) => processor) : [],
  )
  return [...new Set([...single, ...classes])]
}

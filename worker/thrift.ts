// How V8 is set in our processes: for little CPU in all, not for the quickest answer of one program that has the machine
// to itself. Every core that helps V8 is one that does not simulate.
//
// Left alone V8 optimises a function after a few thousand passes, on helper threads, in every thread anew: the crawler
// spent 12 % of its first 1,600 evaluations on that, 3 % with these settings, and did not run slower. What is really hot
// passes any budget within a second.
//
// None of these settings changes what a program computes. The budget has this name up to V8 11 (Node 20) only; later ones
// compile in other stages, and are left as they are until somebody has measured them.

import { setFlagsFromString } from 'node:v8'

/**
 * Short-lived garbage is collected by the thread that made it. Of the collector's settings only this one may be changed
 * while a process runs; children of ours are started with --single-threaded-gc.
 */
const collecting = ['--no-parallel-scavenge']

/** Quick code at once for everything; optimised code for what has passed thirty times V8's own budget. */
const compilingInAgents = ['--always-sparkplug', '--interrupt-budget=2000000']

/** Four times V8's own budget: a coordinator runs much code, none of it for long. */
const compilingInCoordinators = ['--interrupt-budget=300000']

/** For a process whose threads simulate; to be called before the first of them starts. */
export function spareHelpersOfAgent(): void {
  if (hasBudget()) set(compilingInAgents)
}

/** For a process that runs searches and simulates nothing itself. */
export function spareHelpersOfCoordinator(): void {
  set(collecting)
  if (hasBudget()) set(compilingInCoordinators)
}

function hasBudget(): boolean {
  return Number.parseInt(process.versions.v8, 10) <= 11
}

function set(flags: readonly string[]): void {
  for (const flag of flags) setFlagsFromString(flag)
}

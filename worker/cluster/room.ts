// What this machine has for simulations, and what of it is in use: cores and memory. Nothing here waits; whoever asks
// is told whether there is room.

import { check } from '../../shared/check.js'
import type { Needs } from '../../shared/cluster/messages.js'

export interface Demand {
  readonly cores: number
  readonly memoryMB: number
}

export class Room {
  readonly cores: number
  readonly memoryMB: number
  private usedCores = 0
  private usedMemoryMB = 0

  constructor(cores: number, memoryMB: number) {
    this.cores = cores
    this.memoryMB = memoryMB
  }

  /** Simulations of these needs that this machine can run side by side; 0 when not even one. */
  width({ cores, memoryMB }: Needs): number {
    return Math.min(Math.floor(this.cores / cores), Math.floor(this.memoryMB / memoryMB))
  }

  fits({ cores, memoryMB }: Demand): boolean {
    return this.usedCores + cores <= this.cores && this.usedMemoryMB + memoryMB <= this.memoryMB
  }

  take(demand: Demand): void {
    check(this.fits(demand), 'room is taken where there is some')
    this.usedCores += demand.cores
    this.usedMemoryMB += demand.memoryMB
  }

  giveBack({ cores, memoryMB }: Demand): void {
    this.usedCores -= cores
    this.usedMemoryMB -= memoryMB
    check(this.usedCores >= 0 && this.usedMemoryMB >= 0, 'room is given back once')
  }

  get coresInUse(): number {
    return this.usedCores
  }
}

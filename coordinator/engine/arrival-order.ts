// Islands of order 'arrival': evaluations whose first result is in, in the order in which they came.

export class ArrivalOrder {
  readonly #byIsland = new Map<number, number[]>()

  note(island: number, evaluation: number): void {
    const order = this.#byIsland.get(island) ?? []
    this.#byIsland.set(island, order)
    if (!order.includes(evaluation)) order.push(evaluation)
  }

  of(island: number): readonly number[] {
    return this.#byIsland.get(island) ?? []
  }

  forget(island: number, evaluation: number): void {
    const order = this.#byIsland.get(island)
    if (order) order.splice(order.indexOf(evaluation), order.includes(evaluation) ? 1 : 0)
  }
}

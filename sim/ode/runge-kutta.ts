// One step of the classical fourth-order Runge-Kutta method for dy/dt = f(t, y), for problems whose motion is a
// handful of smooth equations between events (a walker, a hopper, a pendulum) and not a lattice. Fixed step, no
// allocation after the start, no transcendental function of its own: results are bits, wherever f's are.
// (Kutta, Beitrag zur naeherungsweisen Integration totaler Differentialgleichungen, 1901; from memory.)

/** Writes dy/dt at (t, y) into `rate`; must not keep or change `state`. */
export type Rates = (seconds: number, state: Float64Array, rate: Float64Array) => void

/** One step from `state` at `seconds`, `stepSeconds` long, into `next`, which may be `state` itself. */
export type Step = (seconds: number, stepSeconds: number, state: Float64Array, next: Float64Array) => void

/** A method, ready for equations of one size. */
export type Method = (rates: Rates, size: number) => Step

/** Global error falls as the fourth power of the step. */
export const rungeKutta4: Method = (rates, size) => {
  const first = new Float64Array(size)
  const second = new Float64Array(size)
  const third = new Float64Array(size)
  const fourth = new Float64Array(size)
  const trial = new Float64Array(size)
  return (seconds, stepSeconds, state, next) => {
    const half = 0.5 * stepSeconds
    rates(seconds, state, first)
    for (let i = 0; i < size; i++) trial[i] = state[i]! + half * first[i]!
    rates(seconds + half, trial, second)
    for (let i = 0; i < size; i++) trial[i] = state[i]! + half * second[i]!
    rates(seconds + half, trial, third)
    for (let i = 0; i < size; i++) trial[i] = state[i]! + stepSeconds * third[i]!
    rates(seconds + stepSeconds, trial, fourth)
    const sixth = stepSeconds / 6
    for (let i = 0; i < size; i++) {
      next[i] = state[i]! + sixth * (first[i]! + 2 * (second[i]! + third[i]!) + fourth[i]!)
    }
  }
}

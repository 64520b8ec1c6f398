// The ramp walker as a problem: how must a passive two-legged walker be let go, so that it walks down a ramp? What
// it is and what is published about it: README.md beside this file.

import { walkerProblem } from './release.js'

export { walkerProblem } from './release.js'
export default walkerProblem()

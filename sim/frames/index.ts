// Frameworks: plane structures of bars that stretch and bend, finite or periodic. What other folders use.

export { placeBar } from './assemble.js'
export { chordOf } from './bar.js'
export { type Bar, buildFramework, type Framework } from './build.js'
export {
  type Balance,
  equilibrate,
  forcesOf,
  linearResponse,
  type NoBalance,
  type Situation,
  situationOf,
} from './equilibrium.js'
export { type Homogenised, homogenise, homogeniseFramework } from './homogenise.js'
export { consistentMass, geometricStiffness, lumpedMass, stiffnessMatrix } from './matrices.js'
export {
  complianceOf,
  type Moduli,
  moduliOf,
  nearestIsotropic,
  type PlaneStiffness,
  turned,
} from './moduli.js'
export { inPieces } from './pieces.js'
export type { BarSpec, FrameworkSpec, HingeSpec, Point } from './spec.js'
export { type Squeezed, type SqueezeFault, squeeze } from './squeeze.js'

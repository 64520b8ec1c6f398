// The public entry for authors of plug-ins: `import { defineProblem, real } from 'skerry'`. Pure, and bundled into
// the plug-in together with whatever it uses of it.

export { detMath } from '../shared/detmath/index.js'
export { bits, choice, integer, layout, real } from '../shared/encodings.js'
export type * from '../shared/genome.js'
export * as making from '../shared/making/index.js'
export type * from '../shared/making/types.js'
export type * from '../shared/problem.js'
export type { Stream } from '../shared/streams.js'
export * from './controllers/index.js'
export { advance, type Fault, type OnTheWay, timeSeconds } from './lattice/advance.js'
export { buildLattice } from './lattice/build.js'
export { groundHeightM } from './lattice/ground.js'
export {
  advanceLanes,
  type Lanes,
  lanePlaceM,
  lanePlaces,
  laneStrutBeyond,
  lanesMost,
  laneTally,
  packLanes,
  releaseLanes,
  sampleLanes,
  unpackLane,
} from './lattice/lanes.js'
export type { Lattice } from './lattice/layout.js'
export * as observe from './lattice/observe.js'
export { latticePlaces, type NodePlaces } from './lattice/places.js'
export type * from './lattice/spec.js'
export { stepBound } from './lattice/stability.js'
export { actuatorTally, newTally, strutBeyond, type Tally, takeSample } from './lattice/tally.js'
export { type Variation, varyLattice } from './lattice/vary.js'
export * from './measure/index.js'
export { defineProblem } from './problem.js'

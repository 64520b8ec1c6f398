// What authors of problems use about making: stock, materials, actuator classes, tolerances, friction, helpers for
// repair and the standard measures of actuators.

export {
  actuatorClasses,
  bellowsForceN,
  braidContractionMost,
  braidForceN,
  straightLinePower,
  strutLimits,
} from './actuators.js'
export { frictionRows, rubberFriction } from './friction.js'
export { makingFaults, makingFaultText } from './makeability.js'
export { foams, gentYoungPa, metals, plastics, ruessYoungPa, silicones } from './materials.js'
export * from './measures.js'
export { clamped, cutLength, nearest, nearestRow, snapped, wallForPitch } from './repair.js'
export * from './stock.js'
export * from './tolerances.js'
export type * from './types.js'

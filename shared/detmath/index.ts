export { exp, log } from './exponential.js'
export { cos, sin } from './trigonometry.js'

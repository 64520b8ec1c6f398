// The classic test function 'rastrigin' at its usual size: see ../classic/index.ts.

import { classicProblem } from '../classic/index.js'

export default classicProblem('rastrigin')

// The classic test function 'dtlz1' at its usual size: see ../classic/index.ts.

import { classicProblem } from '../classic/index.js'

export default classicProblem('dtlz1')

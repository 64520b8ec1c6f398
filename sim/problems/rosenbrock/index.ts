// The classic test function 'rosenbrock' at its usual size: see ../classic/index.ts.

import { classicProblem } from '../classic/index.js'

export default classicProblem('rosenbrock')

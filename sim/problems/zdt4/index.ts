// The classic test function 'zdt4' at its usual size: see ../classic/index.ts.

import { classicProblem } from '../classic/index.js'

export default classicProblem('zdt4')

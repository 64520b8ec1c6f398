// The classic test function 'onemax' at its usual size: see ../classic/index.ts.

import { classicProblem } from '../classic/index.js'

export default classicProblem('onemax')

// The classic test function 'leading-ones' at its usual size: see ../classic/index.ts.

import { classicProblem } from '../classic/index.js'

export default classicProblem('leading-ones')

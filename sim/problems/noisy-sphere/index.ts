// The classic test function 'noisy-sphere' at its usual size: see ../classic/index.ts.

import { classicProblem } from '../classic/index.js'

export default classicProblem('noisy-sphere')

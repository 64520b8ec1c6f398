// What a search's islands work with: its plan and what its problem adds to it.

import type { AnyProblem } from '../../../shared/problem.js'
import { searchTools } from '../../evolution/build.js'
import type { SearchPlan } from '../../evolution/plan.js'
import type { SearchTools } from '../../evolution/search.js'

export const toolsOf = (plan: SearchPlan, problem: AnyProblem): SearchTools =>
  searchTools(plan, { expectedCost: problem.expectedCost as never, repair: problem.repair as never })

export { type Access, type Admit, createAdmit, type KnownRoute, registerAccess, viewerOf } from './access.ts';
export { registerBodies } from './bodies.ts';
export { registerDraining } from './draining.ts';
export { createRequestIds, registerHeaders } from './headers.ts';
export { registerMethods } from './methods.ts';
export { type Metrics, registerMetrics } from './metrics.ts';
export {
  asProblem,
  clientErrorHandler,
  PROBLEM_TYPE,
  registerProblems,
  sendProblem,
  writeProblem,
} from './problems.ts';

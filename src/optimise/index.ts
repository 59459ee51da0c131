/** Minimisers, each a published method with its source. */
export {
  type LeastSquaresOptions,
  type LeastSquaresProblem,
  type LeastSquaresResult,
  type LeastSquaresStop,
  minimiseLeastSquares,
} from './least-squares.ts';
export {
  type MinimaxOptions,
  type MinimaxProblem,
  type MinimaxResult,
  type MinimaxStop,
  minimiseMaximum,
} from './minimax.ts';
export {
  type QuadraticProgramme,
  type QuadraticSolution,
  solveQuadraticProgramme,
} from './quadratic-programme.ts';

/** What is asked of the joint optimisation of a cascade. */
import type { InterferometerParameters } from '../circuit/index.ts';
import type { CellLosses } from './interferometer.ts';
import type { CascadeGoal } from './mask-problem.ts';

export interface CascadeOptions {
  readonly goal: CascadeGoal;
  /** BALANCED: K_in = K_out = 0.5. FREE: both free; they balance arms of unequal loss. */
  readonly couplers: 'BALANCED' | 'FREE';
  /** Reach of every ring's K. */
  readonly minimumCoupling: number;
  readonly maximumCoupling: number;
  readonly losses: CellLosses;
  /** Greatest insertion loss, dB; absent: none. */
  readonly maximumInsertionLossDb?: number;
  readonly seed: number;
  /** Further starts, such as the solution of a neighbouring mask; they take on `losses`. */
  readonly startingCells?: readonly (readonly InterferometerParameters[])[];
  /** Progress in [0, 1], never falling; throw from here to cancel. */
  readonly onProgress?: (share: number) => void;
}

export const CASCADE_DEFAULTS: CascadeOptions = {
  goal: 'LEAST_LOSS',
  couplers: 'BALANCED',
  minimumCoupling: 1e-3,
  maximumCoupling: 1,
  losses: { ringLossDb: 0, couplerExcessLossDb: 0 },
  seed: 1,
};

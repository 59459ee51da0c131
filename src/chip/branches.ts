/**
 * The least over all sign choices ±θ of the tunable couplers. Few couplers: every choice. Many: from several starts,
 * flip one or two signs while that helps (local search, no certificate).
 */
import type { WrapSolution } from './wraps.ts';
import { isBetter } from './wraps.ts';

/** Up to this many couplers every choice is looked at: 1,024 wrap problems. */
const MOST_FOR_ALL = 10;

/** A flip always lowers the cost, so this is never reached; a guard. */
const MAX_FLIPS = 10_000;

export interface BranchSolution {
  readonly branches: Uint8Array;
  readonly solution: WrapSolution;
}

type Evaluate = (branches: Uint8Array) => WrapSolution;

function* everyChoice(count: number): Generator<Uint8Array> {
  for (let code = 0; code < 2 ** count; code++)
    yield Uint8Array.from({ length: count }, (_, k) => (code >> k) & 1);
}

function descend(start: Uint8Array, evaluate: Evaluate): BranchSolution {
  let best: BranchSolution = { branches: start, solution: evaluate(start) };
  for (let step = 0; step < MAX_FLIPS; step++) {
    let next: BranchSolution | null = null;
    for (let i = 0; i < start.length; i++)
      for (let j = i; j < start.length; j++) {
        const branches = Uint8Array.from(best.branches);
        branches[i]! ^= 1;
        if (j !== i) branches[j]! ^= 1;
        const solution = evaluate(branches);
        if (isBetter(solution, (next ?? best).solution)) next = { branches, solution };
      }
    if (next === null) return best;
    best = next;
  }
  return best;
}

/** The `keep` best choices found, best first. */
export function searchBranches(count: number, evaluate: Evaluate, keep: number): BranchSolution[] {
  const found: BranchSolution[] = [];
  const add = (candidate: BranchSolution) => {
    const at = found.findIndex((other) => isBetter(candidate.solution, other.solution));
    found.splice(at < 0 ? found.length : at, 0, candidate);
    found.length = Math.min(found.length, keep);
  };
  if (count <= MOST_FOR_ALL)
    for (const branches of everyChoice(count)) add({ branches, solution: evaluate(branches) });
  else
    for (const pattern of [() => 0, () => 1, (k: number) => k % 2, (k: number) => (k + 1) % 2])
      add(
        descend(
          Uint8Array.from({ length: count }, (_, k) => pattern(k)),
          evaluate,
        ),
      );
  return found;
}

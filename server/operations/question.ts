/** What was asked, understood: the chip revision, the canonical question, its address, and what closed form says. */

import { withoutNulls } from '../../schema/absent.ts';
import { problemInAskedUnits } from '../../schema/asked-units.ts';
import { canonicalSpecification, designText } from '../../schema/canonical.ts';
import { type RequestDesignInput, requestDesignRule } from '../../schema/design-request.ts';
import type { Nearest, Problem } from '../../schema/problem.ts';
import type { ChipModel } from '../../src/chip/index.ts';
import { ENGINE_VERSION } from '../../src/conventions.ts';
import { checkQuestion, type DesignQuestion } from '../../src/design/index.ts';
import { Refusal } from '../../src/errors.ts';
import { notFound, ProblemError, problemOfRefusal, staleChipRevision } from '../errors.ts';
import type { ChipRecord, ChipRevisionRecord } from '../store/records.ts';
import { sha256Hex } from './address.ts';
import type { Context } from './context.ts';
import { askedOf, readInput } from './read-input.ts';

export interface Question {
  readonly input: RequestDesignInput;
  /** The body without nulls and key. */
  readonly asked: Readonly<Record<string, unknown>>;
  readonly chip: ChipRecord;
  readonly revision: ChipRevisionRecord;
  readonly model: ChipModel;
  readonly canonical: DesignQuestion;
  readonly text: string;
  readonly hash: string;
}

export type ClosedForm =
  | { readonly ok: true; readonly order: number; readonly rings: number }
  | { readonly ok: false; readonly problem: Problem };

function synthesisOf({ synthesis }: RequestDesignInput): DesignQuestion['synthesis'] {
  return synthesis?.architecture === undefined ? {} : { architecture: synthesis.architecture };
}

function canonicalOf(input: RequestDesignInput, model: ChipModel): DesignQuestion {
  return {
    specification: canonicalSpecification(input.specification, model),
    synthesis: synthesisOf(input),
  };
}

/** Whether a body would be taken for the same chip, and be accepted by closed form. */
function wouldBeAccepted(body: unknown, model: ChipModel): boolean {
  const read = requestDesignRule.safeParse(withoutNulls(body));
  if (!read.success) return false;
  try {
    checkQuestion(canonicalOf(read.data, model), model);
    return true;
  } catch (error) {
    if (error instanceof Refusal) return false;
    throw error;
  }
}

/** @throws ProblemError for everything that is no understandable request at the chip's head revision */
export async function understand(context: Context, body: unknown): Promise<Question> {
  const input = await readQuestion(context, body);
  const chip = await context.chipBySerial(input.chip);
  const asked = askedOf(body);
  requireHead(input, chip, asked);
  const revision = await context.headRevision(chip);
  const model = context.modelOf(revision);
  const canonical = canonicalOf(input, model);
  const text = designText({ engine: ENGINE_VERSION, chipRevisionHash: revision.hash, ...canonical });
  return { input, asked, chip, revision, model, canonical, text, hash: sha256Hex(text) };
}

/** What mends a body for its rules may still be refused for the chip: every suggestion is followed until it is not. */
async function readQuestion(context: Context, body: unknown): Promise<RequestDesignInput> {
  try {
    return readInput(requestDesignRule, body);
  } catch (error) {
    if (!(error instanceof ProblemError) || error.problem.nearest.length === 0) throw error;
    const followed = await Promise.all(error.problem.nearest.map((offer) => followUp(context, offer)));
    const nearest = followed.filter((offer) => offer !== null);
    throw new ProblemError({ ...error.problem, nearest }, error.headers);
  }
}

/** The suggestion if the chip answers it, else with the closed forms' own way on from there; null where there is none. */
async function followUp(context: Context, offer: Nearest): Promise<Nearest | null> {
  let question: Question;
  try {
    question = await understand(context, offer.input);
  } catch (error) {
    // An unknown chip or an older revision is another matter, and no reason against the suggestion.
    if (error instanceof ProblemError) return offer;
    throw error;
  }
  const answer = closedForm(question);
  if (answer.ok) return offer;
  const [next] = answer.problem.nearest;
  if (next === undefined) return null;
  // What the way on changes again is told once, as it ends up.
  const kept = offer.changes.filter(
    (change) => !next.changes.some(({ pointer }) => pointer === change.pointer),
  );
  const given = new Map(offer.changes.map((change) => [change.pointer, change.given]));
  return {
    reason: kept.length === 0 ? next.reason : `${offer.reason}; ${next.reason}`,
    changes: [
      ...kept,
      ...next.changes.map((change) => ({ ...change, given: given.get(change.pointer) ?? change.given })),
    ],
    input: next.input,
  };
}

function requireHead(input: RequestDesignInput, chip: ChipRecord, asked: object): void {
  const given = input.chipRevision;
  if (given === undefined || given === chip.headRevision) return;
  if (given > chip.headRevision) {
    throw notFound(`revision ${given} of chip ${chip.serial}`, '/chipRevision', given);
  }
  const changes = [{ pointer: '/chipRevision', given, works: chip.headRevision }];
  const nearest = [
    {
      reason: 'the same at the head revision',
      changes,
      input: { ...asked, chipRevision: chip.headRevision },
    },
  ];
  const detail = `Chip ${chip.serial} is at revision ${chip.headRevision} by now, not ${given}.`;
  throw staleChipRevision(detail, { pointer: '/chipRevision', given, allowed: chip.headRevision, nearest });
}

/** A problem that may speak canonically, for whoever sent `asked`. */
export function problemFor(problem: Problem, asked: unknown, model: ChipModel): Problem {
  const read = requestDesignRule.safeParse(asked);
  // Only a request kept from before a change of the rules cannot be read any more: its problem stays as it is.
  if (!read.success) return problem;
  return problemInAskedUnits(problem, read.data, asked, model, (body) => wouldBeAccepted(body, model));
}

export function closedForm({ canonical, asked, model }: Question): ClosedForm {
  try {
    const { order, rings } = checkQuestion(canonical, model);
    return { ok: true, order, rings };
  } catch (error) {
    if (!(error instanceof Refusal)) throw error;
    return { ok: false, problem: problemFor(problemOfRefusal(error.details), asked, model) };
  }
}

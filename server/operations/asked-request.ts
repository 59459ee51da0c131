/** Stored requests, and answers from the store, as the one thing that both doors show. */
import { askedOfSpecification } from '../../schema/canonical.ts';
import type { RequestDesignInput } from '../../schema/design-request.ts';
import type { DesignQuestion } from '../../src/design/index.ts';
import type { ChipRecord, ChipRevisionRecord, DesignRecord, RequestRecord } from '../store/records.ts';
import type { Context } from './context.ts';
import { cachedRequestId, wireId } from './ids.ts';
import type { DesignRequest } from './operations.ts';
import { problemFor } from './question.ts';

type AskedInOffsets = Pick<RequestDesignInput, 'specification' | 'synthesis'>;

/** As long as the record is remembered, so is what it says: a repeat reads no text. */
const questions = new WeakMap<DesignRecord, AskedInOffsets>();

/** In offsets: whoever asked first may have used other units. */
function questionOf(design: DesignRecord): AskedInOffsets {
  const known = questions.get(design);
  if (known !== undefined) return known;
  const { specification, synthesis } = JSON.parse(design.canonical) as DesignQuestion;
  const question = { specification: askedOfSpecification(specification), synthesis };
  questions.set(design, question);
  return question;
}

/** A hit that wrote nothing. */
export function cachedRequest(
  design: DesignRecord,
  chip: ChipRecord,
  revision: ChipRevisionRecord,
): DesignRequest {
  return {
    id: cachedRequestId(design.id),
    cached: true,
    state: 'DONE',
    progress: 1,
    chipId: design.chipId,
    chipRevisionId: design.chipRevisionId,
    asked: {
      chip: chip.serial,
      chipRevision: revision.number,
      ...questionOf(design),
    },
    computationId: null,
    designId: design.id,
    design,
    problem: null,
    createdAt: design.createdAt,
    createdBy: null,
    finishedAt: design.createdAt,
  };
}

export async function requestOf(context: Context, record: RequestRecord): Promise<DesignRequest> {
  const { id, state, progress, chipId, chipRevisionId, asked, computationId, designId } = record;
  return {
    id: wireId('req', id),
    cached: state === 'DONE' && computationId === null,
    state,
    progress: state === 'DONE' ? 1 : progress,
    chipId,
    chipRevisionId,
    asked,
    computationId,
    designId,
    problem: record.problem && (await problemOf(context, record)),
    createdAt: record.createdAt,
    createdBy: record.createdBy,
    finishedAt: record.finishedAt,
  };
}

/** The stored problem is shared by all who asked the same; each reads it in their own units. */
async function problemOf(context: Context, { problem, asked, chipRevisionId }: RequestRecord) {
  const revision = await context.revisionById(chipRevisionId);
  if (problem === null || revision === null) return problem;
  return problemFor(problem, asked, context.modelOf(revision));
}

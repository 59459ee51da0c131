/** Asking for designs: refused at once, answered from the store, or queued. */
import { cancelDesignRequestRule, designRequestFilterRule } from '../../schema/design-request.ts';
import { ENGINE_VERSION } from '../../src/conventions.ts';
import { actingOf, authorise, may, type Viewer } from '../auth/index.ts';
import { keyReused, notFound, ProblemError, queueFull, refuse, tooManyOpen } from '../errors.ts';
import type { DesignRecord, Idempotency, RequestRecord } from '../store/records.ts';
import type { Submitted } from '../store/store.ts';
import { cachedRequest, requestOf } from './asked-request.ts';
import type { Context } from './context.ts';
import { hashOfCachedRequestId, uuidOfId } from './ids.ts';
import { connectionOf, readFilter } from './lists.ts';
import type { DesignRequest, Operations, SpecificationCheck } from './operations.ts';
import { closedForm, problemFor, type Question, understand } from './question.ts';
import { idempotencyOf, readInput } from './read-input.ts';

/** The answer that is in the store already; null when there is none. A stored refusal is thrown. */
async function answered(context: Context, question: Question): Promise<DesignRecord | null> {
  const design = await context.findDesign(question.hash);
  if (design !== null) return design;
  const refusal = await context.store.findRefusal(question.hash);
  if (refusal === null) return null;
  throw new ProblemError(problemFor(refusal, question.asked, question.model));
}

async function submit(
  context: Context,
  viewer: Viewer,
  question: Question,
  idempotency: Idempotency | undefined,
): Promise<DesignRequest> {
  const { limits, store } = context;
  const submitted = await store.submitRequest(
    actingOf(viewer),
    {
      chipId: question.chip.id,
      chipRevisionId: question.revision.id,
      asked: question.asked,
      key: question.hash,
      canonical: question.text,
      engine: ENGINE_VERSION,
    },
    { openPerToken: limits.openRequests, queue: limits.queuedRequests },
    idempotency,
  );
  return afterSubmission(context, question, submitted, idempotency);
}

async function afterSubmission(
  context: Context,
  question: Question,
  submitted: Submitted,
  idempotency: Idempotency | undefined,
): Promise<DesignRequest> {
  switch (submitted.outcome) {
    case 'WRITTEN':
      return requestOf(context, submitted.record);
    case 'DESIGN':
      return cachedRequest(submitted.design, question.chip, question.revision);
    case 'REFUSAL':
      throw new ProblemError(problemFor(submitted.problem, question.asked, question.model));
    case 'KEY_REUSED':
      throw keyReused(idempotency?.key ?? '');
    case 'TOO_MANY_OPEN':
      throw tooManyOpen('design requests', context.limits.openRequests);
    case 'QUEUE_FULL':
      throw queueFull(context.limits.queuedRequests);
  }
}

async function check(context: Context, body: unknown): Promise<SpecificationCheck> {
  const nothing = {
    order: null,
    rings: null,
    specification: null,
    revision: null,
    designHash: null,
    cached: false,
  };
  let question: Question;
  try {
    question = await understand(context, body);
  } catch (error) {
    // What is not even a request is refused; what is one and cannot be met is answered.
    if (!(error instanceof ProblemError) || error.status !== 422) throw error;
    return { ok: false, problem: error.problem, ...nothing };
  }
  const { canonical, revision, hash } = question;
  const understood = { specification: canonical.specification, revision, designHash: hash };
  const verdict = closedForm(question);
  if (!verdict.ok) return { ...nothing, ok: false, problem: verdict.problem, ...understood };
  const { order, rings } = verdict;
  const refusal = await context.store.findRefusal(hash);
  if (refusal !== null) {
    const problem = problemFor(refusal, question.asked, question.model);
    return { ok: false, problem, ...understood, order: null, rings: null, cached: true };
  }
  const cached = (await context.findDesign(hash)) !== null;
  return { ok: true, problem: null, ...understood, order, rings, cached };
}

async function findRequest(context: Context, id: string): Promise<DesignRequest | null> {
  const hash = hashOfCachedRequestId(id);
  if (hash !== null) {
    const design = await context.findDesign(hash);
    if (design === null) return null;
    const chip = await context.store.findChipById(design.chipId);
    const revision = await context.revisionById(design.chipRevisionId);
    return chip && revision && cachedRequest(design, chip, revision);
  }
  const uuid = uuidOfId('req', id);
  const record = uuid === null ? null : await context.store.findRequest(uuid);
  return record && requestOf(context, record);
}

type RequestOperations = Pick<
  Operations,
  | 'requestDesign'
  | 'checkSpecification'
  | 'cancelDesignRequest'
  | 'findRequest'
  | 'requestByUuid'
  | 'listRequests'
>;

export function requestOperations(context: Context): RequestOperations {
  const { store } = context;
  return {
    async requestDesign(viewer, body, options) {
      authorise(viewer, 'design.request');
      const question = await understand(context, body);
      const idempotency = idempotencyOf('requestDesign', question.input, body, options);
      if (idempotency === undefined) {
        const design = await answered(context, question);
        if (design !== null) return cachedRequest(design, question.chip, question.revision);
      }
      const verdict = closedForm(question);
      if (!verdict.ok) throw new ProblemError(verdict.problem);
      return submit(context, viewer, question, idempotency);
    },
    async checkSpecification(viewer, body) {
      authorise(viewer, 'specification.check');
      return check(context, body);
    },
    async cancelDesignRequest(viewer, body) {
      authorise(viewer, 'design.cancel');
      const { id } = readInput(cancelDesignRequestRule, body);
      const uuid = uuidOfId('req', id);
      const record = uuid === null ? null : await store.findRequest(uuid);
      if (record === null) return refuseCancel(await findRequest(context, id), id);
      authorise(viewer, 'design.cancel', { actorId: record.createdBy });
      const cancelled = await store.cancelRequest(actingOf(viewer), record.id);
      if (cancelled.outcome === 'NOT_FOUND') throw notFound('such design request', '/id', id);
      if (cancelled.outcome === 'FINISHED') throw alreadyFinished(cancelled.record.state, id);
      return requestOf(context, cancelled.record);
    },
    async findRequest(viewer, id) {
      return may(viewer, 'design-request.read') ? findRequest(context, id) : null;
    },
    async requestByUuid(viewer, uuid) {
      if (!may(viewer, 'design-request.read')) return null;
      const record = await store.findRequest(uuid);
      return record && requestOf(context, record);
    },
    async listRequests(viewer, ask) {
      authorise(viewer, 'design-request.list');
      const filter = readFilter(ask, designRequestFilterRule);
      const chip = filter.chip === undefined ? undefined : await context.chipBySerial(filter.chip);
      return connectionOf<RequestRecord, DesignRequest>(ask, {
        context: { list: 'requests', filter, ...(filter.mine ? { viewer: viewer.actor.id } : {}) },
        read: (page) =>
          store.listRequests(
            {
              ...(chip === undefined ? {} : { chipId: chip.id }),
              ...(filter.state === undefined ? {} : { states: filter.state }),
              ...(filter.mine ? { createdBy: viewer.actor.id } : {}),
            },
            page,
          ),
        nodeOf: (record) => requestOf(context, record),
      });
    },
  };
}

function alreadyFinished(state: string, id: string): ProblemError {
  return refuse('ALREADY_FINISHED', `The request is ${state}; there is nothing to cancel.`, {
    pointer: '/id',
    given: id,
  });
}

/** An answer from the store is a finished request like any other. */
function refuseCancel(cached: DesignRequest | null, id: string): never {
  throw cached === null ? notFound('such design request', '/id', id) : alreadyFinished(cached.state, id);
}

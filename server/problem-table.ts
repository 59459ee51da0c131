/** Every kind of problem: its HTTP status, its title, and the page that explains it at `/problems/<slug>`. */
import type { ProblemCode } from '../schema/problem.ts';

export interface ProblemKind {
  readonly status: number;
  readonly title: string;
  /** Markdown: when it happens and what to do. */
  readonly about: string;
}

export const PROBLEM_TABLE: Readonly<Record<ProblemCode, ProblemKind>> = {
  BAD_INPUT: {
    status: 400,
    title: 'The request is not well formed',
    about:
      'A member is missing, unknown, of the wrong type or out of its range. `pointer` names the first such member, `errors` all of them; `given` repeats what arrived and `allowed` says what may stand there. Numbers must be finite.',
  },
  BAD_CURSOR: {
    status: 400,
    title: 'The cursor does not belong to this list',
    about:
      'A cursor continues one list with one filter and one order. Start again without `after`, or send the filter and order the cursor came from.',
  },
  QUERY_TOO_DEEP: {
    status: 400,
    title: 'The query is nested too deeply',
    about: 'Ask for fewer levels, or fetch the inner records by their ids in a second query.',
  },
  QUERY_TOO_EXPENSIVE: {
    status: 400,
    title: 'The query costs too much',
    about:
      'The cost of a query is one per field times the sizes of the lists around it, 20 and a hundredth of the points for a curve, and 20 for figures. `given` is its cost and `allowed` the limit. Ask for shorter pages or fewer curves.',
  },
  UNAUTHENTICATED: {
    status: 401,
    title: 'A valid token is needed',
    about:
      'Send `Authorization: Bearer <token>`. `detail` says whether the token was missing, malformed, unknown, expired or revoked. An administrator makes new ones.',
  },
  FORBIDDEN: {
    status: 403,
    title: 'The role of this token may not do that',
    about: '`allowed` names the roles that may.',
  },
  NOT_FOUND: {
    status: 404,
    title: 'There is no such thing',
    about: 'Nothing of that name or id exists, or it is not visible to this token.',
  },
  METHOD_NOT_ALLOWED: {
    status: 405,
    title: 'This path does not take that method',
    about: 'The header `Allow` lists the methods that it takes.',
  },
  NOT_ACCEPTABLE: {
    status: 406,
    title: 'No representation matches',
    about: '`allowed` lists the media types and suffixes on offer.',
  },
  TOO_LARGE: {
    status: 413,
    title: 'The request body is too large',
    about: '`allowed` is the limit in bytes.',
  },
  UNSUPPORTED_MEDIA_TYPE: {
    status: 415,
    title: 'The media type of the body is not understood',
    about: 'Send `Content-Type: application/json`.',
  },
  STALE_CHIP_REVISION: {
    status: 409,
    title: 'The chip has a newer model revision',
    about:
      'The request was made for an older revision of the chip model. A setting computed for it may no longer be right for the chip. Ask again at the head revision (`nearest` holds the request to send), or publish an older version knowingly by accepting the caution.',
  },
  ALREADY_FINISHED: {
    status: 409,
    title: 'The request has already ended',
    about: 'Only a request that is queued or running can be cancelled.',
  },
  NAME_TAKEN: {
    status: 409,
    title: 'The name is taken',
    about: 'Serials of chips and names of actors are unique in the service.',
  },
  CAUTION_NOT_ACCEPTED: {
    status: 409,
    title: 'A caution has to be accepted first',
    about:
      'The version to publish carries cautions. `errors` lists those that are not in `accept`. Read them; whoever publishes takes them by naming their codes in `accept`, and the release records it.',
  },
  LAST_ADMIN: {
    status: 409,
    title: 'The last administrator stays',
    about: 'Revoking this token would leave nobody who can make another. Make a new ADMIN token first.',
  },
  PRECONDITION_FAILED: {
    status: 412,
    title: 'Somebody was faster',
    about:
      'The record has moved on since it was read. `allowed` is its present number; read again, decide again.',
  },
  PRECONDITION_REQUIRED: {
    status: 428,
    title: 'A precondition is needed',
    about:
      'Registering takes `If-None-Match: *`, revising takes `If-Match` with the tag of the revision that was read, so that nobody overwrites what they have not seen.',
  },
  SPECIFICATION_INVALID: {
    status: 422,
    title: 'The specification contradicts itself',
    about:
      'The request is well formed and makes no filter: a negative ripple, crossed edges, a mask that lets nothing pass, a member that does not belong to the family or shape. `pointer` and `errors` say where.',
  },
  WRONG_UNIT: {
    status: 422,
    title: 'The number looks like another unit',
    about:
      'The value lies where only another unit can lie: 1550 is a wavelength in nm, 193.1 a frequency in THz. `nearest` holds the same request with the other member.',
  },
  BANDS_COLLIDE: {
    status: 422,
    title: 'Two bands fall on the same point of the free spectral range',
    about:
      'The response of the chip repeats every free spectral range. Two bands that ask for contrary things at the same point of it cannot both be met, by no order and no setting. Move one of them, or use a chip of another free spectral range.',
  },
  SPECIFICATION_UNREACHABLE: {
    status: 422,
    title: 'The chip cannot reach this specification',
    about: '`limit` names what is in the way, `allowed` how far it goes, `nearest` requests that can be met.',
  },
  SETTING_UNREACHABLE: {
    status: 422,
    title: 'The drivers cannot set this filter',
    about:
      'A filter exists, but a channel or the sum of all channels would exceed a limit. Limits protect the heaters and the chip; they are never exceeded. `limit` and `detail` name the limit and the channel.',
  },
  IDEMPOTENCY_KEY_REUSED: {
    status: 422,
    title: 'The idempotency key belongs to another request',
    about: 'The key was used before with another operation or another body. A new request takes a new key.',
  },
  RATE_LIMITED: {
    status: 429,
    title: 'Too many requests',
    about: 'Wait for the seconds in `Retry-After`. The rate is counted per token and per process.',
  },
  TOO_MANY_OPEN: {
    status: 429,
    title: 'Too many open at once',
    about:
      'This token has as many requests, subscriptions or long polls open as it may. Wait for some to end, or cancel them.',
  },
  SERVICE_UNAVAILABLE: {
    status: 503,
    title: 'The service is away for a moment',
    about:
      'The database cannot be reached or the service is shutting down. Nothing was lost; try again after `Retry-After`.',
  },
  QUEUE_FULL: {
    status: 503,
    title: 'The queue is full',
    about: 'More requests are waiting than the service takes. Try again after `Retry-After`.',
  },
  INTERNAL: {
    status: 500,
    title: 'Something went wrong inside the service',
    about:
      'A defect. `instance` is the id under which the log holds the rest; tell it to whoever runs the service.',
  },
  COMPUTATION_CRASHED: {
    status: 500,
    title: 'The computation failed',
    about:
      'The worker died at every attempt, or an iteration did not converge: `detail` says which of them. It is a defect and no refusal; asking again starts anew.',
  },
  COMPUTATION_TIMED_OUT: {
    status: 500,
    title: 'The computation took too long',
    about: 'It was ended at the time limit. A lower order or fewer bands are quicker.',
  },
  ENGINE_RETIRED: {
    status: 500,
    title: 'No worker computes for this engine version any more',
    about: 'The service was upgraded while the request waited. Ask again; the new engine answers.',
  },
};

const SLUGS = new Map(
  Object.keys(PROBLEM_TABLE).map((code) => [slugOf(code as ProblemCode), code as ProblemCode]),
);

function slugOf(code: ProblemCode): string {
  return code.toLowerCase().replaceAll('_', '-');
}

/** URI reference of a kind of problem, served by the service itself: labs often have no internet. */
export function typeOf(code: ProblemCode): string {
  return `/problems/${slugOf(code)}`;
}

/** The page at `/problems/<slug>` in Markdown, or null. */
export function problemPage(slug: string): string | null {
  const code = SLUGS.get(slug);
  if (code === undefined) return null;
  const { status, title, about } = PROBLEM_TABLE[code];
  return `# ${title}\n\nCode \`${code}\`, HTTP status ${status}.\n\n${about}\n`;
}

/** Every slug, for the index page and the document that describes the service. */
export function problemSlugs(): readonly string[] {
  return [...SLUGS.keys()];
}

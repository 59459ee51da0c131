/** Every answer with an error is `application/problem+json` (RFC 9457), the framework's own refusals included. */
import type { FastifyError, FastifyInstance, FastifyReply, FastifyRequest } from 'fastify';
import { LIMITS } from '../../../schema/limits.ts';
import type { Problem } from '../../../schema/problem.ts';
import { badInput, ProblemError, problemOfUnknown, refuse } from '../../errors.ts';

export const PROBLEM_TYPE = 'application/problem+json';

const MEDIA_TYPES = ['application/json'];

function problemOfFramework(error: FastifyError): ProblemError {
  switch (error.code) {
    case 'FST_ERR_CTP_BODY_TOO_LARGE':
      return refuse('TOO_LARGE', `The body is larger than ${LIMITS.bodyBytes} bytes.`, {
        allowed: { max: LIMITS.bodyBytes, unit: 'byte' },
      });
    case 'FST_ERR_CTP_INVALID_MEDIA_TYPE':
    case 'FST_ERR_CTP_INVALID_TYPE':
      return refuse('UNSUPPORTED_MEDIA_TYPE', 'The body must come as application/json.', {
        allowed: MEDIA_TYPES,
      });
    case 'FST_ERR_CTP_INVALID_CONTENT_LENGTH':
      return badInput('The body is shorter or longer than Content-Length says.');
    case 'FST_ERR_BAD_URL':
      return badInput(
        'The path is not a well-formed URL: a percent sign must be followed by two hexadecimal digits.',
      );
    default:
      return problemOfUnknown(error);
  }
}

export function asProblem(error: unknown): ProblemError {
  if (error instanceof ProblemError) return error;
  const code = (error as FastifyError | null)?.code;
  return typeof code === 'string' && code.startsWith('FST_ERR')
    ? problemOfFramework(error as FastifyError)
    : problemOfUnknown(error);
}

export function sendProblem(request: FastifyRequest, reply: FastifyReply, error: unknown): FastifyReply {
  const refusal = asProblem(error);
  const { problem } = refusal;
  if (problem.status >= 500) request.log.error({ err: refusal.cause ?? refusal, problem }, 'request failed');
  return writeProblem(reply, problem, refusal.headers);
}

/** A stored problem (of a failed request) or one made here, with its own status. */
export function writeProblem(
  reply: FastifyReply,
  problem: Problem,
  headers: Readonly<Record<string, string>> = {},
): FastifyReply {
  // What a representation would have carried does not describe the problem that is sent instead.
  for (const name of ['etag', 'content-disposition', 'content-location']) reply.removeHeader(name);
  return (
    reply
      .code(problem.status)
      .headers(headers)
      .header('content-type', PROBLEM_TYPE)
      // As bytes, for to a text of a JSON type the framework adds a charset.
      .send(Buffer.from(JSON.stringify(problem)))
  );
}

/** What Node's parser refuses before there is a request: bytes that are not HTTP, header sections too long. */
function refuseMalformed(error: NodeJS.ErrnoException, socket: import('node:net').Socket): void {
  if (error.code === 'ECONNRESET' || !socket.writable) {
    socket.destroy();
    return;
  }
  const timedOut = error.code === 'ERR_HTTP_REQUEST_TIMEOUT';
  const detail = timedOut ? 'The request did not arrive in time.' : 'These bytes are not an HTTP request.';
  const body = JSON.stringify(badInput(detail).problem);
  const head = [
    'HTTP/1.1 400 Bad Request',
    `Content-Type: ${PROBLEM_TYPE}`,
    `Content-Length: ${Buffer.byteLength(body)}`,
    'Connection: close',
  ];
  socket.end(`${head.join('\r\n')}\r\n\r\n${body}`);
}

export const clientErrorHandler = refuseMalformed;

export function registerProblems(app: FastifyInstance): void {
  app.setErrorHandler((error, request, reply) => sendProblem(request, reply, error));
}

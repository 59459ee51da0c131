/** Request bodies: UTF-8 JSON and nothing else, read strictly. */
import type { FastifyInstance } from 'fastify';
import { badInput, refuse } from '../../errors.ts';
import { JsonRefused, readJson } from '../protocol/index.ts';

/** Cuts nothing: a byte order mark is ignored as RFC 8259 section 8.1 allows, wrong UTF-8 throws. */
const decoder = new TextDecoder('utf-8', { fatal: true });

function readBody(bytes: Buffer): unknown {
  if (bytes.length === 0) return undefined;
  let text: string;
  try {
    text = decoder.decode(bytes);
  } catch {
    throw badInput('The body is not valid UTF-8.');
  }
  try {
    return readJson(text);
  } catch (error) {
    if (!(error instanceof JsonRefused)) throw error;
    const { line, column, offset, pointer } = error;
    throw badInput(`The body is not acceptable JSON: ${error.message}.`, {
      pointer,
      given: { line, column, character: offset },
    });
  }
}

function checkCoding(contentType: string, contentEncoding: string | undefined): void {
  const charset = /;\s*charset\s*=\s*"?([^;"\s]+)/i.exec(contentType)?.[1]?.toLowerCase();
  if (charset !== undefined && charset !== 'utf-8' && charset !== 'utf8') {
    throw refuse('UNSUPPORTED_MEDIA_TYPE', `The charset ${charset} is not understood; JSON is UTF-8.`, {
      given: charset,
      allowed: ['utf-8'],
    });
  }
  if (contentEncoding !== undefined && contentEncoding.toLowerCase() !== 'identity') {
    throw refuse(
      'UNSUPPORTED_MEDIA_TYPE',
      `The content coding ${contentEncoding} is not understood; send the body plain.`,
      {
        given: contentEncoding,
        allowed: ['identity'],
      },
    );
  }
}

export function registerBodies(app: FastifyInstance): void {
  app.removeAllContentTypeParsers();
  app.addContentTypeParser('application/json', { parseAs: 'buffer' }, (request, bytes: Buffer, done) => {
    try {
      checkCoding(request.headers['content-type'] ?? '', request.headers['content-encoding']);
      done(null, readBody(bytes));
    } catch (error) {
      done(error as Error);
    }
  });
}

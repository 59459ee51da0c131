/** What every handler is given. */
import type { FastifyRequest } from 'fastify';
import type { Authenticator } from '../auth/index.ts';
import type { Operations } from '../operations/index.ts';
import { viewerOf } from './frame/index.ts';
import type { Waiting } from './waiting.ts';
import type { Wiring } from './wire.ts';

export interface RestDeps {
  readonly operations: Operations;
  readonly authenticator: Authenticator;
  readonly waiting: Waiting;
  /** Designs as the bytes of their text, by their hash. */
  readonly designTexts: Map<string, Buffer>;
}

export function wiringOf({ operations }: RestDeps, request: FastifyRequest): Wiring {
  return { operations, viewer: viewerOf(request) };
}

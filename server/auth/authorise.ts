/** Who may what: one table, asked for the action and again for every object that an operation hands out. */
import { forbidden } from '../errors.ts';
import type { Role } from '../store/records.ts';
import type { Viewer } from './viewer.ts';

const EVERYONE: readonly Role[] = ['READER', 'DESIGNER', 'INSTRUMENT', 'ADMIN'];
const PEOPLE: readonly Role[] = ['READER', 'DESIGNER', 'ADMIN'];
const MAKERS: readonly Role[] = ['DESIGNER', 'ADMIN'];
const ADMINS: readonly Role[] = ['ADMIN'];

interface Right {
  readonly roles: readonly Role[];
  /** Completes "The role … may not …". */
  readonly label: string;
  /** Roles other than ADMIN may do it to what is their own only. */
  readonly own?: true;
}

export const RIGHTS = {
  'viewer.read': { roles: EVERYONE, label: 'see who it is' },
  'service.read': { roles: EVERYONE, label: 'read about the service' },
  introspect: { roles: EVERYONE, label: 'introspect the schema' },
  'chip.read': { roles: EVERYONE, label: 'read chips' },
  'configuration.read': { roles: EVERYONE, label: 'read configurations' },
  'release.read': { roles: EVERYONE, label: 'read releases' },
  'design.read': { roles: EVERYONE, label: 'read a design' },
  'actor.read': { roles: EVERYONE, label: 'read who did something' },
  'design.list': { roles: PEOPLE, label: 'list designs' },
  'design-request.read': { roles: PEOPLE, label: 'read design requests' },
  'design-request.list': { roles: PEOPLE, label: 'list design requests' },
  'specification.check': { roles: PEOPLE, label: 'check specifications' },
  'history.read': { roles: PEOPLE, label: 'read the history' },
  'design.request': { roles: MAKERS, label: 'request designs' },
  'design.cancel': { roles: MAKERS, label: 'cancel this design request', own: true },
  'chip.register': { roles: MAKERS, label: 'register chips' },
  'chip.revise': { roles: MAKERS, label: 'revise chips' },
  'version.save': { roles: MAKERS, label: 'save configuration versions' },
  'release.publish': { roles: MAKERS, label: 'publish releases' },
  'token.read': { roles: EVERYONE, label: 'see this token', own: true },
  'token.revoke': { roles: EVERYONE, label: 'revoke this token', own: true },
  'token.list': { roles: ADMINS, label: 'list tokens' },
  'token.create': { roles: ADMINS, label: 'create tokens' },
  'metrics.read': { roles: ADMINS, label: 'read metrics from afar' },
} as const satisfies Record<string, Right>;

export type Action = keyof typeof RIGHTS;

/** Whose the object of an action is: a request's actor, or the token itself. */
export interface OwnedObject {
  readonly actorId?: string | null;
  readonly tokenId?: string;
}

function isOwn(viewer: Viewer, object: OwnedObject): boolean {
  if (object.tokenId !== undefined) return object.tokenId === viewer.tokenId;
  return object.actorId === viewer.actor.id;
}

/** Without an object: whether the role may do it at all. */
export function may(viewer: Viewer, action: Action, object?: OwnedObject): boolean {
  const right: Right = RIGHTS[action];
  if (!right.roles.includes(viewer.role)) return false;
  return object === undefined || right.own === undefined || viewer.role === 'ADMIN' || isOwn(viewer, object);
}

/** @throws ProblemError FORBIDDEN, naming the roles that may */
export function authorise(viewer: Viewer, action: Action, object?: OwnedObject): void {
  if (may(viewer, action, object)) return;
  const right: Right = RIGHTS[action];
  // A role that may, but not this one: only ADMIN may do it to what belongs to others.
  const allowed = right.roles.includes(viewer.role) ? ADMINS : right.roles;
  throw forbidden(right.label, viewer.role, allowed);
}

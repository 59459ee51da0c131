/** Who asks, and what they may. */
export { type Authenticator, createAuthenticator } from './authenticate.ts';
export { type Action, authorise, may, type OwnedObject, RIGHTS } from './authorise.ts';
export { ensureFirstAdmin } from './first-admin.ts';
export { generateToken } from './token.ts';
export { actingOf, type Viewer } from './viewer.ts';

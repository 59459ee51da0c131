/** The PostgreSQL that starts when none is configured: real server binaries from the package registry, in a data folder. */
export { startEmbedded } from './start.ts';
export type { Embedded, EmbeddedLogger, EmbeddedOptions } from './types.ts';

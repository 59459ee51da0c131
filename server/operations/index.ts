/** What the service does, for both doors. */
export type * from './operations.ts';

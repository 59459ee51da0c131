/** What the service does, for both doors. */
export type { OperationsDeps } from './context.ts';
export { createOperations } from './create.ts';
export { designId, historyId, releaseId, wireId } from './ids.ts';
export type * from './operations.ts';

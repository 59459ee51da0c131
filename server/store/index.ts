/** The library in PostgreSQL: the only code that talks to it. */

export { BackupUnreadable, backup, restore } from './backup/index.ts';
export type { StoreOptions } from './create-store.ts';
export { createStore } from './create-store.ts';
export { InvalidSortKey } from './page.ts';
export type * from './records.ts';
export type * from './store.ts';
export { StoreUnavailable } from './unavailable.ts';

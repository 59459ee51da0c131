export { backup } from './backup.ts';
export { BackupUnreadable } from './format.ts';
export { restore } from './restore.ts';

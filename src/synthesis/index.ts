export type { AllPassPair } from './all-pass-pair.ts';
export { synthesiseAllPassPair } from './all-pass-pair.ts';

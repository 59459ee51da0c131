/** The straight way through the core: question and chip in, design out; and every curve and figure of a design. */
export type * from './design.ts';

/** The straight way through the core: question and chip in, design out; and every curve and figure of a design. */
export { checkQuestion, type QuestionCheck } from './check-question.ts';
export { computeDesign, type DesignHooks } from './compute-design.ts';
export type * from './design.ts';
export { curveOf, type DesignCurve, netlistOfDesign, stageCompliance, stageFigures } from './stages.ts';

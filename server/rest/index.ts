/** The REST door: `/v1`, its document, and what operators and readers need beside it. */
import type { FastifyInstance } from 'fastify';
import { registerChips } from './chips.ts';
import { registerConfigurations } from './configurations.ts';
import { registerCurves } from './curves.ts';
import { registerDesignRequests } from './design-requests.ts';
import { registerDesigns } from './designs.ts';
import { registerHistory } from './history.ts';
import { registerPull } from './pull.ts';
import { registerReleases } from './releases.ts';
import type { RestDeps } from './rest.ts';
import { registerSpecificationChecks } from './specification-checks.ts';
import { registerViewer } from './viewer.ts';

export * from './frame/index.ts';
export { registerOperating } from './operating.ts';
export { registerDocument, registerPages } from './pages.ts';
export { createTokenBuckets, JsonRefused, negotiate, readJson } from './protocol/index.ts';
export { createWaiting } from './waiting.ts';

export function registerRest(app: FastifyInstance, parts: Omit<RestDeps, 'designTexts'>): void {
  const deps: RestDeps = { ...parts, designTexts: new Map() };
  registerViewer(app, deps);
  registerChips(app, deps);
  registerSpecificationChecks(app, deps);
  registerDesignRequests(app, deps);
  registerDesigns(app, deps);
  registerCurves(app, deps);
  registerConfigurations(app, deps);
  registerPull(app, deps);
  registerReleases(app, deps);
  registerHistory(app, deps);
}

/** Designs: read, listed, and seen again as curves and figures. */
import { designFilterRule, designOrderRule } from '../../schema/page.ts';
import { curveAskRule, figuresAskRule } from '../../schema/response.ts';
import { netlistOfDesign, stageFigures } from '../../src/design/index.ts';
import { authorise, may } from '../auth/index.ts';
import type { DesignRecord } from '../store/records.ts';
import type { DesignFilter } from '../store/store.ts';
import type { Context } from './context.ts';
import { curveOfDesign } from './curve.ts';
import { hashOfDesignId } from './ids.ts';
import { connectionOf, readFilter } from './lists.ts';
import type { Operations } from './operations.ts';
import { readInput } from './read-input.ts';

type DesignOperations = Pick<
  Operations,
  | 'findDesign'
  | 'designById'
  | 'listDesigns'
  | 'listVersionsOfDesign'
  | 'designCurve'
  | 'designFigures'
  | 'designNetlist'
>;

async function modelOfDesign(context: Context, design: DesignRecord) {
  const revision = await context.revisionById(design.chipRevisionId);
  if (revision === null) throw new Error(`design ${design.id} has no chip revision`);
  return context.modelOf(revision);
}

function time(text: string | undefined): Date | undefined {
  return text === undefined ? undefined : new Date(text);
}

export function designOperations(context: Context): DesignOperations {
  const { store } = context;
  return {
    async findDesign(viewer, id) {
      const hash = hashOfDesignId(id);
      return hash !== null && may(viewer, 'design.read') ? context.findDesign(hash) : null;
    },
    async designById(viewer, hash) {
      return may(viewer, 'design.read') ? context.findDesign(hash) : null;
    },
    async listDesigns(viewer, ask) {
      authorise(viewer, 'design.list');
      const asked = readFilter(ask, designFilterRule);
      const order = readInput(designOrderRule, ask.order ?? 'NEWEST');
      const { chip: serial, createdAfter, createdBefore, ...rest } = asked;
      const filter = Object.fromEntries(
        Object.entries({
          ...rest,
          chipId: serial === undefined ? undefined : (await context.chipBySerial(serial)).id,
          createdAfter: time(createdAfter),
          createdBefore: time(createdBefore),
        }).filter(([, value]) => value !== undefined),
      ) as DesignFilter;
      return connectionOf(ask, {
        context: { list: 'designs', filter: asked, order },
        read: (page) => store.listDesigns(filter, order, page),
        nodeOf: (row) => row,
      });
    },
    async listVersionsOfDesign(viewer, design, ask) {
      authorise(viewer, 'configuration.read');
      return connectionOf(ask, {
        context: { list: 'versionsOfDesign', design: design.id },
        read: (page) => store.listVersionsOfDesign(design.id, page),
        nodeOf: (row) => row,
      });
    },
    async designCurve(viewer, design, ask) {
      authorise(viewer, 'design.read');
      const input = readInput(curveAskRule, ask);
      return curveOfDesign(design.result, await modelOfDesign(context, design), input);
    },
    async designFigures(viewer, design, ask) {
      authorise(viewer, 'design.read');
      const { stage = 'SETTING', output = 'OUT1' } = readInput(figuresAskRule, ask);
      return stageFigures(design.result, await modelOfDesign(context, design), stage, output);
    },
    async designNetlist(viewer, design) {
      authorise(viewer, 'design.read');
      return netlistOfDesign(design.result);
    },
  };
}

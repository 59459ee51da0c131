/** Design and what hangs on it. Curves and figures are computed here and only here: when their field is selected. */

import { OUTPUTS, outputRule } from '../../../schema/specification.ts';
import type { GridInput } from '../../../schema/units.ts';
import type { ChipModel } from '../../../src/chip/index.ts';
import type { DesignQuestion } from '../../../src/design/index.ts';
import { badInput } from '../../errors.ts';
import type { DesignRecord } from '../../store/records.ts';
import {
  circuitView,
  complianceView,
  settingView,
  specificationView,
  transferFunctionView,
} from '../../views/index.ts';
import type { GraphqlContext } from '../context.ts';
import { chip, chipRevision, connection, versionNode } from './nodes.ts';
import { type PageArgs, present, type TypeResolvers } from './resolve.ts';
import { specificationNode } from './specification.ts';

interface Parent {
  readonly record: DesignRecord;
}

interface CurveArgs {
  readonly stage: string;
  readonly output: string;
  readonly grid?: GridInput | null;
  readonly reduceTo?: number | null;
}

async function modelOf({ record }: Parent, { load, operations }: GraphqlContext): Promise<ChipModel> {
  const id = record.chipRevisionId;
  return operations.modelOf(present(await load.revision(id), `chip revision ${id}`));
}

export const Design: TypeResolvers = {
  chip,
  chipRevision,
  async specification(parent: Parent, _: unknown, context: GraphqlContext) {
    const { specification } = JSON.parse(parent.record.canonical) as DesignQuestion;
    return specificationNode(specificationView(specification, await modelOf(parent, context)));
  },
  transferFunction({ record }: Parent, { output }: { output: string }) {
    const read = outputRule.safeParse(output);
    if (read.success) return transferFunctionView(record.result, read.data);
    const more = { pointer: '/output', given: output, allowed: OUTPUTS };
    throw badInput('/output must be an output, OUT1 or OUT2.', more);
  },
  /** The record: its netlist is made when it is asked for. */
  circuit: ({ record }: Parent) => ({ record, architecture: record.result.architecture }),
  setting: ({ record }: Parent) => settingView(record.result.setting),
  response({ record }: Parent, args: CurveArgs, { operations, viewer }: GraphqlContext) {
    return operations.designCurve(viewer, record, args);
  },
  figures({ record }: Parent, args: CurveArgs, { operations, viewer }: GraphqlContext) {
    return operations.designFigures(viewer, record, args);
  },
  async compliance(parent: Parent, _: unknown, context: GraphqlContext) {
    return complianceView(parent.record.result.compliance, await modelOf(parent, context));
  },
  versions({ record }: Parent, args: PageArgs, { operations, viewer }: GraphqlContext) {
    return connection(operations.listVersionsOfDesign(viewer, record, args), versionNode);
  },
};

export const Circuit: TypeResolvers = {
  cells: ({ record }: Parent) =>
    record.result.cells.map((cell) => ({ __typename: 'InterferometerCircuit', ...cell })),
  async netlist({ record }: Parent, _: unknown, { operations, viewer }: GraphqlContext) {
    const netlist = await operations.designNetlist(viewer, record);
    return circuitView(record.result, netlist).netlist;
  },
};

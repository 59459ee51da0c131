/** Designs and requests for them. */
import type { FrequencyFrame } from '../../schema/offsets.ts';
import type { Setting } from '../../src/chip/index.ts';
import type { Netlist } from '../../src/circuit/index.ts';
import type { Design, TransferFunctionRecord } from '../../src/design/index.ts';
import type { OutputPort } from '../../src/filter/index.ts';
import type { Compliance } from '../../src/response/index.ts';
import { type DesignRequest, designId } from '../operations/index.ts';
import type { DesignRecord } from '../store/records.ts';
import { complexList, opticalFrequency, timeOrNull, timeView } from './quantities.ts';
import { bandView } from './specification.ts';

/** Plain members; the large ones have views of their own. */
export function designView(record: DesignRecord) {
  const { order, family, architecture, reason, alternatives, tradeOff } = record.result;
  return {
    id: designId(record.id),
    hash: record.id,
    canonical: record.canonical,
    engineVersion: record.engine,
    order,
    family,
    architecture,
    reason,
    alternatives,
    tradeOff,
    createdAt: timeView(record.createdAt),
  };
}

export function transferFunctionView(design: Design, output: OutputPort) {
  const { zeros, poles, gain, sections } = design.transferFunctions[output];
  return {
    zeros: complexList(zeros),
    poles: complexList(poles),
    gain,
    sections: sections.map(sectionView),
  };
}

function sectionView(section: TransferFunctionRecord['sections'][number]) {
  const { zeros, poles, gain, peakDb } = section;
  return { zeros: complexList(zeros), poles: complexList(poles), gain, peakDb };
}

export function circuitView(design: Design, netlist: Netlist) {
  return { architecture: design.architecture, cells: design.cells, netlist };
}

export function settingView(setting: Setting) {
  return {
    ...setting,
    temperatureC: setting.temperatureC ?? null,
    cautions: setting.cautions.map((caution) => ({ ...caution, channel: caution.channel ?? null })),
  };
}

export function complianceView(compliance: Compliance, frame: FrequencyFrame) {
  return {
    met: compliance.met,
    reference: compliance.reference,
    worstMarginDb: Number.isFinite(compliance.worstMarginDb) ? compliance.worstMarginDb : null,
    bands: compliance.bands.map(({ index, band, worstAtGhz, ...demand }) => ({
      band: bandView(band, index, frame),
      ...demand,
      worstAt: opticalFrequency(worstAtGhz, frame),
    })),
  };
}

export function requestView(request: DesignRequest) {
  return {
    id: request.id,
    state: request.state,
    progress: request.progress,
    cached: request.cached,
    asked: request.asked,
    problem: request.problem,
    createdAt: timeView(request.createdAt),
    finishedAt: timeOrNull(request.finishedAt),
  };
}

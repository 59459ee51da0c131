/** Chips, revisions and models. */
import type { ChipModelInput } from '../../schema/chip.ts';
import type { ChipModel, Coupler, InterferometerCell } from '../../src/chip/index.ts';
import { wireId } from '../operations/index.ts';
import type { ChipRecord, ChipRevisionRecord } from '../store/records.ts';
import { timeOrNull, timeView } from './quantities.ts';

export function chipView(chip: ChipRecord) {
  return {
    id: wireId('chp', chip.id),
    serial: chip.serial,
    description: chip.description,
    retiredAt: timeOrNull(chip.retiredAt),
    createdAt: timeView(chip.createdAt),
  };
}

/** Without the model, which is large: `chipModelView`. */
export function revisionView(revision: ChipRevisionRecord) {
  return {
    id: wireId('rev', revision.id),
    number: revision.number,
    hash: revision.hash,
    note: revision.note,
    createdAt: timeView(revision.createdAt),
  };
}

function couplerView(coupler: Coupler) {
  return { ...coupler, powerCrossCoupling: coupler.powerCrossCoupling ?? null };
}

function cellView(cell: InterferometerCell) {
  return { ...cell, couplers: cell.couplers.map(couplerView) };
}

/** @param input the model as it was given: what to send, changed, to revise it */
export function chipModelView(model: ChipModel, input: ChipModelInput) {
  const channels = model.channels.length;
  return {
    referenceFrequencyThz: model.referenceFrequencyThz,
    fsrGhz: model.fsrGhz,
    unitDelayLengthUm: input.fsr.delay?.unitDelayLengthUm ?? null,
    groupIndex: input.fsr.delay?.groupIndex ?? null,
    cells: model.cells.map(cellView),
    cellJoin: model.join,
    losses: model.losses,
    channels: model.channels,
    crosstalk: { rows: channels, columns: channels, values: model.crosstalk },
    totalPowerLimitMw: model.totalPowerLimitMw ?? null,
    heaterFloorRad: model.heaterFloorRad,
    rejectionFloorDb: model.rejectionFloorDb ?? null,
    temperatureC: model.temperatureC ?? null,
    input,
  };
}

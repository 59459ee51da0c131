/** The family form, all shapes but the interleaver: the filter exactly as its parameters state it. */
import { HALF_POWER_DB } from '../../conventions.ts';
import { type BandAsk, designLowPass, rotateFilter } from '../bands.ts';
import { complementOf } from '../complement.ts';
import { naturalStopEdgeRad, reachablePassEdgeRad, reachableRejectionDb } from '../order.ts';
import type { Band, FamilySpecification, IntervalGhz } from '../specification.ts';
import { leastOrderOf } from './candidates.ts';
import { type FamilyGeometry, geometryOf, requireParameters } from './family-demand.ts';
import type { Capacity, FilterPlan, OneBandDemand } from './plan.ts';
import { refuseNoRoom, refuseOrder } from './refuse-order.ts';

const TURN = 2 * Math.PI;

export function planFamily(spec: FamilySpecification, fsrGhz: number, capacity: Capacity): FilterPlan {
  requireParameters(spec);
  const geometry = geometryOf(spec, fsrGhz);
  const passEdgeRad = passEdgeOf(spec, geometry);
  if (geometry.stopEdgeRad !== null && geometry.stopEdgeRad <= geometry.bandEdgeRad)
    refuseNoRoom(spec, geometry, fsrGhz);
  const order = spec.order ?? orderOf(spec, geometry);
  requireWithin(spec, geometry, order, capacity, fsrGhz);
  const ask: BandAsk = {
    family: spec.family,
    order,
    edgeRad: designEdge(spec, geometry),
    ...levels(spec),
  };
  const filter = rotateFilter(designLowPass(ask), geometry.centreRad);
  const passRad =
    passEdgeRad ??
    reachablePassEdgeRad(spec.family, order, {
      stopEdgeRad: geometry.bandEdgeRad,
      rejectionDb: spec.rejectionDb!,
      rippleDb: HALF_POWER_DB,
    });
  const stopRad = stopEdgeOf(spec, geometry, order);
  return {
    family: spec.family,
    order,
    output: spec.output,
    centreRad: geometry.centreRad,
    passEdgeRad: passRad,
    stopEdgeRad: stopRad,
    rippleDb: allowanceOf(spec),
    rejectionDb: spec.rejectionDb ?? null,
    filter,
    complement: () => complementOf(ask, filter, geometry.centreRad),
    mask: { bands: maskBands(spec, geometry.centreRad, passRad, stopRad, fsrGhz), reference: 'PEAK' },
  };
}

function levels(spec: FamilySpecification): { rippleDb?: number; rejectionDb?: number } {
  return {
    ...(spec.rippleDb === undefined ? {} : { rippleDb: spec.rippleDb }),
    ...(spec.rejectionDb === undefined ? {} : { rejectionDb: spec.rejectionDb }),
  };
}

/** The loss that the family's own passband edge states. */
function allowanceOf(spec: FamilySpecification): number {
  return spec.family === 'BUTTERWORTH' ? HALF_POWER_DB : (spec.rippleDb ?? HALF_POWER_DB);
}

/** CHEBYSHEV_II takes the stopband's edge where one is given; then `band` is what must pass. */
function designEdge(spec: FamilySpecification, geometry: FamilyGeometry): number {
  return spec.family === 'CHEBYSHEV_II'
    ? (geometry.stopEdgeRad ?? geometry.bandEdgeRad)
    : geometry.bandEdgeRad;
}

function passEdgeOf(spec: FamilySpecification, geometry: FamilyGeometry): number | null {
  return spec.family === 'CHEBYSHEV_II' && geometry.stopEdgeRad === null ? null : geometry.bandEdgeRad;
}

function stopEdgeOf(spec: FamilySpecification, geometry: FamilyGeometry, order: number): number | null {
  if (geometry.stopEdgeRad !== null) return geometry.stopEdgeRad;
  if (spec.family === 'CHEBYSHEV_II') return geometry.bandEdgeRad;
  if (spec.family !== 'ELLIPTIC') return null;
  return naturalStopEdgeRad(order, {
    passEdgeRad: geometry.bandEdgeRad,
    rippleDb: spec.rippleDb!,
    rejectionDb: spec.rejectionDb!,
  });
}

function demandOf(spec: FamilySpecification, geometry: FamilyGeometry): OneBandDemand {
  return {
    centreRad: geometry.centreRad,
    passEdgeRad: geometry.bandEdgeRad,
    rippleDb: allowanceOf(spec),
    stops: [{ edgeRad: geometry.stopEdgeRad!, rejectionDb: spec.rejectionDb! }],
  };
}

function orderOf(spec: FamilySpecification, geometry: FamilyGeometry): number {
  return leastOrderOf(demandOf(spec, geometry), spec.family) ?? Number.POSITIVE_INFINITY;
}

/** An order too great for the core or the chip, or too small for the stopband that is demanded beside it. */
function requireWithin(
  spec: FamilySpecification,
  geometry: FamilyGeometry,
  order: number,
  capacity: Capacity,
  fsrGhz: number,
): void {
  if (order > capacity.order) refuseOrder(spec, geometry, order, capacity, fsrGhz);
  if (spec.order === undefined || geometry.stopEdgeRad === null || spec.rejectionDb === undefined) return;
  const reach = reachableRejectionDb(spec.family, order, {
    passEdgeRad: geometry.bandEdgeRad,
    stopEdgeRad: geometry.stopEdgeRad,
    rippleDb: allowanceOf(spec),
  });
  if (reach < spec.rejectionDb - 1e-6)
    refuseOrder(
      spec,
      geometry,
      orderOf(spec, geometry),
      { order, halfBandOrder: order, limit: 'ORDER' },
      fsrGhz,
    );
}

function maskBands(
  spec: FamilySpecification,
  centreRad: number,
  passRad: number,
  stopRad: number | null,
  fsrGhz: number,
): Band[] {
  const toGhz = (angle: number): number => (angle * fsrGhz) / TURN;
  const around = (middleRad: number, halfRad: number): IntervalGhz => ({
    lowGhz: toGhz(middleRad - halfRad),
    highGhz: toGhz(middleRad + halfRad),
  });
  const bands: Band[] = [
    {
      ...around(centreRad, passRad),
      minTransmissionDb: -allowanceOf(spec),
      output: spec.output,
      label: 'passband',
    },
  ];
  if (stopRad !== null && spec.rejectionDb !== undefined) {
    bands.push({
      ...(spec.stopband ?? around(centreRad + Math.PI, Math.PI - stopRad)),
      maxTransmissionDb: -spec.rejectionDb,
      output: spec.output,
      label: 'stopband',
    });
  }
  return bands;
}

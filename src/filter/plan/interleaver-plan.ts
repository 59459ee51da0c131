/**
 * Interleaver: both outputs of one power-symmetric half-band filter, channels half an FSR apart. `band` is the channel
 * window: within it the neighbour's output must be down by `rejectionDb`. Half-band power symmetry needs an odd order,
 * Butterworth or the matched elliptic filter, whose isolation A fixes the ripple at −10·log10(1 − 10^(−A/10)).
 */
import { HALF_POWER_DB } from '../../conventions.ts';
import { Refusal } from '../../errors.ts';
import { rotateFilter } from '../bands.ts';
import { complementOfHalfBand } from '../complement.ts';
import {
  designHalfBand,
  type HalfBandFamily,
  halfBandIsolationDb,
  halfBandStopEdgeRad,
} from '../half-band.ts';
import type { Band, FamilySpecification, OutputPort } from '../specification.ts';
import { complementDb } from './demand.ts';
import { invalid } from './family-demand.ts';
import { type Capacity, type FilterPlan, MAX_DESIGN_ORDER } from './plan.ts';
import { describeCapacity, describeOrder, typedRejectionDb } from './refuse-order.ts';

const TURN = 2 * Math.PI;
const AT = '/specification/family';

/** Channel spacing and FSR/2 may differ by rounding of units only. */
const GRID_TOLERANCE = 1e-6;

/** dB by which a demand may be missed by rounding alone. */
const ROUNDING_DB = 1e-6;

/** Half the power: no isolation of two complementary outputs is less. */
const LEAST_ISOLATION_DB = HALF_POWER_DB;

export function planInterleaver(spec: FamilySpecification, fsrGhz: number, capacity: Capacity): FilterPlan {
  const family = halfBandFamily(spec);
  requireMembers(spec, fsrGhz);
  const stopEdgeRad = windowStopEdge(spec, fsrGhz);
  const order = spec.order ?? leastOrder(spec, family, stopEdgeRad!, capacity);
  requireOrder(spec, family, order, stopEdgeRad, capacity);
  const edgeRad =
    stopEdgeRad ??
    (spec.rejectionDb === undefined ? null : halfBandStopEdgeRad(family, order, spec.rejectionDb));
  const prototype = designHalfBand({
    family,
    order,
    ...(family === 'ELLIPTIC' ? { stopEdgeRad: edgeRad! } : {}),
  });
  const centreRad = (TURN * spec.centreGhz) / fsrGhz;
  const filter = rotateFilter(prototype, centreRad);
  const isolationDb = edgeRad === null ? null : halfBandIsolationDb(family, order, edgeRad);
  return {
    family,
    order,
    output: spec.output,
    centreRad,
    passEdgeRad: edgeRad === null ? Math.PI / 2 : Math.PI - edgeRad,
    stopEdgeRad: edgeRad,
    rippleDb: isolationDb === null ? HALF_POWER_DB : -complementDb(-isolationDb),
    rejectionDb: spec.rejectionDb ?? isolationDb,
    filter,
    complement: () => complementOfHalfBand(filter),
    mask: { bands: windowBands(spec, edgeRad, isolationDb, fsrGhz), reference: 'PEAK' },
  };
}

function halfBandFamily(spec: FamilySpecification): HalfBandFamily {
  if (spec.family === 'BUTTERWORTH' || spec.family === 'ELLIPTIC') return spec.family;
  invalid(
    'family',
    'Only BUTTERWORTH and matched ELLIPTIC half-band filters are power symmetric, which both outputs of an interleaver need.',
    spec.family,
    ['BUTTERWORTH', 'ELLIPTIC'],
    {
      reason: 'the elliptic half-band',
      value: 'ELLIPTIC',
    },
  );
}

function requireMembers(spec: FamilySpecification, fsrGhz: number): void {
  if (spec.stopband)
    invalid(
      'stopband',
      "An INTERLEAVER takes its channel window as `band`; the stopband is the neighbour's window.",
      spec.stopband,
      'absent',
      { reason: 'without it', value: null },
    );
  if (spec.gridGhz !== undefined && Math.abs(spec.gridGhz / (fsrGhz / 2) - 1) > GRID_TOLERANCE) {
    throw new Refusal({
      code: 'SPECIFICATION_UNREACHABLE',
      limit: 'FREE_SPECTRAL_RANGE',
      detail: `Channels ${spec.gridGhz} GHz apart need a chip with a free spectral range of ${2 * spec.gridGhz} GHz; this one has ${fsrGhz} GHz and interleaves channels ${fsrGhz / 2} GHz apart.`,
      pointer: `${AT}/gridGhz`,
      given: spec.gridGhz,
      allowed: fsrGhz / 2,
      nearest: [
        {
          reason: "this chip's own spacing",
          changes: [{ pointer: `${AT}/gridGhz`, given: spec.gridGhz, works: fsrGhz / 2, unit: 'GHz' }],
        },
      ],
    });
  }
  if (spec.rejectionDb !== undefined && spec.rejectionDb <= LEAST_ISOLATION_DB) {
    invalid(
      'rejectionDb',
      'Two power-complementary outputs are isolated by more than half the power.',
      spec.rejectionDb,
      { above: LEAST_ISOLATION_DB, unit: 'dB' },
      { reason: 'an isolation of 20 dB', value: 20, unit: 'dB' },
    );
  }
  const known =
    spec.order !== undefined &&
    (spec.family === 'BUTTERWORTH' || spec.rejectionDb !== undefined || spec.band);
  if (known || (spec.band && spec.rejectionDb !== undefined)) return;
  const member = spec.rejectionDb === undefined ? 'rejectionDb' : 'band';
  invalid(
    member,
    'An INTERLEAVER needs its order and isolation, its order and channel window, or channel window and isolation.',
    null,
    'two of order, band (channel window) and rejectionDb (isolation)',
  );
}

/** Ω from which the neighbour's output must be down: the far side of the channel window. */
function windowStopEdge(spec: FamilySpecification, fsrGhz: number): number | null {
  if (!spec.band) return null;
  const width = spec.band.highGhz - spec.band.lowGhz;
  const middle = (spec.band.highGhz + spec.band.lowGhz) / 2;
  const centred = Math.abs(middle - spec.centreGhz) <= 1e-9 * fsrGhz;
  if (width > 0 && width < fsrGhz / 2 && centred) return Math.PI - (Math.PI * width) / fsrGhz;
  const half = width > 0 && width < fsrGhz / 2 ? width / 2 : fsrGhz / 8;
  invalid(
    'band',
    `The channel window must be centred on ${spec.centreGhz} GHz and narrower than the channel spacing of ${fsrGhz / 2} GHz.`,
    spec.band,
    { centreGhz: spec.centreGhz, belowWidth: fsrGhz / 2, unit: 'GHz' },
    {
      reason: 'a window around the centre',
      value: { lowGhz: spec.centreGhz - half, highGhz: spec.centreGhz + half },
      unit: 'GHz',
    },
  );
}

function leastOrder(
  spec: FamilySpecification,
  family: HalfBandFamily,
  stopEdgeRad: number,
  capacity: Capacity,
): number {
  for (let order = 1; order <= MAX_DESIGN_ORDER; order += 2) {
    if (halfBandIsolationDb(family, order, stopEdgeRad) >= spec.rejectionDb! - ROUNDING_DB) return order;
  }
  return refuse(spec, family, Number.POSITIVE_INFINITY, stopEdgeRad, capacity);
}

function requireOrder(
  spec: FamilySpecification,
  family: HalfBandFamily,
  order: number,
  stopEdgeRad: number | null,
  capacity: Capacity,
): void {
  if (order % 2 === 0) {
    invalid('order', 'Half-band power symmetry needs an odd order.', order, 'odd', {
      reason: 'the next lower odd order',
      value: order - 1,
    });
  }
  if (order > capacity.halfBandOrder) refuse(spec, family, order, stopEdgeRad, capacity);
  if (stopEdgeRad === null || spec.rejectionDb === undefined) return;
  if (halfBandIsolationDb(family, order, stopEdgeRad) < spec.rejectionDb - ROUNDING_DB) {
    const needed = leastOrder(spec, family, stopEdgeRad, capacity);
    refuse(spec, family, needed, stopEdgeRad, { order, halfBandOrder: order, limit: 'ORDER' });
  }
}

function refuse(
  spec: FamilySpecification,
  family: HalfBandFamily,
  needed: number,
  stopEdgeRad: number | null,
  capacity: Capacity,
): never {
  const most = capacity.halfBandOrder;
  const changes = [];
  if (spec.order !== undefined && most >= 1 && spec.order > most)
    changes.push({ pointer: `${AT}/order`, given: spec.order, works: most });
  if (stopEdgeRad !== null && spec.rejectionDb !== undefined && most >= 1) {
    const typed = typedRejectionDb(halfBandIsolationDb(family, most, stopEdgeRad), LEAST_ISOLATION_DB);
    if (typed !== null && typed < spec.rejectionDb)
      changes.push({ pointer: `${AT}/rejectionDb`, given: spec.rejectionDb, works: typed, unit: 'dB' });
  }
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit: capacity.limit,
    detail: `This ${family} interleaver needs ${describeOrder(needed)}; ${describeCapacity({ ...capacity, order: most })} (half-band filters are odd).`,
    pointer: spec.order === undefined ? `${AT}/rejectionDb` : `${AT}/order`,
    given: spec.order ?? spec.rejectionDb ?? null,
    allowed: { maxOrder: most },
    nearest: changes.length > 0 ? [{ reason: 'what this order isolates', changes }] : [],
  });
}

/** Isolation in the windows of both outputs; with `rippleDb`, also what may be lost within each window. */
function windowBands(
  spec: FamilySpecification,
  stopEdgeRad: number | null,
  isolationDb: number | null,
  fsrGhz: number,
): Band[] {
  const other: OutputPort = spec.output === 'OUT1' ? 'OUT2' : 'OUT1';
  const half = stopEdgeRad === null ? fsrGhz / 4 : ((Math.PI - stopEdgeRad) * fsrGhz) / TURN;
  const around = (middle: number) => ({ lowGhz: middle - half, highGhz: middle + half });
  const passDb = -(spec.rippleDb ?? HALF_POWER_DB);
  const own = around(spec.centreGhz);
  const neighbour = around(spec.centreGhz + fsrGhz / 2);
  const bands: Band[] = [
    { ...own, minTransmissionDb: passDb, output: spec.output, label: 'own channel' },
    { ...neighbour, minTransmissionDb: passDb, output: other, label: 'neighbour channel' },
  ];
  const demandDb = spec.rejectionDb ?? isolationDb;
  if (stopEdgeRad === null || demandDb === null) return bands;
  return [
    ...bands,
    { ...neighbour, maxTransmissionDb: -demandDb, output: spec.output, label: 'neighbour isolation' },
    { ...own, maxTransmissionDb: -demandDb, output: other, label: 'own isolation' },
  ];
}

import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { Refusal } from '../../src/errors.ts';
import {
  butterworthEdgeRad,
  designEdges,
  designLowPass,
  type Family,
  type LowPassDemand,
  leastOrder,
  MAX_ORDER,
  naturalStopEdgeRad,
  reachablePassEdgeRad,
  reachableRejectionDb,
  reachableRippleDb,
  reachableStopEdgeRad,
  transmissionAt,
} from '../../src/filter/index.ts';
import { familyNamed, type Pair, readReference } from './reference.ts';

interface OrderEntry {
  fn: string;
  pass: number;
  stop: number;
  rippleDb: number;
  rejectionDb: number;
  order: number;
  edge: number;
}

const orders = readReference<{
  grid: (OrderEntry & { exactOrder: number })[];
  published: (OrderEntry & { id: string; domain: string })[];
}>('orders');
const book = readReference<{
  bilinearButterworth: {
    published: { N_exact: number; N: number; Omega_c: number };
    exact: { N_exact: number; Omega_c: number; passband_gain_at_wp: number };
  };
}>('textbooks').bilinearButterworth;
const prototypes = readReference<{
  tables: {
    family: Family;
    order: number;
    rippleDb: number;
    rejectionDb: number;
    stopEdge?: number;
    k1?: number;
    zeros: Pair[];
  }[];
  hard: { order: number; rippleDb: number; rejectionDb: number; stopEdgeExcess: number }[];
}>('analog-prototypes');

/** Relative; closed forms in double precision. */
const CLOSED_FORM = 1e-10;

/** The demand as a low-pass; a high-pass (pass above stop) is mirrored at half an FSR. */
function demandOf(
  entry: OrderEntry,
  toRad: (edge: number) => number,
): { demand: LowPassDemand; mirrored: boolean } {
  const mirrored = entry.pass > entry.stop;
  const edge = (value: number): number => (mirrored ? Math.PI - toRad(value) : toRad(value));
  const demand = {
    passEdgeRad: edge(entry.pass),
    stopEdgeRad: edge(entry.stop),
    rippleDb: entry.rippleDb,
    rejectionDb: entry.rejectionDb,
  };
  return { demand, mirrored };
}

const digital = (nyquist: number): number => nyquist * Math.PI;
const analog = (w: number): number => 2 * Math.atan(w);

describe('least order', () => {
  it.each(orders.grid)('$fn $pass $stop $rippleDb $rejectionDb: order $order [cross-check]', (entry) => {
    const family = familyNamed(entry.fn);
    const { demand, mirrored } = demandOf(entry, digital);
    if (entry.order > MAX_ORDER) {
      expect(() => leastOrder(family, demand)).toThrow(new RegExp(`order ${entry.order};`));
      return;
    }
    const least = leastOrder(family, demand);
    expect(least.order).toBe(entry.order);
    expect(Math.abs(least.exactOrder / entry.exactOrder - 1)).toBeLessThan(CLOSED_FORM);
    const low = designEdges(family, least.order, demand).lowRad;
    expect((mirrored ? Math.PI - low : low) / Math.PI).toBeCloseTo(entry.edge, 9);
  });

  it.each(orders.published)('$id as recorded elsewhere [cross-check]', (entry) => {
    const family = familyNamed(entry.fn);
    const { demand, mirrored } = demandOf(entry, entry.domain === 's' ? analog : digital);
    const { order } = leastOrder(family, demand);
    expect(order).toBe(entry.order);
    const edges = designEdges(family, order, demand);
    // the recorded Butterworth edges meet the stopband exactly, the others the passband
    const edge = family === 'BUTTERWORTH' ? edges.highRad : edges.lowRad;
    const native = entry.domain === 's' ? Math.tan(edge / 2) : (mirrored ? Math.PI - edge : edge) / Math.PI;
    expect(Math.abs(native / entry.edge - 1)).toBeLessThan(1e-9);
  });

  it('the bilinear Butterworth of the textbook: N = 6, Ω_c = 0.766 [published]', () => {
    // Oppenheim and Schafer, Discrete-Time Signal Processing, Example 7.3 (T_d = 1, so Ω_c = 2·tan(edge/2))
    const demand = {
      passEdgeRad: 0.2 * Math.PI,
      stopEdgeRad: 0.3 * Math.PI,
      rippleDb: -20 * Math.log10(0.89125),
      rejectionDb: -20 * Math.log10(0.17783),
    };
    const { order, exactOrder } = leastOrder('BUTTERWORTH', demand);
    expect(order).toBe(book.published.N);
    expect(Math.abs(exactOrder - book.published.N_exact)).toBeLessThan(2e-3);
    expect(Math.abs(exactOrder / book.exact.N_exact - 1)).toBeLessThan(1e-12);
    const { highRad } = designEdges('BUTTERWORTH', order, demand);
    expect(Math.abs(2 * Math.tan(highRad / 2) - book.published.Omega_c)).toBeLessThan(5e-4);
    expect(Math.abs((2 * Math.tan(highRad / 2)) / book.exact.Omega_c - 1)).toBeLessThan(1e-12);
    const filter = designLowPass({ family: 'BUTTERWORTH', order, edgeRad: highRad });
    const atPassEdge = Math.sqrt(transmissionAt(filter, demand.passEdgeRad));
    expect(atPassEdge).toBeCloseTo(book.exact.passband_gain_at_wp, 12);
  });
});

describe('what an order reaches', () => {
  it('the natural stopband edge of elliptic filters as tabulated, to selectivity 1 [cross-check]', () => {
    const tables = prototypes.tables.filter((entry) => entry.stopEdge !== undefined);
    expect(tables.length).toBeGreaterThanOrEqual(36);
    for (const { order, rippleDb, rejectionDb, stopEdge } of tables) {
      const stop = naturalStopEdgeRad(order, { passEdgeRad: Math.PI / 2, rippleDb, rejectionDb });
      expect(Math.abs(Math.tan(stop / 2) / stopEdge! - 1)).toBeLessThan(1e-12 * stopEdge!);
    }
    for (const { order, rippleDb, rejectionDb, stopEdgeExcess } of prototypes.hard) {
      const stop = naturalStopEdgeRad(order, { passEdgeRad: Math.PI / 2, rippleDb, rejectionDb });
      expect(Math.abs(Math.tan(stop / 2) - 1 - stopEdgeExcess)).toBeLessThan(
        2e-14 * (1 + stopEdgeExcess) ** 2,
      );
    }
  });

  const families = fc.constantFrom<Family>('BUTTERWORTH', 'CHEBYSHEV_I', 'CHEBYSHEV_II', 'ELLIPTIC');
  const demands = fc
    .record({
      passEdgeRad: fc.double({ min: 0.05, max: 2.5, noNaN: true }),
      gap: fc.double({ min: 0.02, max: 0.9, noNaN: true }),
      rippleDb: fc.double({ min: 0.001, max: 2, noNaN: true }),
      rejectionDb: fc.double({ min: 10, max: 80, noNaN: true }),
    })
    .map(({ gap, ...rest }) => ({ ...rest, stopEdgeRad: rest.passEdgeRad + gap * (3.1 - rest.passEdgeRad) }));
  const smallOrders = fc.integer({ min: 1, max: 9 });

  it('is what the designed filter does at the edges [property]', () => {
    fc.assert(
      fc.property(families, smallOrders, demands, (family, order, demand) => {
        const rejectionDb = reachableRejectionDb(family, order, demand);
        fc.pre(rejectionDb > demand.rippleDb + 1 && rejectionDb < 120);
        const full = { ...demand, rejectionDb };
        const edges = designEdges(family, order, full);
        expect(edges.lowRad).toBeCloseTo(edges.highRad, 9);
        const filter = designLowPass({ ...full, family, order, edgeRad: edges.lowRad });
        const pass = -10 * Math.log10(transmissionAt(filter, demand.passEdgeRad));
        const stop = -10 * Math.log10(transmissionAt(filter, demand.stopEdgeRad));
        expect(Math.abs(pass - demand.rippleDb)).toBeLessThan(1e-7);
        expect(Math.abs(stop - rejectionDb)).toBeLessThan(1e-6);
      }),
      { numRuns: 300, seed: 31 },
    );
  });

  it('is one surface, whichever of its four numbers is asked for [property]', () => {
    fc.assert(
      fc.property(families, smallOrders, demands, (family, order, demand) => {
        const rejectionDb = reachableRejectionDb(family, order, demand);
        fc.pre(rejectionDb > demand.rippleDb + 1e-3 && rejectionDb < 250);
        const full = { ...demand, rejectionDb };
        expect(reachableRippleDb(family, order, full) / demand.rippleDb).toBeCloseTo(1, 7);
        expect(reachableStopEdgeRad(family, order, full)).toBeCloseTo(demand.stopEdgeRad, 8);
        expect(reachablePassEdgeRad(family, order, full)).toBeCloseTo(demand.passEdgeRad, 8);
        expect(leastOrder(family, full).exactOrder / order).toBeCloseTo(1, 7);
      }),
      { numRuns: 300, seed: 32 },
    );
  });

  it('the least order is met and one less is not [property]', () => {
    fc.assert(
      fc.property(families, demands, (family, demand) => {
        fc.pre(demand.stopEdgeRad - demand.passEdgeRad > 0.3);
        const { order } = leastOrder(family, demand);
        const slack = 1e-6;
        expect(reachableRejectionDb(family, order, demand)).toBeGreaterThan(demand.rejectionDb - slack);
        if (order === 1) return;
        expect(reachableRejectionDb(family, order - 1, demand)).toBeLessThan(demand.rejectionDb + slack);
      }),
      { numRuns: 300, seed: 33 },
    );
  });

  it('a Butterworth edge puts the asked attenuation where it is asked [property]', () => {
    const edgeRad = butterworthEdgeRad(5, 0.4, 0.05);
    const filter = designLowPass({ family: 'BUTTERWORTH', order: 5, edgeRad });
    expect(-10 * Math.log10(transmissionAt(filter, 0.4))).toBeCloseTo(0.05, 11);
  });

  it('refuses crossed edges, edges beyond half an FSR and rejections below the ripple [property]', () => {
    const good = { passEdgeRad: 1, stopEdgeRad: 2, rippleDb: 1, rejectionDb: 40 };
    const wrong: Partial<LowPassDemand>[] = [
      { passEdgeRad: 2 },
      { stopEdgeRad: 4 },
      { passEdgeRad: Number.NaN },
      { rippleDb: -1 },
      { rejectionDb: 0.5 },
      { rejectionDb: Number.POSITIVE_INFINITY },
    ];
    for (const change of wrong) expect(() => leastOrder('ELLIPTIC', { ...good, ...change })).toThrow(Refusal);
  });
});

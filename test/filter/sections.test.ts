import { Complex } from 'complex.js';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  allPairings,
  cascadeCostDb,
  designLowPass,
  type FilterSection,
  findPeak,
  mirroredPairings,
  naturalStopEdgeRad,
  type Pairing,
  pairPoles,
  passiveSection,
  rotateFilter,
  toSections,
  transmissionAt,
} from '../../src/filter/index.ts';
import { anyLowPass, fieldOf, roundingBound } from './designs.ts';
import { readReference } from './reference.ts';

const book = readReference<{
  bilinearButterworth: {
    published: { sections_a1_a2: [number, number][]; H_gain: number };
    exact: { sections_a1_a2: [number, number][]; gain: number; Omega_c: number };
  };
}>('textbooks').bilinearButterworth;

const fourthOrder = designLowPass({
  family: 'ELLIPTIC',
  order: 4,
  edgeRad: Math.PI / 2,
  rippleDb: 2,
  rejectionDb: 40,
});

/** Every position used once. */
function isComplete(pairing: Pairing, order: number): boolean {
  const whole = Array.from({ length: order }, (_, index) => index).join();
  const used = (of: 'poles' | 'zeros'): string =>
    pairing
      .flatMap((roots) => [...roots[of]])
      .sort((a, b) => a - b)
      .join();
  return used('poles') === whole && used('zeros') === whole;
}

describe('sections', () => {
  it("of the textbook's sixth-order Butterworth, to the printed digits [published]", () => {
    // Oppenheim and Schafer, Discrete-Time Signal Processing, Example 7.3
    const edgeRad = 2 * Math.atan(book.exact.Omega_c / 2);
    const filter = designLowPass({ family: 'BUTTERWORTH', order: 6, edgeRad });
    expect(Math.abs(filter.gain.re / book.exact.gain - 1)).toBeLessThan(1e-12);
    expect(Math.abs(filter.gain.re / book.published.H_gain - 1)).toBeLessThan(1e-4);
    const sections = toSections(filter, pairPoles(filter));
    book.exact.sections_a1_a2.forEach(([a1, a2], index) => {
      const [p, q] = sections[index]!.poles as [Complex, Complex];
      expect(Math.abs(-(p.re + q.re) - a1)).toBeLessThan(1e-12);
      expect(Math.abs(p.mul(q).re - a2)).toBeLessThan(1e-12);
      expect(Math.abs(a1 - book.published.sections_a1_a2[index]![0])).toBeLessThan(1e-4);
    });
  });

  it('multiply to the filter, gain and phase included, rotated or not [property]', () => {
    const angle = fc.double({ min: -3, max: 3, noNaN: true });
    fc.assert(
      fc.property(anyLowPass(), angle, angle, (ask, centreRad, omegaRad) => {
        const filter = rotateFilter(designLowPass(ask), centreRad);
        const pairing = pairPoles(filter, centreRad);
        expect(isComplete(pairing, ask.order)).toBe(true);
        const sections = toSections(filter, pairing);
        const product = sections.reduce((field, section) => {
          const [here] = fieldOf(section, [omegaRad]) as [{ re: number; im: number }];
          return field.mul(new Complex(here.re, here.im));
        }, new Complex(1, 0));
        const [whole] = fieldOf(filter, [omegaRad]) as [{ re: number; im: number }];
        expect(product.sub(new Complex(whole.re, whole.im)).abs()).toBeLessThan(10 * roundingBound(filter));
      }),
      { numRuns: 100, seed: 61 },
    );
  });

  it('pair conjugates, mirrored about the centre after a rotation [property]', () => {
    const centreRad = 1.1;
    fc.assert(
      fc.property(anyLowPass(10), (ask) => {
        const filter = rotateFilter(designLowPass(ask), centreRad);
        for (const { poles, zeros } of pairPoles(filter, centreRad)) {
          expect(zeros.length).toBe(poles.length);
          const back = poles.map((pole) =>
            filter.poles[pole]!.mul(new Complex(Math.cos(centreRad), -Math.sin(centreRad))),
          );
          expect(Math.abs(back.reduce((sum, pole) => sum + pole.im, 0))).toBeLessThan(1e-13);
        }
      }),
      { numRuns: 60, seed: 62 },
    );
  });

  it('share the peak equally, and it is the greatest of a dense grid [property]', () => {
    for (const pairing of allPairings(fourthOrder)) {
      const sections = toSections(fourthOrder, pairing);
      for (const section of sections) {
        let greatest = 0;
        for (let omegaRad = -Math.PI; omegaRad < Math.PI; omegaRad += 1e-3) {
          greatest = Math.max(greatest, transmissionAt(section, omegaRad));
        }
        const greatestDb = 10 * Math.log10(greatest);
        expect(greatestDb).toBeLessThan(section.peakDb + 1e-12);
        // within half a step of the peak, whose curvature is below 1/(1 − |p|)² = 400
        expect(greatestDb).toBeGreaterThan(section.peakDb - 1e-3);
        expect(section.peakDb).toBeCloseTo(sections[0]!.peakDb, 10);
        expect(findPeak(passiveSection(section)).transmission).toBeCloseTo(1, 12);
      }
    }
  });

  it('cost the fourth-order elliptic half-band (2 dB, 40 dB) about 10.5 dB when each is passive [cross-check]', () => {
    // common practice, no source for the filter; cost and natural stop edge 0.607π computed apart with NumPy and SciPy
    const stopEdge = naturalStopEdgeRad(4, { passEdgeRad: Math.PI / 2, rippleDb: 2, rejectionDb: 40 });
    expect(stopEdge / Math.PI).toBeCloseTo(0.607, 3);
    const cost = cascadeCostDb(toSections(fourthOrder, pairPoles(fourthOrder)));
    expect(cost).toBeCloseTo(10.5, 1);
    const rotated = rotateFilter(fourthOrder, 0.8);
    expect(cascadeCostDb(toSections(rotated, pairPoles(rotated, 0.8)))).toBeCloseTo(cost, 10);
  });

  it('by the heuristic cost no more than any other mirrored pairing of this filter [property]', () => {
    const costs = [...mirroredPairings(fourthOrder)].map((pairing) =>
      cascadeCostDb(toSections(fourthOrder, pairing)),
    );
    expect(costs.length).toBe(2);
    expect(cascadeCostDb(toSections(fourthOrder, pairPoles(fourthOrder)))).toBeCloseTo(
      Math.min(...costs),
      12,
    );
  });
});

describe('pairings', () => {
  it.each([
    [1, 1, 1],
    [2, 1, 1],
    [3, 1, 9],
    [4, 2, 18],
    [5, 2, 450],
    [6, 6, 1350],
  ])(
    'of order %i: %i mirrored, %i in all, each complete and no two alike [property]',
    (order, mirrored, all) => {
      // matchings of 2m positions number (2m − 1)!!, of 2m + 1 positions (2m + 1)!!
      const filter = designLowPass({ family: 'ELLIPTIC', order, edgeRad: 1, rippleDb: 0.5, rejectionDb: 40 });
      const some = [...mirroredPairings(filter)];
      const every = [...allPairings(filter)];
      expect(some.length).toBe(mirrored);
      expect(every.length).toBe(all);
      for (const pairing of [...some, ...every]) expect(isComplete(pairing, order)).toBe(true);
      expect(new Set(every.map((pairing) => JSON.stringify(pairing))).size).toBe(all);
    },
  );
});

describe('the peak of a filter', () => {
  it('is found where a ring-narrow pole puts it [published]', () => {
    // one pole p = r·e^{jθ}, no zeros: |1/(e^{jΩ} − p)|² has its maximum 1/(1 − r)² at θ
    const one = new Complex(1, 0);
    for (const distance of [0.5, 1e-3, 1e-6]) {
      const pole = new Complex((1 - distance) * Math.cos(2), (1 - distance) * Math.sin(2));
      const peak = findPeak({ zeros: [], poles: [pole], gain: one });
      expect(peak.omegaRad).toBeCloseTo(2, 9);
      expect(Math.abs(peak.transmission * distance ** 2 - 1)).toBeLessThan(1e-15 / distance + 1e-13);
    }
  });

  it('is above every point of a random grid [property]', () => {
    const roots = fc.array(
      fc.record({
        r: fc.double({ min: 0, max: 0.97, noNaN: true }),
        at: fc.double({ min: -3, max: 3, noNaN: true }),
      }),
      { minLength: 2, maxLength: 4 },
    );
    const place = (list: readonly { r: number; at: number }[]): Complex[] =>
      list.map(({ r, at }) => new Complex(r * Math.cos(at), r * Math.sin(at)));
    fc.assert(
      fc.property(roots, roots, fc.integer({ min: 1, max: 1000 }), (poles, zeros, shift) => {
        const section: FilterSection = {
          zeros: place(zeros),
          poles: place(poles),
          gain: new Complex(1, 0),
          peakDb: 0,
        };
        const { transmission } = findPeak(section);
        for (let point = 0; point < 400; point++) {
          const omegaRad = ((point + shift / 1000) * 2 * Math.PI) / 400;
          expect(transmissionAt(section, omegaRad)).toBeLessThanOrEqual(transmission * (1 + 1e-12));
        }
      }),
      { numRuns: 60, seed: 63 },
    );
  });
});

/**
 * Power-symmetric half-band low-pass filters, for interleavers: |H(Ω)|² + |H(π − Ω)|² = 1, so that both outputs of one
 * circuit are the same channel filter half an FSR apart. Odd order; Butterworth, or the elliptic filter matched so that
 * the two ripples satisfy ε_p·ε_s = 1, ripple = −10·log₁₀(1 − 10^(−A/10)) for an isolation A.
 *
 * Sources: P. P. Vaidyanathan, "Multirate Systems and Filter Banks", Prentice Hall 1993, chapter 5; L. Gazsi,
 * "Explicit formulas for lattice wave digital filters", IEEE Trans. CAS 32, 68 (1985).
 *
 * With the edges' geometric mean at 1 the poles lie on |s| = 1, s = e^{jθ}, and go to z = j·cot(θ/2): exactly on the
 * imaginary axis, one of them at 0.
 */
import { Complex } from 'complex.js';
import { Refusal } from '../errors.ts';
import { scaleEdge } from './bands.ts';
import { bilinear, prewarp, unwarp } from './bilinear.ts';
import { wholeOrder } from './discrimination.ts';
import {
  discriminationModulus,
  inverseSnImaginary,
  logNome,
  type Modulus,
  selectivityModulus,
} from './elliptic.ts';
import { type AnalogFilter, analogPrototype, ellipticOfModulus } from './families.ts';
import { guardEdge, guardOrder, guardReach, guardRejection, MAX_ORDER } from './guards.ts';
import { attenuationDb, rippleFactor } from './ripple-factor.ts';
import type { LabelledFilter } from './transfer-function.ts';

export type HalfBandFamily = 'BUTTERWORTH' | 'ELLIPTIC';

/** An elliptic half-band takes exactly one of isolation and stopband edge; a Butterworth one is fixed by its order. */
export interface HalfBandAsk {
  readonly family: HalfBandFamily;
  readonly order: number;
  readonly isolationDb?: number;
  /** In (π/2, π); the passband ends at π − stopEdgeRad. */
  readonly stopEdgeRad?: number;
}

function guardOdd(order: number): void {
  guardOrder(order);
  if (order % 2 === 1) return;
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    detail: 'A power-symmetric half-band filter has an odd order.',
    given: order,
    allowed: { nearest: [order - 1, order + 1].filter((odd) => odd <= MAX_ORDER) },
    limit: 'ORDER',
  });
}

function guardStopEdge(stopEdgeRad: number): void {
  guardEdge(stopEdgeRad);
  if (stopEdgeRad > Math.PI / 2) return;
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    detail:
      'The stopband of a half-band filter begins beyond a quarter of the free spectral range from its centre.',
    given: stopEdgeRad,
    allowed: { above: Math.PI / 2, below: Math.PI },
  });
}

/** k₁ = ε_p/ε_s = 1/ε_s² of an isolation. */
function discriminationOfIsolation(isolationDb: number): Modulus {
  const k = 1 / rippleFactor(isolationDb) ** 2;
  if (k < 1) return { k, complement: Math.sqrt((1 - k) * (1 + k)) };
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    detail: 'Two power-complementary outputs are isolated by more than half the power.',
    given: isolationDb,
    allowed: { above: attenuationDb(1) },
    limit: 'PASSIVITY',
  });
}

/** k = w_p/w_s = cot²(Ω_s/2), k'² = −4·cos Ω_s / (1 − cos Ω_s)². */
function selectivityOfStopEdge(stopEdgeRad: number): Modulus {
  const beyond = Math.sin(stopEdgeRad - Math.PI / 2); // −cos Ω_s
  return { k: prewarp(Math.PI - stopEdgeRad) ** 2, complement: (2 * Math.sqrt(beyond)) / (1 + beyond) };
}

/** Greatest isolation, dB, of an order from `stopEdgeRad` on. */
export function halfBandIsolationDb(family: HalfBandFamily, order: number, stopEdgeRad: number): number {
  guardOdd(order);
  guardStopEdge(stopEdgeRad);
  if (family === 'BUTTERWORTH') return attenuationDb(prewarp(stopEdgeRad) ** order);
  return attenuationDb(1 / Math.sqrt(discriminationModulus(order, selectivityOfStopEdge(stopEdgeRad)).k));
}

/** The nearest Ω from which on an order isolates by `isolationDb`. */
export function halfBandStopEdgeRad(family: HalfBandFamily, order: number, isolationDb: number): number {
  guardOdd(order);
  guardRejection(isolationDb);
  const discrimination = discriminationOfIsolation(isolationDb);
  if (family === 'BUTTERWORTH') return unwarp(rippleFactor(isolationDb) ** (1 / order));
  return unwarp(1 / Math.sqrt(selectivityModulus(order, discrimination).k));
}

/** The least odd order that isolates by `isolationDb` from `stopEdgeRad` on. */
export function leastHalfBandOrder(
  family: HalfBandFamily,
  demand: { readonly isolationDb: number; readonly stopEdgeRad: number },
): number {
  guardStopEdge(demand.stopEdgeRad);
  guardRejection(demand.isolationDb);
  const discrimination = discriminationOfIsolation(demand.isolationDb);
  const exact =
    family === 'BUTTERWORTH'
      ? Math.log(rippleFactor(demand.isolationDb)) / Math.log(prewarp(demand.stopEdgeRad))
      : logNome(discrimination) / logNome(selectivityOfStopEdge(demand.stopEdgeRad));
  const least = wholeOrder(exact);
  const order = least % 2 === 1 ? least : least + 1;
  guardReach(order, demand);
  return order;
}

function ellipticModuli(ask: HalfBandAsk): { discrimination: Modulus; selectivity: Modulus } {
  if (ask.isolationDb !== undefined && ask.stopEdgeRad === undefined) {
    guardRejection(ask.isolationDb);
    const discrimination = discriminationOfIsolation(ask.isolationDb);
    return { discrimination, selectivity: selectivityModulus(ask.order, discrimination) };
  }
  if (ask.stopEdgeRad !== undefined && ask.isolationDb === undefined) {
    guardStopEdge(ask.stopEdgeRad);
    const selectivity = selectivityOfStopEdge(ask.stopEdgeRad);
    return { selectivity, discrimination: discriminationModulus(ask.order, selectivity) };
  }
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    detail: 'An elliptic half-band filter of a given order takes either its isolation or its stopband edge.',
    given: { isolationDb: ask.isolationDb ?? null, stopEdgeRad: ask.stopEdgeRad ?? null },
  });
}

function analogHalfBand(ask: HalfBandAsk): AnalogFilter {
  if (ask.family === 'BUTTERWORTH') return analogPrototype({ family: 'BUTTERWORTH', order: ask.order });
  const { discrimination, selectivity } = ellipticModuli(ask);
  const ripple = Math.sqrt(discrimination.k);
  const poleParameter = inverseSnImaginary(1 / ripple, discrimination) / ask.order;
  return scaleEdge(ellipticOfModulus(ask.order, selectivity, poleParameter, 1), Math.sqrt(selectivity.k));
}

/** The half-band low-pass: half power at Ω = π/2, peak 1 at Ω = 0, poles on the imaginary axis. */
export function designHalfBand(ask: HalfBandAsk): LabelledFilter {
  guardOdd(ask.order);
  const analog = analogHalfBand(ask);
  const poles = analog.poles.map((pole) => {
    const isReal = pole.im === 0;
    return new Complex(0, isReal ? 0 : pole.im / (pole.abs() - pole.re));
  });
  return { ...bilinear(analog), poles };
}

/**
 * Input and output couplers that cannot be what the ideal wants, because they are fixed elsewhere or do not reach it.
 *
 * An output is a sum of the two arms' fields A₀, A₁ with the weights
 *   out1: w₀ = t_o·t_i, w₁ = κ_o·κ_i;   out2: w₀ = κ_o·t_i, w₁ = t_o·κ_i   (`conventions.ts`, product of the matrices).
 * Only w₁/w₀ shapes a response, the rest is a constant loss. With r = K/(1−K): (w₁/w₀)² is r_i·r_o on out1 and r_i/r_o on
 * out2, so a common error of both couplers cancels on out2, contrary errors on out1. Where the arms cancel, |w₀−w₁| is left:
 * |cos(α_i+α_o)| on out1, |sin(α_i−α_o)| on out2, α = asin√K.
 */
import type { OutputPort } from '../filter/specification.ts';
import { REACH_SLACK } from './arms.ts';
import type { Coupler } from './model.ts';
import type { EndCouplings } from './placed.ts';
import { outOfReach } from './refusals.ts';

/**
 * By how much an input or output coupler may miss what is wanted. With both off by this much to one side, one output still
 * has its null and loses 0.8 dB (4K(1−K) at K = 0.7), while nulls of the other are filled to −8 dB ((1−2K)²): beyond, too
 * little is left to call it the filter.
 */
export const LARGEST_OFF_BALANCE = 0.2;

export interface EndsRequest {
  /** `cell1.input.coupling`, `cell2.output.coupling`. */
  readonly inputPath: string;
  readonly outputPath: string;
  readonly input: Coupler;
  readonly output: Coupler;
  readonly wanted: EndCouplings;
  readonly port: OutputPort;
  readonly bothOutputs: boolean;
}

export interface TakenEnds extends EndCouplings {
  /** Σ|K − wanted|; 0 where both are met. */
  readonly couplersOff: number;
  /** Field that is left or missing where the ideal's arms cancel, on the output that carries the filter, or on the worse of two. */
  readonly nullField: number;
}

export const otherOf = (port: OutputPort): OutputPort => (port === 'OUT1' ? 'OUT2' : 'OUT1');

/** [w₀, w₁] of an output. */
export function armWeights(
  { inputCoupling, outputCoupling }: EndCouplings,
  port: OutputPort,
): [number, number] {
  const [ti, to] = [Math.sqrt(1 - inputCoupling), Math.sqrt(1 - outputCoupling)];
  const [ki, ko] = [Math.sqrt(inputCoupling), Math.sqrt(outputCoupling)];
  return port === 'OUT1' ? [to * ti, ko * ki] : [ko * ti, to * ki];
}

/** 0 where the response has the wanted shape; |w₀−w₁| where the wanted weights are ½ and ½. */
function missedNull(taken: EndCouplings, wanted: EndCouplings, port: OutputPort): number {
  const [w0, w1] = armWeights(taken, port);
  const [v0, v1] = armWeights(wanted, port);
  return 2 * Math.abs(w1 * v0 - w0 * v1);
}

export const isMet = (value: number, wanted: number): boolean => Math.abs(value - wanted) <= REACH_SLACK;

function clampNear(coupler: Coupler, value: number, wanted: number): number {
  const low = Math.max(coupler.minCoupling, wanted - LARGEST_OFF_BALANCE);
  const high = Math.min(coupler.maxCoupling, wanted + LARGEST_OFF_BALANCE);
  return Math.min(high, Math.max(low, value));
}

function nearest(path: string, coupler: Coupler, wanted: number): number {
  const value = Math.min(coupler.maxCoupling, Math.max(coupler.minCoupling, wanted));
  if (Math.abs(value - wanted) > LARGEST_OFF_BALANCE + REACH_SLACK)
    throw outOfReach(path, wanted, coupler, LARGEST_OFF_BALANCE);
  return value;
}

const odds = (coupling: number): number => coupling / (1 - coupling);

/** The other end's K that keeps w₁/w₀ on the port, given what one end takes; not a number where no K does. */
function partnerOf(taken: number, wanted: number, wantedPartner: number, port: OutputPort): number {
  const change = odds(taken) / odds(wanted);
  const partnerOdds = odds(wantedPartner) * (port === 'OUT2' ? change : 1 / change);
  return partnerOdds / (1 + partnerOdds);
}

function withMisses(taken: EndCouplings, { wanted, port, bothOutputs }: EndsRequest): TakenEnds {
  const off = (value: number, ideal: number) => (isMet(value, ideal) ? 0 : Math.abs(value - ideal));
  const ports = bothOutputs ? [port, otherOf(port)] : [port];
  return {
    ...taken,
    couplersOff:
      off(taken.inputCoupling, wanted.inputCoupling) + off(taken.outputCoupling, wanted.outputCoupling),
    nullField: Math.max(...ports.map((one) => missedNull(taken, wanted, one))),
  };
}

/**
 * Both couplings as wanted, or as near as they come: each the nearest value it can have, or, where that keeps the null of
 * the output that matters better, one of them moved along with the other. Throws a Refusal COUPLING_RANGE where a coupler
 * stays further from what is wanted than `LARGEST_OFF_BALANCE`.
 */
export function takeEnds(request: EndsRequest): TakenEnds {
  const { input, output, wanted, port, bothOutputs } = request;
  const inputCoupling = nearest(request.inputPath, input, wanted.inputCoupling);
  const outputCoupling = nearest(request.outputPath, output, wanted.outputCoupling);
  const each = withMisses({ inputCoupling, outputCoupling }, request);
  if (each.couplersOff === 0) return { ...each, nullField: 0 };
  if (bothOutputs) return each;
  const follow = partnerOf(inputCoupling, wanted.inputCoupling, wanted.outputCoupling, port);
  const lead = partnerOf(outputCoupling, wanted.outputCoupling, wanted.inputCoupling, port);
  const moved = [
    { inputCoupling, outputCoupling: clampNear(output, follow, wanted.outputCoupling) },
    { inputCoupling: clampNear(input, lead, wanted.inputCoupling), outputCoupling },
  ].filter((ends) => Number.isFinite(ends.inputCoupling) && Number.isFinite(ends.outputCoupling));
  return moved
    .map((ends) => withMisses(ends, request))
    .reduce((best, ends) => (ends.nullField < best.nullField - REACH_SLACK ? ends : best), each);
}

/** A circuit against a mask, and the bands that its figures are taken over. */
import type { CircuitParameters } from '../circuit/index.ts';
import type { IntervalGhz, MaskSpecification, OutputPort } from '../filter/index.ts';
import {
  type Compliance,
  complianceOf,
  type FieldSource,
  type FigureBands,
  type Figures,
  figuresOf,
  sourceOfCircuit,
} from '../response/index.ts';

export type Sources = Readonly<Record<OutputPort, FieldSource>>;

export const otherPort = (output: OutputPort): OutputPort => (output === 'OUT1' ? 'OUT2' : 'OUT1');

export function sourcesOf(circuit: CircuitParameters, fsrGhz: number): Sources {
  return { OUT1: sourceOfCircuit(circuit, 'OUT1', fsrGhz), OUT2: sourceOfCircuit(circuit, 'OUT2', fsrGhz) };
}

export function judge(circuit: CircuitParameters, mask: MaskSpecification, fsrGhz: number): Compliance {
  return complianceOf(sourcesOf(circuit, fsrGhz), mask);
}

/** What the mask states of one output: where it must pass, where it must stop, where the other one must pass. */
export function figureBands(
  mask: MaskSpecification,
  output: OutputPort,
  own: OutputPort,
  centreGhz: number,
  fsrGhz: number,
): FigureBands {
  const passing = (port: OutputPort): IntervalGhz[] =>
    mask.bands.filter((band) => band.output === port && band.minTransmissionDb !== undefined);
  const stopped = mask.bands.filter((band) => band.output === output && (band.maxTransmissionDb ?? 0) < 0);
  return {
    passbands: passing(output),
    stopbands: stopped,
    otherPassbands: passing(otherPort(output)),
    centreGhz: output === own ? centreGhz : centreGhz + fsrGhz / 2,
  };
}

export function figuresFrom(sources: Sources, output: OutputPort, bands: FigureBands): Figures {
  return figuresOf(sources[output], sources[otherPort(output)], bands);
}

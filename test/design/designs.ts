import type { ChipModel } from '../../src/chip/index.ts';
import { solveNetlist } from '../../src/circuit/index.ts';
import { curveOf, type Design, netlistOfDesign } from '../../src/design/index.ts';
import type { Band, FilterSpecification, OutputPort } from '../../src/filter/index.ts';

/** Requirements of the trade: common practice, no source. */
export const everyday = {
  chebyshevII: (fsrGhz: number, output: OutputPort): FilterSpecification => ({
    family: {
      family: 'CHEBYSHEV_II',
      shape: 'LOW_PASS',
      order: 2,
      centreGhz: 0,
      band: { lowGhz: -fsrGhz / 4, highGhz: fsrGhz / 4 },
      rejectionDb: 10,
      output,
    },
  }),
  elliptic: (fsrGhz: number, output: OutputPort): FilterSpecification => ({
    family: {
      family: 'ELLIPTIC',
      shape: 'LOW_PASS',
      order: 4,
      centreGhz: 0,
      band: { lowGhz: -fsrGhz / 4, highGhz: fsrGhz / 4 },
      rippleDb: 2,
      rejectionDb: 40,
      output,
    },
  }),
};

export const pass = (
  lowGhz: number,
  highGhz: number,
  minTransmissionDb: number,
  output: OutputPort = 'OUT2',
): Band => ({ lowGhz, highGhz, minTransmissionDb, output });
export const stop = (
  lowGhz: number,
  highGhz: number,
  maxTransmissionDb: number,
  output: OutputPort = 'OUT2',
): Band => ({ lowGhz, highGhz, maxTransmissionDb, output });

/**
 * Greatest distance between the stored transfer function and the exported netlist as the general solver sees it, after
 * the constant phase and whole delay that a circuit may have are taken out. Off the poles' own grid, both sides.
 */
export function circuitError(design: Design, chip: ChipModel, output: OutputPort): number {
  const points = 401;
  const offsetGhz = Float64Array.from(
    { length: points },
    (_, i) => ((i + 0.37) / points - 0.5) * chip.fsrGhz,
  );
  const target = curveOf(design, chip, 'TARGET', output, offsetGhz).spectrum;
  const solved = solveNetlist(
    netlistOfDesign(design),
    offsetGhz.map((offset) => (2 * Math.PI * offset) / chip.fsrGhz),
  )[output.toLowerCase()]!;
  let best = Number.POSITIVE_INFINITY;
  for (let delay = -16; delay <= 16; delay++)
    best = Math.min(best, errorAt(delay, target, solved, offsetGhz, chip.fsrGhz));
  return best;
}

interface Field {
  readonly re: Float64Array;
  readonly im: Float64Array;
}

function errorAt(
  delay: number,
  target: Field,
  solved: Field,
  offsetGhz: Float64Array,
  fsrGhz: number,
): number {
  let crossRe = 0;
  let crossIm = 0;
  const turned = offsetGhz.map((offset) => (2 * Math.PI * offset * delay) / fsrGhz);
  const re = solved.re.map((x, i) => x * Math.cos(turned[i]!) - solved.im[i]! * Math.sin(turned[i]!));
  const im = solved.re.map((x, i) => x * Math.sin(turned[i]!) + solved.im[i]! * Math.cos(turned[i]!));
  for (let i = 0; i < re.length; i++) {
    crossRe += target.re[i]! * re[i]! + target.im[i]! * im[i]!;
    crossIm += target.im[i]! * re[i]! - target.re[i]! * im[i]!;
  }
  const phase = Math.atan2(crossIm, crossRe);
  let worst = 0;
  for (let i = 0; i < re.length; i++) {
    const wRe = re[i]! * Math.cos(phase) - im[i]! * Math.sin(phase);
    const wIm = re[i]! * Math.sin(phase) + im[i]! * Math.cos(phase);
    worst = Math.max(worst, Math.hypot(wRe - target.re[i]!, wIm - target.im[i]!));
  }
  return worst;
}

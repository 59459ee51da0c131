/**
 * The general solver: any netlist of couplers and waveguides, in any topology. It knows elements only by their
 * scattering equations and solves them all at once; no closed form of a ring or an interferometer is used here, so that
 * it can check those that do.
 *
 * Unknowns are the fields b at all element outputs. With S the elements' transfer, C the connections and e the light
 * sent in: b = S·(C·b + e), that is (I − S·C)·b = S·e, by complex LU with partial pivoting (G. H. Golub & C. F. Van Loan,
 * Matrix Computations, 4th ed., algorithm 3.4.1), afresh at every frequency.
 */
import type { Netlist } from './circuit.ts';
import { factorAndSolve } from './lu.ts';
import { type Wiring, wire } from './wiring.ts';

export interface ComplexSeries {
  readonly re: Float64Array;
  readonly im: Float64Array;
}

/** The equations have no unique solution: light circulates in a loop that neither loses nor couples it. */
export class NetlistSingular extends Error {
  override readonly name = 'NetlistSingular';
  constructor(
    readonly omegaRad: number,
    readonly port: string,
  ) {
    super(`the netlist has no unique solution at Ω = ${omegaRad} rad: nothing limits the field at ${port}`);
  }
}

/** Entries of −S (and of S·e) for every element, at one frequency. */
function fillEquations(
  wiring: Wiring,
  source: number,
  omegaRad: number,
  re: Float64Array,
  im: Float64Array,
): void {
  const n = wiring.outputs.length;
  const width = n + 1;
  re.fill(0);
  im.fill(0);
  for (let i = 0; i < n; i++) re[i * width + i] = 1;
  const add = (output: number, input: number, valueRe: number, valueIm: number) => {
    if (input === source) {
      re[output * width + n]! += valueRe;
      im[output * width + n]! += valueIm;
      return;
    }
    const from = wiring.fedBy[input]!;
    if (from < 0) return;
    re[output * width + from]! -= valueRe;
    im[output * width + from]! -= valueIm;
  };
  for (const { element, firstOutput: o, firstInput: i } of wiring.elements) {
    if (element.kind === 'waveguide') {
      const amplitude = 10 ** (-element.lossDb / 20);
      const angle = omegaRad * element.delay + element.phase;
      add(o, i, amplitude * Math.cos(angle), -amplitude * Math.sin(angle));
      continue;
    }
    const amplitude = 10 ** (-element.excessLossDb / 20);
    const through = amplitude * Math.sqrt(1 - element.powerCrossCoupling);
    const across = -amplitude * Math.sqrt(element.powerCrossCoupling);
    add(o, i, through, 0);
    add(o, i + 1, 0, across);
    add(o + 1, i, 0, across);
    add(o + 1, i + 1, through, 0);
  }
}

/**
 * Fields at every named output of the netlist for light of unit amplitude into one named input.
 * @param omegaRad Ω at which to solve, any order
 * @param input a key of `netlist.ports` that names an element's input; `in1` by default
 * @returns one complex series for each key of `netlist.ports` that names an element's output
 * @throws NetlistInvalid for a netlist that does not hang together, NetlistSingular where it has no unique solution
 *
 * Cost: n³/3 complex multiplications a frequency for n element outputs, fewer where the matrix stays sparse.
 */
export function solveNetlist(
  netlist: Netlist,
  omegaRad: Float64Array,
  input = 'in1',
): Readonly<Record<string, ComplexSeries>> {
  const wiring = wire(netlist);
  const source = wiring.inputOf(input);
  const n = wiring.outputs.length;
  const re = new Float64Array(n * (n + 1));
  const im = new Float64Array(n * (n + 1));
  const taps = wiring.taps.map(({ port, output }) => ({
    port,
    output,
    series: { re: new Float64Array(omegaRad.length), im: new Float64Array(omegaRad.length) },
  }));
  for (let k = 0; k < omegaRad.length; k++) {
    fillEquations(wiring, source, omegaRad[k]!, re, im);
    const stuck = factorAndSolve(re, im, n);
    if (stuck >= 0) throw new NetlistSingular(omegaRad[k]!, wiring.outputs[stuck]!);
    for (const { output, series } of taps) {
      series.re[k] = re[output * (n + 1) + n]!;
      series.im[k] = im[output * (n + 1) + n]!;
    }
  }
  return Object.fromEntries(taps.map(({ port, series }) => [port, series]));
}

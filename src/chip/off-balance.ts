/** What a person should know of input and output couplers that are not what the filter wants. */
import type { OutputPort } from '../filter/specification.ts';
import { armWeights, isMet, otherOf } from './balance.ts';
import { couplerOf } from './elements.ts';
import type { ChipModel, Coupler } from './model.ts';
import type { EndCouplings, OffBalance, PlacedCircuit } from './placed.ts';
import type { Caution } from './setting.ts';

/** Field below which a null counts as complete, −160 dB: what rounding leaves of two equal weights. */
const COMPLETE_NULL = 1e-8;

/** A constant loss from which it is worth a word, dB. */
const LOSS_WORTH_SAYING_DB = 0.001;

const shown = (value: number, digits = 4): string => String(Number(value.toPrecision(digits)));

interface Ends {
  readonly taken: EndCouplings;
  readonly wanted: EndCouplings;
}

/** What is left, dB, where the arms of a lossless cell cancel; null where they cancel completely. */
function leftDb(ends: EndCouplings, port: OutputPort): string | null {
  const [w0, w1] = armWeights(ends, port);
  const left = Math.abs(w0 - w1);
  return left > COMPLETE_NULL ? (20 * Math.log10(left)).toFixed(1) : null;
}

function nullsOf({ taken, wanted }: Ends, port: OutputPort, carried: boolean): string {
  const left = leftDb(taken, port);
  const before = leftDb(wanted, port);
  const name = `nulls of ${port}${carried ? ', which carries what is wanted,' : ''}`;
  if (left === null) return `${name} stay complete`;
  return `${name} end at ${left} dB${before === null ? '' : ` (${before} dB as wanted)`}`;
}

/** How much less than it should an output has where the arms add up, in words; nothing where it has as much. */
function peakLossOf({ taken, wanted }: Ends, port: OutputPort): string {
  const peak = (ends: EndCouplings) => armWeights(ends, port).reduce((sum, weight) => sum + weight, 0);
  const lossDb = 20 * Math.log10(peak(wanted) / peak(taken));
  return lossDb < LOSS_WORTH_SAYING_DB ? '' : ` (peak lower by ${shown(lossDb, 2)} dB)`;
}

/** `wanted` and `taken` of one coupler in words; null where it is as wanted. */
function missOf(path: string, coupler: Coupler, wanted: number, taken: number): string | null {
  if (isMet(taken, wanted)) return null;
  const { tunable, minCoupling: min, maxCoupling: max } = coupler;
  const inReach = wanted >= min && wanted <= max;
  const why = inReach
    ? 'takes'
    : tunable
      ? `reaches ${shown(min)} to ${shown(max)} and takes`
      : 'is fixed at';
  return `${path} should be ${shown(wanted)}; it ${why} ${shown(taken)}${inReach ? ' to match the other end' : ''}.`;
}

function effectOf({ port, passes }: OffBalance, ends: Ends, cell: string): string {
  const loss = peakLossOf(ends, port);
  const other = otherOf(port);
  if (passes) {
    const left = leftDb(ends.taken, other);
    return `${cell} passes light on by ${port}${loss}; ${left === null ? 'none of it' : `${left} dB of it`} leaves by ${other}.`;
  }
  return (
    `At the outputs of ${cell} ${nullsOf(ends, port, true)}${loss}, and ${nullsOf(ends, other, false)}: ` +
    'no heater deepens a null beyond that.'
  );
}

/** One caution for every interferometer whose ends are not as wanted in the circuit as it is now. */
export function offBalanceCautions(placed: PlacedCircuit, chip: ChipModel): Caution[] {
  return placed.offBalance.flatMap((off) => {
    const [first, last] = [chip.cells[off.first]!, chip.cells[off.last]!];
    const taken = {
      inputCoupling: placed.circuit.cells[off.first]!.inputCoupling,
      outputCoupling: placed.circuit.cells[off.last]!.outputCoupling,
    };
    const { wanted } = off;
    const input = couplerOf(first, 'input');
    const output = couplerOf(last, 'output');
    const misses = [
      missOf(`${first.name}.input.coupling`, input, wanted.inputCoupling, taken.inputCoupling),
      missOf(`${last.name}.output.coupling`, output, wanted.outputCoupling, taken.outputCoupling),
    ].filter((miss) => miss !== null);
    if (misses.length === 0) return [];
    const text = [...misses, effectOf(off, { taken, wanted }, last.name)].join(' ');
    return [{ code: 'COUPLER_OFF_BALANCE', text }];
  });
}

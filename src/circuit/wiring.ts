/** Reads a netlist's names into indices, and refuses what does not hang together. */
import type { Netlist, NetlistElement } from './circuit.ts';

export type NetlistFault =
  | 'DUPLICATE_ELEMENT'
  | 'UNKNOWN_ELEMENT'
  | 'UNKNOWN_PORT'
  | 'WRONG_DIRECTION'
  | 'PORT_USED_TWICE'
  | 'VALUE_OUT_OF_RANGE'
  | 'NO_SUCH_INPUT';

export class NetlistInvalid extends Error {
  override readonly name = 'NetlistInvalid';
  constructor(
    readonly fault: NetlistFault,
    /** The element, port or value at fault, as the netlist writes it. */
    readonly where: string,
  ) {
    super(`${fault.toLowerCase().replaceAll('_', ' ')}: ${where}`);
  }
}

export interface WiredElement {
  readonly element: NetlistElement;
  readonly firstInput: number;
  readonly firstOutput: number;
}

export interface Wiring {
  readonly elements: readonly WiredElement[];
  /** Names of all element outputs, by index. */
  readonly outputs: readonly string[];
  /** For every element input the output that feeds it, −1 where none does. */
  readonly fedBy: Int32Array;
  /** The netlist's ports that name an output. */
  readonly taps: readonly { readonly port: string; readonly output: number }[];
  /** Index of the element input that a port of the whole names. */
  readonly inputOf: (port: string) => number;
}

const PORTS = {
  coupler: { inputs: ['in1', 'in2'], outputs: ['out1', 'out2'] },
  waveguide: { inputs: ['in'], outputs: ['out'] },
} as const;

function checkValues(element: NetlistElement): void {
  const demand = (good: boolean, name: string) => {
    if (!good) throw new NetlistInvalid('VALUE_OUT_OF_RANGE', `${element.id}.${name}`);
  };
  const loss = (value: number) => value >= 0;
  if (element.kind === 'coupler') {
    demand(element.powerCrossCoupling >= 0 && element.powerCrossCoupling <= 1, 'powerCrossCoupling');
    demand(loss(element.excessLossDb), 'excessLossDb');
    return;
  }
  demand(element.delay >= 0 && Number.isFinite(element.delay), 'delay');
  demand(Number.isFinite(element.phase), 'phase');
  demand(loss(element.lossDb), 'lossDb');
}

/** All inputs and outputs of all elements, each under its full name. */
function indexPorts(netlist: Netlist) {
  const elements: WiredElement[] = [];
  const inputs: string[] = [];
  const outputs: string[] = [];
  const ids = new Set<string>();
  for (const element of netlist.elements) {
    if (ids.has(element.id)) throw new NetlistInvalid('DUPLICATE_ELEMENT', element.id);
    ids.add(element.id);
    checkValues(element);
    elements.push({ element, firstInput: inputs.length, firstOutput: outputs.length });
    inputs.push(...PORTS[element.kind].inputs.map((port) => `${element.id}.${port}`));
    outputs.push(...PORTS[element.kind].outputs.map((port) => `${element.id}.${port}`));
  }
  return { elements, inputs, outputs, ids };
}

/** Checks a netlist and resolves its names. Throws `NetlistInvalid`. */
export function wire(netlist: Netlist): Wiring {
  const { elements, inputs, outputs, ids } = indexPorts(netlist);
  const inputIndex = new Map(inputs.map((name, i) => [name, i]));
  const outputIndex = new Map(outputs.map((name, i) => [name, i]));
  const find = (
    name: string,
    wanted: ReadonlyMap<string, number>,
    other: ReadonlyMap<string, number>,
  ): number => {
    const index = wanted.get(name);
    if (index !== undefined) return index;
    if (other.has(name)) throw new NetlistInvalid('WRONG_DIRECTION', name);
    const known = ids.has(name.slice(0, Math.max(0, name.lastIndexOf('.'))));
    throw new NetlistInvalid(known ? 'UNKNOWN_PORT' : 'UNKNOWN_ELEMENT', name);
  };
  const fedBy = new Int32Array(inputs.length).fill(-1);
  const used = new Set<number>();
  for (const [from, to] of netlist.connections) {
    const output = find(from, outputIndex, inputIndex);
    const input = find(to, inputIndex, outputIndex);
    if (used.has(output)) throw new NetlistInvalid('PORT_USED_TWICE', from);
    if (fedBy[input] !== -1) throw new NetlistInvalid('PORT_USED_TWICE', to);
    used.add(output);
    fedBy[input] = output;
  }
  const taps: { port: string; output: number }[] = [];
  const entrances = new Map<string, number>();
  for (const [port, name] of Object.entries(netlist.ports)) {
    const output = outputIndex.get(name);
    if (output !== undefined) {
      taps.push({ port, output });
      continue;
    }
    const input = find(name, inputIndex, outputIndex);
    if (fedBy[input] !== -1) throw new NetlistInvalid('PORT_USED_TWICE', name);
    entrances.set(port, input);
  }
  const inputOf = (port: string): number => {
    const input = entrances.get(port);
    if (input === undefined) throw new NetlistInvalid('NO_SUCH_INPUT', port);
    return input;
  };
  return { elements, outputs, fedBy, taps, inputOf };
}

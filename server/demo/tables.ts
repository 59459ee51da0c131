/** What the demo prints of a design: plain text, aligned, in the units of the trade. */

export interface DesignAnswer {
  readonly id: string;
  readonly order: number;
  readonly family: string;
  readonly architecture: string;
  readonly reason: string;
  readonly circuit: { readonly cells: readonly CellAnswer[] };
  readonly setting: {
    readonly channels: readonly ChannelAnswer[];
    readonly totalPowerMw: number;
    readonly parked: readonly { readonly element: string; readonly how: string }[];
    readonly cautions: readonly { readonly code: string; readonly text: string }[];
  };
  readonly compliance: { readonly met: boolean; readonly bands: readonly BandAnswer[] };
}

interface CellAnswer {
  readonly cell: string;
  readonly section: number | null;
  readonly inputCoupling: number;
  readonly outputCoupling: number;
  readonly armPhaseRad: number;
  readonly rings: readonly {
    readonly element: string;
    readonly powerCrossCoupling: number;
    readonly phaseRad: number;
    readonly parked: boolean;
  }[];
}

interface ChannelAnswer {
  readonly channel: string;
  readonly drives: string;
  readonly state: string;
  readonly currentMa: number;
  readonly powerMw: number;
  readonly limitMa: number;
}

interface BandAnswer {
  readonly band: { readonly label: string | null; readonly output: string };
  readonly quantity: string;
  readonly demand: number;
  readonly reached: number | null;
  readonly margin: number | null;
  readonly worstAt: { readonly frequencyThz: number };
}

type Row = readonly (string | number)[];

/** Columns as wide as their widest entry; numbers right, words left. */
function table(head: Row, rows: readonly Row[]): string {
  const all = [head, ...rows].map((row) => row.map(String));
  const widths = head.map((_, column) => Math.max(...all.map((row) => row[column]!.length)));
  const line = (row: readonly string[], source: Row): string =>
    row
      .map((cell, i) =>
        typeof source[i] === 'number' || /^-?\d/.test(cell)
          ? cell.padStart(widths[i]!)
          : cell.padEnd(widths[i]!),
      )
      .join('  ');
  return all.map((row, i) => `  ${line(row, i === 0 ? head : rows[i - 1]!)}`.trimEnd()).join('\n');
}

const fixed = (value: number | null, digits: number): string =>
  value === null ? '–' : value.toFixed(digits);

export function sectionTable({ circuit }: DesignAnswer): string {
  return circuit.cells
    .map((cell) => {
      const role = cell.section === null ? '' : `, section ${cell.section}`;
      const head = `  ${cell.cell}${role}: K_in ${fixed(cell.inputCoupling, 4)}, K_out ${fixed(cell.outputCoupling, 4)}, arm phase ${fixed(cell.armPhaseRad, 4)} rad`;
      const rows = cell.rings.map((ring) => [
        ring.element,
        fixed(ring.powerCrossCoupling, 6),
        fixed(ring.phaseRad, 4),
        ring.parked ? 'parked' : 'in use',
      ]);
      return `${head}\n${table(['ring', 'K', 'phase rad', ''], rows)}`;
    })
    .join('\n');
}

export function complianceTable({ compliance }: DesignAnswer): string {
  const rows = compliance.bands.map(({ band, quantity, demand, reached, margin, worstAt }) => [
    band.label ?? '',
    band.output,
    quantity === 'MIN_TRANSMISSION_DB' ? `at least ${fixed(demand, 2)}` : `at most ${fixed(demand, 2)}`,
    fixed(reached, 2),
    fixed(margin, 2),
    fixed(worstAt.frequencyThz, 4),
  ]);
  return table(['band', 'output', 'demand dB', 'reached dB', 'margin dB', 'worst at THz'], rows);
}

export function currentTable({ setting }: DesignAnswer): string {
  const rows = setting.channels.map((one) => [
    one.channel,
    one.drives,
    one.state,
    fixed(one.currentMa, 4),
    fixed(one.powerMw, 2),
    fixed(one.limitMa, 2),
  ]);
  return table(['channel', 'drives', 'state', 'current mA', 'power mW', 'limit mA'], rows);
}

/** What a chip consists of, element by element, and which driver channel warms each. */
import type { ChipModel, Coupler, InterferometerCell } from './model.ts';

export type ElementKind = 'COUPLING' | 'RING_PHASE' | 'ARM_PHASE';

export interface ChipElement {
  readonly path: string;
  readonly kind: ElementKind;
  /** Position of the cell in the chip. */
  readonly cell: number;
  /** The ring it belongs to, counted from 0 through the cell; null for input, output and arm. */
  readonly ring: number | null;
  /** Couplings only. */
  readonly coupler: Coupler | null;
  /** Position of the channel that drives it; null for a fixed coupler and for an element without a heater. */
  readonly channel: number | null;
}

/** The coupler called `element` (`input`, `output`, `ring<k>`) of a cell. The model guarantees that it exists. */
export function couplerOf(cell: InterferometerCell, element: string): Coupler {
  const coupler = cell.couplers.find((candidate) => candidate.element === element);
  if (!coupler) throw new Error(`cell ${cell.name} has no coupler ${element}`);
  return coupler;
}

/** The arm a ring sits on; rings are counted from 0 through the cell, first those of arm 0. */
export function armOfRing(cell: InterferometerCell, ring: number): 0 | 1 {
  return ring < cell.ringsPerArm[0] ? 0 : 1;
}

export function ringCount(cell: InterferometerCell): number {
  return cell.ringsPerArm[0] + cell.ringsPerArm[1];
}

/** Every element of a chip, cell by cell: input, output, each ring's coupling and phase, arm. Cost O(elements). */
export function listElements(chip: ChipModel): readonly ChipElement[] {
  const driverOf = new Map(chip.channels.map((channel, index) => [channel.drives, index]));
  const elements: ChipElement[] = [];
  chip.cells.forEach((cell, index) => {
    const add = (
      name: string,
      kind: ElementKind,
      ring: number | null,
      coupler: Coupler | null,
      suffix: string,
    ) => {
      const path = `${cell.name}.${name}.${suffix}`;
      elements.push({ path, kind, cell: index, ring, coupler, channel: driverOf.get(path) ?? null });
    };
    add('input', 'COUPLING', null, couplerOf(cell, 'input'), 'coupling');
    add('output', 'COUPLING', null, couplerOf(cell, 'output'), 'coupling');
    for (let ring = 0; ring < ringCount(cell); ring++) {
      const name = `ring${ring + 1}`;
      add(name, 'COUPLING', ring, couplerOf(cell, name), 'coupling');
      add(name, 'RING_PHASE', ring, null, 'phase');
    }
    add('arm', 'ARM_PHASE', null, null, 'phase');
  });
  return elements;
}

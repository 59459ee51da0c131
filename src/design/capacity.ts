/** What the chip has room for, and what it cannot show however well it is set. */
import { type ChipModel, ringCapacity } from '../chip/index.ts';
import { Refusal } from '../errors.ts';
import {
  type Architecture,
  type Capacity,
  type FilterSpecification,
  MAX_DESIGN_ORDER,
} from '../filter/index.ts';

const ARCHITECTURES: readonly Architecture[] = ['ALL_PASS_PAIR', 'SECTION_CASCADE'];

/** Greatest order of one architecture on the chip; half-band filters may use an arm's plain delay as their pole at 0. */
export function orderOn(chip: ChipModel, architecture: Architecture): number {
  const { allPassPair, sectionCascade } = ringCapacity(chip);
  return architecture === 'ALL_PASS_PAIR'
    ? Math.max(allPassPair.order, allPassPair.halfBandOrder)
    : sectionCascade.order;
}

export function capacityOf(chip: ChipModel, architecture?: Architecture): Capacity {
  const orders = (architecture ? [architecture] : ARCHITECTURES).map((one) => orderOn(chip, one));
  const order = Math.max(...orders);
  return order < MAX_DESIGN_ORDER ? { order, limit: 'RINGS' } : { order: MAX_DESIGN_ORDER, limit: 'ORDER' };
}

/** Incoherent light (scattered, or of the other polarisation) is on the detector whatever the circuit does. */
export function refuseBelowFloor(specification: FilterSpecification, chip: ChipModel): void {
  const floorDb = chip.rejectionFloorDb;
  if (floorDb === undefined) return;
  for (const { pointer, rejectionDb, sign } of rejectionsOf(specification)) {
    if (rejectionDb <= floorDb) continue;
    throw new Refusal({
      code: 'SPECIFICATION_UNREACHABLE',
      limit: 'REJECTION_FLOOR',
      detail: `${rejectionDb} dB are asked for; light that no setting removes leaves this chip ${floorDb} dB.`,
      pointer,
      given: sign * rejectionDb,
      allowed: sign > 0 ? { max: floorDb, unit: 'dB' } : { min: -floorDb, max: 0, unit: 'dB' },
      nearest: [
        {
          reason: "the chip's floor",
          changes: [{ pointer, given: sign * rejectionDb, works: sign * floorDb, unit: 'dB' }],
        },
      ],
    });
  }
}

interface AskedRejection {
  readonly pointer: string;
  readonly rejectionDb: number;
  /** −1 where the wire states it as a transmission. */
  readonly sign: 1 | -1;
}

function rejectionsOf(specification: FilterSpecification): AskedRejection[] {
  if (specification.family) {
    const { rejectionDb } = specification.family;
    return rejectionDb === undefined
      ? []
      : [{ pointer: '/specification/family/rejectionDb', rejectionDb, sign: 1 }];
  }
  return specification.mask.bands.flatMap((band, index) =>
    band.maxTransmissionDb === undefined
      ? []
      : [
          {
            pointer: `/specification/mask/bands/${index}/maxTransmissionDb`,
            rejectionDb: -band.maxTransmissionDb,
            sign: -1 as const,
          },
        ],
  );
}

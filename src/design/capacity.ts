/** What the chip has room for, and what it cannot show however well it is set. */
import { type ChipModel, ringCapacity } from '../chip/index.ts';
import { Refusal } from '../errors.ts';
import {
  type Architecture,
  type Capacity,
  type FilterSpecification,
  MAX_DESIGN_ORDER,
} from '../filter/index.ts';
import type { DesignQuestion } from './design.ts';

const ARCHITECTURES: readonly Architecture[] = ['ALL_PASS_PAIR', 'SECTION_CASCADE'];

/** Greatest order of any filter that one architecture holds on the chip, and of an odd half-band one. */
function ordersOn(chip: ChipModel, architecture: Architecture): { order: number; halfBandOrder: number } {
  const { allPassPair, sectionCascade } = ringCapacity(chip);
  if (architecture === 'ALL_PASS_PAIR') return allPassPair;
  const { order } = sectionCascade;
  return { order, halfBandOrder: oddUpTo(order) };
}

/** As far as any filter of one architecture goes on the chip, half-band ones included. */
export function orderOn(chip: ChipModel, architecture: Architecture): number {
  const { order, halfBandOrder } = ordersOn(chip, architecture);
  return Math.max(order, halfBandOrder);
}

const oddUpTo = (order: number): number => (order % 2 === 1 ? order : Math.max(0, order - 1));

export function capacityOf(
  chip: ChipModel,
  specification: FilterSpecification,
  architecture?: Architecture,
): Capacity {
  const able = usesBoth(specification) ? (['ALL_PASS_PAIR'] as const) : ARCHITECTURES;
  const orders = (architecture ? [architecture] : able).map((one) => ordersOn(chip, one));
  const order = Math.max(...orders.map((one) => one.order));
  const halfBandOrder = Math.min(
    Math.max(...orders.map((one) => one.halfBandOrder)),
    oddUpTo(MAX_DESIGN_ORDER),
  );
  return order < MAX_DESIGN_ORDER
    ? { order, halfBandOrder, limit: 'RINGS' }
    : { order: MAX_DESIGN_ORDER, halfBandOrder, limit: 'ORDER' };
}

/** Whether something is asked of either output: an interleaver's channels, or the bands of a mask. */
function usesBoth({ family, mask }: FilterSpecification): boolean {
  if (family) return family.shape === 'INTERLEAVER';
  return new Set(mask.bands.map((band) => band.output)).size > 1;
}

/** What a cascade's cells reject is absorbed on the way, so that only one of its outputs carries a filter. */
export function refuseCascadeOnBoth({ specification, synthesis }: DesignQuestion): void {
  if (synthesis.architecture !== 'SECTION_CASCADE' || !usesBoth(specification)) return;
  const pointer = '/synthesis/architecture';
  const given = synthesis.architecture;
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    detail:
      'A cascade of sections has the filter on one output only: what its cells reject is absorbed on the way and does not come out at the other. What is asked of both outputs needs an all-pass pair.',
    pointer,
    given,
    allowed: ['ALL_PASS_PAIR'],
    nearest: [{ reason: 'an all-pass pair', changes: [{ pointer, given, works: 'ALL_PASS_PAIR' }] }],
  });
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

/**
 * The canonical form of what is asked: every frequency an offset in GHz, defaults filled in, bands sorted. Two requests
 * that mean the same have the same canonical text, and so the same address. Defaults and units live here and nowhere
 * else.
 */
import type {
  Band,
  FamilySpecification,
  FilterSpecification,
  IntervalGhz,
  MaskSpecification,
  SynthesisChoice,
} from '../src/filter/specification.ts';
import type { ChipModelInput } from './chip.ts';
import { canonicalJson } from './jcs.ts';
import { type FrequencyFrame, frequencyOffsetGhz, intervalOffsetsGhz } from './offsets.ts';
import type {
  BandInput,
  FamilySpecificationInput,
  FilterSpecificationInput,
  MaskSpecificationInput,
} from './specification.ts';
import type { IntervalInput } from './units.ts';

/** Raised when the meaning of a canonical text changes. */
const CANONICAL_SCHEMA = 1;

/** Anchor of the ITU-T G.694.1 frequency grids (edition 10/2020, clause 6), Hz. */
const ITU_ANCHOR_HZ = 193.1e12;

/** Leaves out members that are undefined: absent is absent. */
function present<T extends object>(members: T): { [K in keyof T]: Exclude<T[K], undefined> } {
  return Object.fromEntries(Object.entries(members).filter(([, value]) => value !== undefined)) as never;
}

/** Offset of the grid line nearest to the chip's reference frequency, GHz. */
function nearestGridLineGhz(gridGhz: number, frame: FrequencyFrame): number {
  const referenceHz = Math.round(frame.referenceFrequencyThz * 1e12);
  const gridHz = gridGhz * 1e9;
  const lines = Math.round((referenceHz - ITU_ANCHOR_HZ) / gridHz);
  return (ITU_ANCHOR_HZ + lines * gridHz - referenceHz) / 1e9;
}

function centreGhzOf(spec: FamilySpecificationInput, frame: FrequencyFrame): number {
  if (spec.centre !== undefined) return frequencyOffsetGhz(spec.centre, frame);
  if (spec.shape === 'INTERLEAVER') return nearestGridLineGhz(spec.gridGhz ?? frame.fsrGhz / 2, frame);
  if (spec.band === undefined || spec.shape === 'LOW_PASS' || spec.shape === 'HIGH_PASS') return 0;
  const { lowGhz, highGhz } = intervalOffsetsGhz(spec.band, frame);
  return (lowGhz + highGhz) / 2;
}

function canonicalFamily(spec: FamilySpecificationInput, frame: FrequencyFrame): FamilySpecification {
  return present({
    family: spec.family,
    shape: spec.shape,
    order: spec.order,
    centreGhz: centreGhzOf(spec, frame),
    band: spec.band && intervalOffsetsGhz(spec.band, frame),
    stopband: spec.stopband && intervalOffsetsGhz(spec.stopband, frame),
    rippleDb: spec.rippleDb,
    rejectionDb: spec.rejectionDb,
    gridGhz: spec.gridGhz,
    output: spec.output ?? 'OUT1',
  });
}

function canonicalBand(band: BandInput, frame: FrequencyFrame): Band {
  return present({
    ...intervalOffsetsGhz(band.interval, frame),
    minTransmissionDb: band.minTransmissionDb,
    maxTransmissionDb: band.maxTransmissionDb,
    output: band.output ?? 'OUT1',
    label: band.label,
  });
}

function compareText(a: string, b: string): number {
  return a < b ? -1 : a > b ? 1 : 0;
}

/** By low, high, output, label; bands equal in all of these by their demands, so that no order of sending shows. */
function compareBands(a: Band, b: Band): number {
  return (
    a.lowGhz - b.lowGhz ||
    a.highGhz - b.highGhz ||
    compareText(a.output, b.output) ||
    compareText(a.label ?? '', b.label ?? '') ||
    compareText(canonicalJson(a), canonicalJson(b))
  );
}

/** Bands in canonical order, each with its position in the request. */
export function sortedBands(
  bands: readonly BandInput[],
  frame: FrequencyFrame,
): readonly { readonly band: Band; readonly askedIndex: number }[] {
  return bands
    .map((band, askedIndex) => ({ band: canonicalBand(band, frame), askedIndex }))
    .sort((a, b) => compareBands(a.band, b.band));
}

function canonicalMask(spec: MaskSpecificationInput, frame: FrequencyFrame): MaskSpecification {
  return present({
    bands: sortedBands(spec.bands, frame).map(({ band }) => band),
    family: spec.family,
    order: spec.order,
    reference: spec.reference ?? 'INPUT',
  });
}

/** Takes what `filterSpecificationRule` has accepted. */
export function canonicalSpecification(
  input: FilterSpecificationInput,
  frame: FrequencyFrame,
): FilterSpecification {
  if (input.family !== undefined) return { family: canonicalFamily(input.family, frame) };
  return { mask: canonicalMask(input.mask, frame) };
}

/** The canonical specification as a request in offsets: asking it again gives the same canonical text. */
export function askedOfSpecification(specification: FilterSpecification): FilterSpecificationInput {
  if (specification.family !== undefined) {
    const { centreGhz, band, stopband, ...rest } = specification.family;
    return {
      family: present({
        ...rest,
        centre: { offsetGhz: centreGhz },
        band: band && inOffsets(band),
        stopband: stopband && inOffsets(stopband),
      }),
    };
  }
  const { bands, ...rest } = specification.mask;
  return { mask: { ...rest, bands: bands.map(askedBand) } };
}

function inOffsets({ lowGhz, highGhz }: IntervalGhz): IntervalInput {
  return { offsetGhz: { low: lowGhz, high: highGhz } };
}

function askedBand({ lowGhz, highGhz, ...rest }: Band): BandInput {
  return { interval: inOffsets({ lowGhz, highGhz }), ...rest };
}

/** Canonical text of a question; its SHA-256 is the design's address. */
export function designText(question: {
  readonly engine: string;
  readonly chipRevisionHash: string;
  readonly specification: FilterSpecification;
  readonly synthesis: { readonly architecture?: SynthesisChoice['architecture'] | undefined };
}): string {
  return canonicalJson({
    kind: 'design',
    schema: CANONICAL_SCHEMA,
    engine: question.engine,
    chipRevision: question.chipRevisionHash,
    specification: question.specification,
    synthesis: question.synthesis,
  });
}

/** Canonical text of a chip revision: the model as it was given, never converted. */
export function chipRevisionText(serial: string, number: number, model: ChipModelInput): string {
  return canonicalJson({ kind: 'chipRevision', schema: CANONICAL_SCHEMA, serial, number, model });
}

/** Chips and their model revisions. */

import { chipRevisionText } from '../../schema/canonical.ts';
import type { ChipModelInput } from '../../schema/chip.ts';
import { registerChipRule, reviseChipRule } from '../../schema/library.ts';
import { NAME_PATTERN } from '../../schema/text.ts';
import { actingOf, authorise } from '../auth/index.ts';
import { keyReused, preconditionFailed, refuse } from '../errors.ts';
import { sha256Hex } from './address.ts';
import type { Context } from './context.ts';
import { connectionOf } from './lists.ts';
import type { Operations } from './operations.ts';
import { idempotencyOf, readInput } from './read-input.ts';

function addressed(
  serial: string,
  number: number,
  model: ChipModelInput,
): { canonical: string; hash: string } {
  const canonical = chipRevisionText(serial, number, model);
  return { canonical, hash: sha256Hex(canonical) };
}

/** What a number of a path or an argument can be in the database. */
const GREATEST_NUMBER = 2 ** 31 - 1;

export function isNumber(value: number): boolean {
  return Number.isInteger(value) && value >= 1 && value <= GREATEST_NUMBER;
}

type ChipOperations = Pick<
  Operations,
  | 'findChip'
  | 'listChips'
  | 'findRevision'
  | 'headRevision'
  | 'listRevisions'
  | 'modelOf'
  | 'registerChip'
  | 'reviseChip'
>;

export function chipOperations(context: Context): ChipOperations {
  const { store } = context;
  return {
    async findChip(viewer, serial) {
      authorise(viewer, 'chip.read');
      return NAME_PATTERN.test(serial) ? store.findChip(serial) : null;
    },
    async listChips(viewer, ask) {
      authorise(viewer, 'chip.read');
      return connectionOf(ask, {
        context: { list: 'chips' },
        read: (page) => store.listChips(page),
        nodeOf: (row) => row,
      });
    },
    async findRevision(viewer, chip, number) {
      authorise(viewer, 'chip.read');
      return isNumber(number) ? store.findRevision(chip.id, number) : null;
    },
    async headRevision(viewer, chip) {
      authorise(viewer, 'chip.read');
      return context.headRevision(chip);
    },
    async listRevisions(viewer, chip, ask) {
      authorise(viewer, 'chip.read');
      return connectionOf(ask, {
        context: { list: 'revisions', chip: chip.id },
        read: (page) => store.listRevisions(chip.id, page),
        nodeOf: (row) => row,
      });
    },
    modelOf: (revision) => context.modelOf(revision),
    async registerChip(viewer, body, options) {
      authorise(viewer, 'chip.register');
      const input = readInput(registerChipRule, body);
      const { serial, description = '', model } = input;
      const idempotency = idempotencyOf('registerChip', input, body, options);
      const ask = { serial, description, model, ...addressed(serial, 1, model) };
      const written = await store.registerChip(actingOf(viewer), ask, idempotency);
      if (written.outcome === 'KEY_REUSED') throw keyReused(idempotency?.key ?? '');
      if (written.outcome === 'NAME_TAKEN') {
        throw refuse('NAME_TAKEN', `There is a chip ${serial} already.`, {
          pointer: '/serial',
          given: serial,
        });
      }
      return written;
    },
    async reviseChip(viewer, body, options) {
      authorise(viewer, 'chip.revise');
      const input = readInput(reviseChipRule, body);
      const { expectedRevision, model, note = '' } = input;
      const chip = await context.chipBySerial(input.chip);
      const idempotency = idempotencyOf('reviseChip', input, body, options);
      const canonicalOf = (number: number) => addressed(chip.serial, number, model);
      const ask = { chipId: chip.id, expectedRevision, model, note, canonicalOf };
      const written = await store.reviseChip(actingOf(viewer), ask, idempotency);
      if (written.outcome === 'KEY_REUSED') throw keyReused(idempotency?.key ?? '');
      if (written.outcome === 'STALE') {
        const detail = `The head revision of chip ${chip.serial} is ${written.headRevision}, not ${expectedRevision}.`;
        const more = { pointer: '/expectedRevision', given: expectedRevision, allowed: written.headRevision };
        throw preconditionFailed(detail, more);
      }
      return written;
    },
  };
}

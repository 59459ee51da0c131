/**
 * Every write leaves one row, in its own transaction:
 *
 * | action | subject | detail |
 * |---|---|---|
 * | `token.created`, `token.revoked` | Token | actor, role, label |
 * | `chip.registered` | Chip | serial |
 * | `chip.revised` | ChipRevision | number, note |
 * | `design.requested`, `design.cancelled` | DesignRequest | key; cached |
 * | `design.computed`, `design.refused`, `design.failed` | Design (its address, also where there is none) | code |
 * | `version.saved` | ConfigurationVersion | configuration, number |
 * | `release.published` | Release, `<chip id>/<name>/<sequence>` | name, sequence, accepted |
 */
import type { Transaction } from '../database.ts';
import type { Acting } from '../records.ts';

export type Action =
  | 'token.created'
  | 'token.revoked'
  | 'chip.registered'
  | 'chip.revised'
  | 'design.requested'
  | 'design.cancelled'
  | 'design.computed'
  | 'design.refused'
  | 'design.failed'
  | 'version.saved'
  | 'release.published';

export interface Entry {
  readonly action: Action;
  readonly subjectKind:
    | 'Token'
    | 'Chip'
    | 'ChipRevision'
    | 'DesignRequest'
    | 'Design'
    | 'ConfigurationVersion'
    | 'Release';
  readonly subjectId: string;
  readonly chipId: string | null;
  readonly detail?: Readonly<Record<string, unknown>>;
}

export async function writeHistory(tx: Transaction, by: Acting, entry: Entry): Promise<void> {
  await tx.query({
    name: 'write-history',
    text: `insert into history (actor_id, token_id, action, subject_kind, subject_id, chip_id, detail)
           values ($1, $2, $3, $4, $5, $6, $7)`,
    values: [
      by.actorId,
      by.tokenId,
      entry.action,
      entry.subjectKind,
      entry.subjectId,
      entry.chipId,
      entry.detail ?? {},
    ],
  });
}

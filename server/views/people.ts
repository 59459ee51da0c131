/** Who did what, and with which right. */
import type { Viewer } from '../auth/index.ts';
import { historyId, wireId } from '../operations/index.ts';
import type { ActorRecord, HistoryRecord, TokenRecord } from '../store/records.ts';
import { timeOrNull, timeView } from './quantities.ts';

export function actorView(actor: ActorRecord) {
  return { id: wireId('act', actor.id), kind: actor.kind, name: actor.name };
}

/** Neither the secret's hash nor the lookup leaves the service. */
export function tokenView(token: TokenRecord) {
  return {
    id: wireId('tok', token.id),
    label: token.label,
    role: token.role,
    createdAt: timeView(token.createdAt),
    expiresAt: timeOrNull(token.expiresAt),
    revokedAt: timeOrNull(token.revokedAt),
    lastUsedAt: timeOrNull(token.lastUsedAt),
  };
}

export function viewerView(viewer: Viewer) {
  return {
    actor: actorView(viewer.actor),
    role: viewer.role,
    tokenExpiresAt: timeOrNull(viewer.expiresAt),
  };
}

/** What was done to what, in words: subjects may be gone from view while the entry stays. */
function subjectLabel({ subjectKind, subjectId, detail }: HistoryRecord): string {
  const text = (name: string): string => String(detail[name] ?? '');
  switch (subjectKind) {
    case 'Token':
      return `token "${text('label')}" of ${text('actor')}`;
    case 'Chip':
      return `chip ${text('serial')}`;
    case 'ChipRevision':
      return `revision ${text('number')}`;
    case 'DesignRequest':
      return 'design request';
    case 'Design':
      return `design ${subjectId.slice(0, 12)}`;
    case 'ConfigurationVersion':
      return `${text('configuration')} version ${text('number')}`;
    case 'Release':
      return `release ${text('name')} ${text('sequence')}`;
    default:
      return subjectKind;
  }
}

export function historyView(entry: HistoryRecord) {
  return {
    id: historyId(entry.id),
    at: timeView(entry.at),
    action: entry.action,
    subjectLabel: subjectLabel(entry),
    detail: entry.detail,
  };
}

/** Configurations, versions, releases. */
import { releaseId, wireId } from '../operations/index.ts';
import type { ConfigurationRecord, ReleaseRecord, VersionRecord } from '../store/records.ts';
import { settingView } from './design.ts';
import { timeOrNull, timeView } from './quantities.ts';

export function configurationView(configuration: ConfigurationRecord) {
  return {
    id: wireId('cfg', configuration.id),
    name: configuration.name,
    retiredAt: timeOrNull(configuration.retiredAt),
    createdAt: timeView(configuration.createdAt),
  };
}

export function versionView(version: VersionRecord) {
  return {
    id: wireId('ver', version.id),
    number: version.number,
    stale: version.chipRevisionNumber < version.headRevision,
    setting: settingView(version.setting),
    contentHash: version.contentHash,
    note: version.note,
    createdAt: timeView(version.createdAt),
  };
}

export function releaseView(release: ReleaseRecord) {
  return {
    id: releaseId(release),
    name: release.name,
    sequence: release.sequence,
    current: release.current,
    note: release.note,
    accepted: release.accepted,
    createdAt: timeView(release.createdAt),
  };
}

export const CHIP_COLUMNS = `id, serial, description, head_revision as "headRevision", retired_at as "retiredAt",
  created_at as "createdAt", created_by as "createdBy"`;

export const REVISION_COLUMNS = `id, chip_id as "chipId", number, hash, model, note, created_at as "createdAt",
  created_by as "createdBy"`;

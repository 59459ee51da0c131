import { validate as isUuid } from 'uuid';
import type { Database } from '../database.ts';
import { pageOf, readAfter } from '../page.ts';
import type { Configurations } from '../store.ts';

export const findConfiguration =
  (database: Database): Configurations['findConfiguration'] =>
  (chipId, name) =>
    database.prisma.configuration.findUnique({ where: { chipId_name: { chipId, name } } });

export const findConfigurationById =
  (database: Database): Configurations['findConfigurationById'] =>
  async (id) =>
    isUuid(id) ? database.prisma.configuration.findUnique({ where: { id } }) : null;

export const findConfigurationsById =
  (database: Database): Configurations['findConfigurationsById'] =>
  (ids) =>
    database.prisma.configuration.findMany({ where: { id: { in: ids.filter((id) => isUuid(id)) } } });

export const listConfigurations =
  (database: Database): Configurations['listConfigurations'] =>
  async (chipId, page) => {
    const after = readAfter(page, 'name');
    const rows = await database.prisma.configuration.findMany({
      where: { chipId, ...(after && { name: { gt: String(after[0]) } }) },
      orderBy: { name: 'asc' },
      take: page.first + 1,
    });
    return pageOf(rows, page.first, (row) => [row.name]);
  };

import { readFileSync } from 'node:fs';
import {
  buildClientSchema,
  buildSchema,
  findBreakingChanges,
  findDangerousChanges,
  getIntrospectionQuery,
  lexicographicSortSchema,
  printSchema,
} from 'graphql';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { publishedFile, servedSdl } from '../../../server/graphql/sdl.ts';
import { type Service, startService } from '../rest/service.ts';
import { read } from './ask.ts';

let service: Service;
beforeAll(async () => {
  service = await startService();
});
afterAll(() => service?.stop());

const published = buildSchema(readFileSync(publishedFile(), 'utf8'));

describe('the schema', () => {
  it('takes nothing away from what has been published [regression]', async () => {
    const served = buildClientSchema(await read(service, getIntrospectionQuery()));
    const changes = findBreakingChanges(published, served).map(({ description }) => description);
    expect(changes).toEqual([]);
  });

  it('adds nothing that has not been accepted: npx tsx scripts/publish-schema.ts [regression]', () => {
    expect(servedSdl()).toBe(readFileSync(publishedFile(), 'utf8'));
  });

  it('is told the same by introspection as it is written [cross-check]', async () => {
    const told = buildClientSchema(
      await read(
        service,
        getIntrospectionQuery({ inputValueDeprecation: true, specifiedByUrl: true, oneOf: true }),
      ),
    );
    // Where a directive was applied is not part of introspection.
    const written = buildSchema(servedSdl());
    expect(printSchema(lexicographicSortSchema(told))).toBe(printSchema(lexicographicSortSchema(written)));
  });

  it('would notice a field that is gone, and a type that changed', () => {
    const sdl = servedSdl();
    const without = buildSchema(sdl.replace('totalPowerMw: Float!', 'power: Float!'));
    expect(findBreakingChanges(published, without)).toMatchObject([{ type: 'FIELD_REMOVED' }]);
    const nullable = buildSchema(sdl.replace('totalPowerMw: Float!', 'totalPowerMw: Float'));
    expect(findBreakingChanges(published, nullable)).toMatchObject([{ type: 'FIELD_CHANGED_KIND' }]);
    const grown = buildSchema(`${sdl}\nextend type Setting { later: Int }`);
    expect([...findBreakingChanges(published, grown), ...findDangerousChanges(published, grown)]).toEqual([]);
  });
});

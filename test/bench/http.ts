/**
 * Over HTTP, 10 connections: a design that is in the store asked for again, and a configuration pulled by an instrument,
 * against a bare Fastify route with one prepared select of the row that the answer is made of, and against the same row
 * held in memory. All processes share this machine and one database.
 */
import autocannon from 'autocannon';
import type { BenchRow, Effort, Topic } from './row.ts';
import type { Services } from './services.ts';
import { median } from './statistics.ts';

const CONNECTIONS = 10;

interface Target {
  readonly name: string;
  readonly url: string;
  readonly status: number;
  readonly method?: 'POST';
  readonly headers?: Readonly<Record<string, string>>;
  readonly body?: string;
}

/** Requests a second. */
async function rateOf(target: Target, seconds: number): Promise<number> {
  const { url, method = 'GET', headers = {}, body } = target;
  const result = await autocannon({
    ...{ url, method, headers, connections: CONNECTIONS, duration: seconds },
    ...(body === undefined ? {} : { body }),
  });
  const right = result.statusCodeStats[String(target.status)]?.count ?? 0;
  if (result.errors > 0 || right === 0 || Object.keys(result.statusCodeStats).length > 1)
    throw new Error(`${target.name}: ${JSON.stringify(result.statusCodeStats)}, ${result.errors} errors`);
  return right / result.duration;
}

/** Every target in turn, round by round; the first round warms up and does not count. */
async function ratesOf(targets: readonly Target[], { quick }: Effort): Promise<Map<Target, number[]>> {
  const [rounds, seconds] = quick ? [2, 1] : [8, 3];
  const rates = new Map<Target, number[]>(targets.map((target) => [target, []]));
  for (let round = 0; round <= rounds; round++) {
    for (const target of targets) {
      const rate = await rateOf(target, seconds);
      if (round > 0) rates.get(target)!.push(rate);
    }
  }
  return rates;
}

function rowsOf(
  ours: Target,
  peers: readonly Target[],
  rates: ReadonlyMap<Target, readonly number[]>,
): BenchRow[] {
  const mine = rates.get(ours)!;
  return peers.map((peer) => {
    const other = rates.get(peer)!;
    return {
      name: ours.name,
      ours: median(mine),
      peer: median(other),
      peerName: peer.name,
      unit: 'requests/s',
      ratio: median(mine) / median(other),
      note: `best ${Math.max(...mine).toFixed(0)} and ${Math.max(...other).toFixed(0)}`,
    };
  });
}

function bareTargets(bare: string, table: string, id: string): Target[] {
  return [
    { name: 'bare route, one prepared select', url: `${bare}/select/${table}/${id}`, status: 200 },
    { name: 'bare route, JSON from memory', url: `${bare}/json/${table}/${id}`, status: 200 },
  ];
}

export async function benchHttp(services: Services, effort: Effort): Promise<Topic> {
  const { api, bare, token, stored, release } = services;
  const authorization = `Bearer ${token}`;
  const cached: Target = {
    ...{ name: 'cached design request', url: `${api}/v1/design-requests`, status: 200, method: 'POST' },
    headers: { authorization, 'content-type': 'application/json' },
    body: stored.body,
  };
  const pull: Target = {
    ...{ name: 'configuration pull, 200', url: `${api}${release.path}`, status: 200 },
    headers: { authorization },
  };
  const unchanged: Target = {
    ...{ name: 'configuration pull, 304', url: `${api}${release.path}`, status: 304 },
    headers: { authorization, 'if-none-match': release.etag },
  };
  const designs = bareTargets(bare, 'design', stored.id);
  const versions = bareTargets(bare, 'version', release.versionId);
  const designRates = await ratesOf([cached, ...designs], effort);
  const pullRates = await ratesOf([pull, unchanged, ...versions], effort);
  return {
    title: `Over HTTP, ${CONNECTIONS} connections`,
    rows: [
      ...rowsOf(cached, designs, designRates),
      ...rowsOf(pull, versions, pullRates),
      ...rowsOf(unchanged, versions, pullRates),
    ],
    missing: [],
  };
}

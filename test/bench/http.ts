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
/** Short, so that a moment when the machine is busy with something else meets neighbours alike. */
const TURN_S = 1;

interface Target {
  readonly name: string;
  readonly url: string;
  readonly status: number;
  readonly method?: 'POST';
  readonly headers?: Readonly<Record<string, string>>;
  readonly body?: string;
}

/** Requests a second. */
async function rateOf(target: Target): Promise<number> {
  const { url, method = 'GET', headers = {}, body } = target;
  const result = await autocannon({
    ...{ url, method, headers, connections: CONNECTIONS, duration: TURN_S },
    ...(body === undefined ? {} : { body }),
  });
  const right = result.statusCodeStats[String(target.status)]?.count ?? 0;
  if (result.errors > 0 || right === 0 || Object.keys(result.statusCodeStats).length > 1)
    throw new Error(`${target.name}: ${JSON.stringify(result.statusCodeStats)}, ${result.errors} errors`);
  return right / result.duration;
}

/** Every target in turn, round by round; the first round warms up and does not count. */
async function ratesOf(targets: readonly Target[], { quick }: Effort): Promise<Map<Target, number[]>> {
  const rounds = quick ? 3 : 12;
  const rates = new Map<Target, number[]>(targets.map((target) => [target, []]));
  for (let round = 0; round <= rounds; round++) {
    for (const target of targets) {
      const rate = await rateOf(target);
      if (round > 0) rates.get(target)!.push(rate);
    }
  }
  return rates;
}

/** The ratio is the median of the rounds' own ratios. */
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
      ratio: median(mine.map((rate, round) => rate / other[round]!)),
      note: `best ${Math.max(...mine).toFixed(0)} and ${Math.max(...other).toFixed(0)}`,
    };
  });
}

function bareTargets(bare: string, what: string, table: string, id: string): Target[] {
  return [
    { name: `bare route, one prepared select of ${what}`, url: `${bare}/select/${table}/${id}`, status: 200 },
    { name: `bare route, JSON of ${what} from memory`, url: `${bare}/json/${table}/${id}`, status: 200 },
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
  const designs = bareTargets(bare, 'the design', 'design', stored.id);
  const versions = bareTargets(bare, 'the setting', 'version', release.versionId);
  // A 304 needs no more than this: the peer that is hardest to keep up with.
  const heads = bareTargets(bare, 'the release head', 'head', services.chip);
  const designRates = await ratesOf([cached, ...designs], effort);
  const pullRates = await ratesOf([pull, unchanged, ...versions, ...heads], effort);
  return {
    title: `Over HTTP, ${CONNECTIONS} connections, logging every request`,
    rows: [
      ...rowsOf(cached, designs, designRates),
      ...rowsOf(pull, versions, pullRates),
      ...rowsOf(unchanged, [versions[0]!, ...heads], pullRates),
    ],
    missing: [],
  };
}

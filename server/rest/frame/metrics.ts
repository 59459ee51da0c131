/** Numbers for Prometheus, and one log line a request. Labels are route patterns, never what somebody typed. */
import type { FastifyInstance } from 'fastify';
import { Counter, collectDefaultMetrics, Gauge, Histogram, Registry } from 'prom-client';
import type { Store } from '../../store/store.ts';
import type { Waiting } from '../waiting.ts';

/** s: from a 304 to the longest long poll. */
const DURATION_BUCKETS = [0.001, 0.0025, 0.005, 0.01, 0.025, 0.05, 0.1, 0.25, 0.5, 1, 2.5, 5, 10, 60];

export interface Metrics {
  readonly contentType: string;
  text(): Promise<string>;
}

export function registerMetrics(app: FastifyInstance, store: Store, waiting: Waiting): Metrics {
  const registry = new Registry();
  collectDefaultMetrics({ register: registry });
  const registers = [registry];
  const requests = new Counter({
    name: 'ringbinder_http_requests_total',
    help: 'Requests answered, by method, route and status.',
    labelNames: ['method', 'route', 'status'] as const,
    registers,
  });
  const durations = new Histogram({
    name: 'ringbinder_http_request_duration_seconds',
    help: 'From the first byte read to the last byte sent, long polls included.',
    labelNames: ['method', 'route'] as const,
    buckets: DURATION_BUCKETS,
    registers,
  });
  new Gauge({
    name: 'ringbinder_long_polls_open',
    help: 'Long polls that wait at this moment.',
    registers,
    collect() {
      this.set(waiting.open);
    },
  });
  new Gauge({
    name: 'ringbinder_database_up',
    help: '1 while the database answers.',
    registers,
    async collect() {
      this.set((await store.ping().catch(() => false)) ? 1 : 0);
    },
  });
  new Gauge({
    name: 'ringbinder_computations',
    help: 'Computations of the whole service that are queued or running; absent while the database is away.',
    labelNames: ['state'] as const,
    registers,
    async collect() {
      this.reset();
      const depth = await store.queueDepth().catch(() => null);
      if (!depth) return;
      this.set({ state: 'QUEUED' }, depth.queued);
      this.set({ state: 'RUNNING' }, depth.running);
    },
  });

  app.addHook('onResponse', (request, reply, done) => {
    const { method } = request;
    const route = request.routeOptions.url ?? 'none';
    requests.inc({ method, route, status: reply.statusCode });
    durations.observe({ method, route }, reply.elapsedTime / 1000);
    request.log.info(
      {
        method,
        path: request.url.split('?', 1)[0],
        status: reply.statusCode,
        ms: Math.round(reply.elapsedTime * 10) / 10,
        ...(request.viewer ? { actor: request.viewer.actor.name } : {}),
      },
      'request',
    );
    done();
  });

  return { contentType: registry.contentType, text: () => registry.metrics() };
}

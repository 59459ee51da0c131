import { setTimeout as sleep } from 'node:timers/promises';
import { describe, expect, it } from 'vitest';
import { throttleRising } from '../../../server/jobs/throttle.ts';

const INTERVAL_MS = 100;

describe('progress reports', () => {
  it('go out at once, then at most one an interval, always the newest, the last one included', async () => {
    const sent: { value: number; at: number }[] = [];
    const report = throttleRising((value) => sent.push({ value, at: performance.now() }), INTERVAL_MS);
    for (let step = 1; step <= 50; step++) {
      report(step / 100);
      await sleep(5);
    }
    await sleep(2 * INTERVAL_MS);
    report.stop();
    expect(sent[0]!.value).toBe(0.01);
    expect(sent.at(-1)!.value).toBe(0.5);
    for (let i = 1; i < sent.length; i++) {
      expect(sent[i]!.value).toBeGreaterThan(sent[i - 1]!.value);
      // A timer may fire up to a millisecond early.
      expect(sent[i]!.at - sent[i - 1]!.at).toBeGreaterThan(INTERVAL_MS - 2);
    }
  });

  it('keep quiet at first: what ends soon sends none, what lasts sends its newest', async () => {
    const sent: number[] = [];
    const brief = throttleRising((value) => sent.push(value), INTERVAL_MS, INTERVAL_MS);
    brief(0.4);
    brief.stop();
    const lasting = throttleRising((value) => sent.push(value), INTERVAL_MS, INTERVAL_MS);
    lasting(0.1);
    lasting(0.2);
    expect(sent).toEqual([]);
    await sleep(2 * INTERVAL_MS);
    lasting.stop();
    expect(sent).toEqual([0.2]);
  });

  it('never fall, never repeat, and take no NaN', async () => {
    const sent: number[] = [];
    const report = throttleRising((value) => sent.push(value), 1);
    for (const value of [0, 0.3, 0.3, 0.2, Number.NaN, 0.4]) {
      report(value);
      await sleep(5);
    }
    report.stop();
    report(0.9);
    await sleep(5);
    expect(sent).toEqual([0.3, 0.4]);
  });
});

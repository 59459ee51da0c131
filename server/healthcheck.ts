/**
 * For containers: ends with 0 when the process beside it is well. An API process answers /healthz (not /readyz: it need
 * not be restarted because the database is away); a worker touches its heartbeat file every second.
 */
import { stat } from 'node:fs/promises';
import { readConfig } from './config.ts';

/** Longer than a sweep that waits for a busy database. */
const SILENCE_MS = 30_000;
const ANSWER_MS = 3_000;

async function isWell(): Promise<boolean> {
  const { heartbeatFile, port } = readConfig(process.env);
  if (heartbeatFile !== undefined) return Date.now() - (await stat(heartbeatFile)).mtimeMs < SILENCE_MS;
  const answer = await fetch(`http://127.0.0.1:${port}/healthz`, { signal: AbortSignal.timeout(ANSWER_MS) });
  return answer.ok;
}

process.exitCode = await isWell().then(
  (well) => (well ? 0 : 1),
  () => 1,
);

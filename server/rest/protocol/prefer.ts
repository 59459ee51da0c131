/** `Prefer: wait=N`, RFC 7240 sections 2 (syntax, first of a name wins, unknown preferences are ignored) and 4.3. */

import { LIMITS } from '../../../schema/limits.ts';

/** Longest wait granted, s: below the idle limits of ordinary proxies. A longer wish is clamped, and the clamp said. */
const LONGEST_WAIT_S = LIMITS.waitSeconds;

const WAIT = /^wait\s*=\s*(?:"(\d{1,9})"|(\d{1,9}))\s*(?:;|$)/i;

/** Seconds to wait, already clamped; null when nothing usable was preferred (a bad preference is ignored by rule). */
export function preferredWait(header: string | readonly string[] | undefined): number | null {
  if (header === undefined) return null;
  const text = typeof header === 'string' ? header : header.join(',');
  for (const preference of text.split(',')) {
    const found = WAIT.exec(preference.trim());
    if (found) return Math.min(Number(found[1] ?? found[2]), LONGEST_WAIT_S);
  }
  return null;
}

/** What `Preference-Applied` says of it. */
export const appliedWait = (seconds: number): string => `wait=${seconds}`;

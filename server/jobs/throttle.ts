/**
 * Lets the newest of many rising values through, at most one an interval, the last one of a burst included. Progress
 * reports are writes with a NOTIFY, and commits with NOTIFY queue behind one lock of the whole database. Nothing is sent in
 * the first `quietMs`: what ends within them needs no report.
 */
export interface Throttle {
  (value: number): void;
  /** Nothing is sent after this. */
  stop(): void;
}

export function throttleRising(send: (value: number) => void, intervalMs: number, quietMs = 0): Throttle {
  let best = 0;
  let sent = 0;
  let timer: NodeJS.Timeout | null = null;
  let stopped = false;
  const flush = (): void => {
    timer = null;
    if (stopped || best <= sent) return;
    sent = best;
    timer = setTimeout(flush, intervalMs);
    timer.unref();
    send(best);
  };
  if (quietMs > 0) {
    timer = setTimeout(flush, quietMs);
    timer.unref();
  }
  const offer = (value: number): void => {
    if (!(value > best)) return;
    best = value;
    if (timer === null) flush();
  };
  return Object.assign(offer, {
    stop(): void {
      stopped = true;
      if (timer !== null) clearTimeout(timer);
    },
  });
}

/** The queue library's messages in our logs, at our levels. Its "info" is one line a job: ours says more. */
import { Logger as QueueLogger } from 'graphile-worker';
import type { Logger } from 'pino';

export function queueLogger(logger: Logger): QueueLogger {
  return new QueueLogger((scope) => (libraryLevel, message, meta) => {
    // A failed run is the queue working as it should: it comes again.
    const level = meta?.failure === true ? 'warning' : String(libraryLevel);
    const fields = { queue: scope.label, job: scope.jobId };
    if (level === 'error') logger.error(fields, message);
    else if (level === 'warning') logger.warn(fields, message);
    else logger.debug(fields, message);
  });
}

/** What the entry points share: read the environment, start, tell the terminal, end well. */
import type { Logger } from 'pino';
import { type Config, ConfigurationError, readConfig, unknownVariables } from './config.ts';
import { createLogger } from './logger.ts';
import { type Parts, type RunningProcess, startProcess } from './process.ts';

/** Beyond the time that jobs get, for connections and the database. After it the process ends as it is. */
const STOP_MARGIN_MS = 15_000;
/** sysexits.h: configuration error. */
const EXIT_CONFIGURATION = 78;
const EXIT_INTERRUPTED = 130;

/** For people, so not through the logger; and secrets may stand here, once. */
function tellTerminal({ url, dataFolder, firstAdminToken }: RunningProcess): void {
  const lines: string[] = [];
  if (url !== null) {
    lines.push(`REST     ${url}/v1       described at ${url}/docs`);
    lines.push(`GraphQL  ${url}/graphql  to try at ${url}/graphiql`);
  }
  if (dataFolder !== null) lines.push(`Data     ${dataFolder}`);
  if (firstAdminToken !== null)
    lines.push('', 'First admin token, shown this once; keep it:', `  ${firstAdminToken}`);
  if (lines.length > 0) process.stdout.write(`\n${lines.join('\n')}\n\n`);
}

/**
 * One Ctrl-C often arrives twice: from the terminal, which tells every process of its group, and from a launcher that
 * passes it on. Only a signal that comes later than this is a second wish.
 */
const SAME_SIGNAL_MS = 1_000;
const PARENT_CHECK_MS = 1_000;

/** npm tells its shell to end and not us: started by npm, we end when our parent has gone. */
function onParentGone(end: () => void): void {
  if (process.env.npm_lifecycle_event === undefined) return;
  const parent = process.ppid;
  const timer = setInterval(() => {
    if (process.ppid === parent) return;
    clearInterval(timer);
    end();
  }, PARENT_CHECK_MS);
  timer.unref();
}

function endOnSignals(running: RunningProcess, config: Config, logger: Logger): void {
  let endingSince: number | null = null;
  const end = (cause: string): void => {
    if (endingSince !== null) {
      if (performance.now() - endingSince > SAME_SIGNAL_MS) process.exit(EXIT_INTERRUPTED);
      return;
    }
    endingSince = performance.now();
    logger.info({ cause }, 'ending: connections drain, computations finish or go back to the queue');
    setTimeout(
      () => {
        logger.error({}, 'did not end in time');
        process.exit(1);
      },
      config.drainS * 1000 + STOP_MARGIN_MS,
    ).unref();
    running.stop().then(
      () => process.exit(0),
      () => process.exit(1),
    );
  };
  process.on('SIGTERM', end);
  process.on('SIGINT', end);
  onParentGone(() => end('parent gone'));
}

export interface RunOptions {
  /** Changes what the environment says, before anything starts. */
  readonly adjust?: (config: Config) => Config;
  /** Once it serves; the process goes on serving afterwards, and ends when this fails. */
  readonly afterStart?: (running: RunningProcess) => Promise<void>;
}

/** Runs until a signal ends it: SIGTERM or SIGINT once ends cleanly, twice at once. */
export async function runProcess(parts: Parts, { adjust, afterStart }: RunOptions = {}): Promise<void> {
  try {
    const environment = readConfig(process.env);
    const config = adjust ? adjust(environment) : environment;
    const logger = createLogger(config.logLevel);
    for (const name of unknownVariables(process.env))
      logger.warn({ variable: name }, 'not a variable of this service: misspelt?');
    const running = await startProcess(config, parts, logger);
    endOnSignals(running, config, logger);
    if (afterStart) await afterStart(running);
    tellTerminal(running);
  } catch (error) {
    const isConfiguration = error instanceof ConfigurationError;
    if (isConfiguration) process.stderr.write(`${error.message}\n`);
    else createLogger('error').fatal({ err: error }, 'could not start');
    process.exit(isConfiguration ? EXIT_CONFIGURATION : 1);
  }
}

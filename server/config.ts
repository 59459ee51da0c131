/**
 * The environment, read once. Every variable, its default and what it does stand in one list; the README's table is
 * checked against it. A wrong value ends the start with a message that names the variable and what it takes.
 */
import { availableParallelism } from 'node:os';
import { z } from 'zod';
import { LIMITS } from '../schema/limits.ts';

const LOG_LEVELS = ['trace', 'debug', 'info', 'warn', 'error', 'fatal', 'silent'] as const;

/** `rbt_<12 letters or digits>_<43 base64url>`, as the service itself makes them. */
const TOKEN_PATTERN = /^rbt_[a-z0-9]{12}_[A-Za-z0-9_-]{43}$/;

const wholeNumber = (least: number, most: number) =>
  z
    .string()
    .regex(/^\d+$/, `a whole number from ${least} to ${most}`)
    .transform(Number)
    .refine((value) => value >= least && value <= most, `a whole number from ${least} to ${most}`);

const trueOrFalse = z
  .enum(['true', 'false'], { error: 'true or false' })
  .transform((text) => text === 'true');

const isDatabaseUrl = (text: string): boolean => {
  try {
    return ['postgres:', 'postgresql:'].includes(new URL(text).protocol);
  } catch {
    return false;
  }
};

/** Addresses whose `X-Forwarded-*` headers are believed: none, all, or a list. */
const trustProxy = z.string().transform((text): boolean | readonly string[] => {
  if (text === 'true' || text === 'false') return text === 'true';
  return text.split(',').map((part) => part.trim());
});

interface Variable<T> {
  readonly rule: z.ZodType<T, string>;
  /** Text as it would stand in the environment; absent: there is no default and the variable may be left out. */
  readonly fallback?: string;
  /** What the README says instead of `fallback` where that depends on the machine. */
  readonly fallbackNote?: string;
  readonly description: string;
}

const variable = <T>(
  rule: z.ZodType<T, string>,
  description: string,
  fallback?: string,
  fallbackNote?: string,
): Variable<T> => ({
  rule,
  description,
  ...(fallback === undefined ? {} : { fallback }),
  ...(fallbackNote === undefined ? {} : { fallbackNote }),
});

const VARIABLES = {
  DATABASE_URL: variable(
    z.string().refine(isDatabaseUrl, 'a URL that starts with postgres:// or postgresql://'),
    'PostgreSQL (15 or newer) to use. Without it `npm start` runs its own in the data folder; `npm run api` and `npm run worker` need it.',
  ),
  RINGBINDER_DATA: variable(
    z.string().min(1, 'the path of a folder'),
    'Folder of the database that the service starts itself.',
    '.ringbinder',
  ),
  HOST: variable(
    z.string().min(1, 'a host name or address'),
    'Address to listen on. `0.0.0.0` opens the service to the network: put TLS in front of it.',
    '127.0.0.1',
  ),
  PORT: variable(wholeNumber(0, 65_535), 'Port to listen on; 0 takes a free one.', '8137'),
  LOG_LEVEL: variable(
    z.enum(LOG_LEVELS, { error: `one of ${LOG_LEVELS.join(', ')}` }),
    `How much is logged: ${LOG_LEVELS.join(', ')}.`,
    'info',
  ),
  RINGBINDER_ADMIN_TOKEN: variable(
    z.string().regex(TOKEN_PATTERN, 'rbt_, 12 small letters or digits, _, 43 base64url characters'),
    'The first admin token. Without it one is made at the first start and printed once to the terminal.',
  ),
  RINGBINDER_THREADS: variable(
    wholeNumber(1, 256),
    'Designs that one worker process computes at the same time, each in a thread of its own.',
    String(Math.max(1, availableParallelism() - 1)),
    'cores − 1',
  ),
  RINGBINDER_COMPUTATION_TIMEOUT_S: variable(
    wholeNumber(1, 86_400),
    'Seconds after which a computation is ended and its requests fail with COMPUTATION_TIMED_OUT.',
    '300',
  ),
  RINGBINDER_DRAIN_S: variable(
    wholeNumber(0, 600),
    'Seconds that running computations get to finish when the process is told to stop; then they are given back to the queue.',
    '5',
  ),
  RINGBINDER_POOL_SIZE: variable(
    wholeNumber(5, 500),
    'Connections to PostgreSQL that one process keeps at most, and as many again for its worker.',
    '20',
  ),
  RINGBINDER_QUEUE_LIMIT: variable(
    wholeNumber(1, 1_000_000),
    'Computations that may wait at once; beyond it new requests get QUEUE_FULL.',
    String(LIMITS.queuedRequests),
  ),
  RINGBINDER_RATE_PER_S: variable(
    wholeNumber(1, 1_000_000),
    'Requests a second that one token may make of one process; bursts up to twice as many.',
    String(LIMITS.requestsPerSecond),
  ),
  RINGBINDER_HEARTBEAT: variable(
    z.string().min(1, 'the path of a file'),
    'File that a worker touches every second while it reaches the queue; for health checks.',
  ),
  RINGBINDER_OPEN_INTROSPECTION: variable(
    trueOrFalse,
    'Whether the GraphQL schema may be asked about without a token. The demo opens it; records need a token in any case.',
    'false',
  ),
  RINGBINDER_TRUST_PROXY: variable(
    trustProxy,
    'Whether forwarded addresses are believed: `true`, `false`, or addresses and networks of the proxies, separated by commas.',
    'false',
  ),
} as const;

type Name = keyof typeof VARIABLES;

export interface Config {
  readonly databaseUrl?: string;
  readonly dataFolder: string;
  readonly host: string;
  readonly port: number;
  readonly logLevel: (typeof LOG_LEVELS)[number];
  readonly adminToken?: string;
  readonly threads: number;
  readonly computationTimeoutS: number;
  readonly drainS: number;
  readonly poolSize: number;
  readonly queueLimit: number;
  readonly ratePerS: number;
  readonly heartbeatFile?: string;
  readonly openIntrospection: boolean;
  readonly trustProxy: boolean | readonly string[];
}

/** One line of the configuration table. */
export interface VariableDescription {
  readonly name: string;
  /** `–` where there is none. */
  readonly fallback: string;
  readonly description: string;
}

export const CONFIGURATION: readonly VariableDescription[] = Object.entries<Variable<unknown>>(VARIABLES).map(
  ([name, { fallback, fallbackNote, description }]) => ({
    name,
    fallback: fallbackNote ?? fallback ?? '–',
    description,
  }),
);

/** The table that stands in the README, in Markdown. */
export function configurationTable(): string {
  const lines = CONFIGURATION.map(
    ({ name, fallback, description }) =>
      `| \`${name}\` | ${/^[\w.]+$/.test(fallback) ? `\`${fallback}\`` : fallback} | ${description} |`,
  );
  return ['| variable | default | what it does |', '|---|---|---|', ...lines].join('\n');
}

/** The environment does not describe a service that can start. The message names every variable that is wrong. */
export class ConfigurationError extends Error {
  override readonly name = 'ConfigurationError';
}

/**
 * Reads and checks the environment. An empty variable counts as absent. Values are never echoed: some are secrets.
 * @throws ConfigurationError
 */
export function readConfig(environment: Readonly<Record<string, string | undefined>>): Config {
  const wrong: string[] = [];
  const read = <N extends Name>(name: N): z.output<(typeof VARIABLES)[N]['rule']> | undefined => {
    const { rule, fallback }: Variable<unknown> = VARIABLES[name];
    const text = environment[name] || fallback;
    if (text === undefined) return undefined;
    const parsed = rule.safeParse(text);
    if (parsed.success) return parsed.data as z.output<(typeof VARIABLES)[N]['rule']>;
    wrong.push(`${name} must be ${parsed.error.issues[0]?.message ?? 'valid'}`);
    return undefined;
  };
  const databaseUrl = read('DATABASE_URL');
  const adminToken = read('RINGBINDER_ADMIN_TOKEN');
  const heartbeatFile = read('RINGBINDER_HEARTBEAT');
  // Every other variable has a default: `undefined` only where it is wrong, and then nothing is returned.
  const config = {
    ...(databaseUrl === undefined ? {} : { databaseUrl }),
    dataFolder: read('RINGBINDER_DATA') as string,
    host: read('HOST') as string,
    port: read('PORT') as number,
    logLevel: read('LOG_LEVEL') as Config['logLevel'],
    ...(adminToken === undefined ? {} : { adminToken }),
    threads: read('RINGBINDER_THREADS') as number,
    computationTimeoutS: read('RINGBINDER_COMPUTATION_TIMEOUT_S') as number,
    drainS: read('RINGBINDER_DRAIN_S') as number,
    poolSize: read('RINGBINDER_POOL_SIZE') as number,
    queueLimit: read('RINGBINDER_QUEUE_LIMIT') as number,
    ratePerS: read('RINGBINDER_RATE_PER_S') as number,
    ...(heartbeatFile === undefined ? {} : { heartbeatFile }),
    openIntrospection: read('RINGBINDER_OPEN_INTROSPECTION') as boolean,
    trustProxy: read('RINGBINDER_TRUST_PROXY') as boolean | readonly string[],
  };
  if (wrong.length > 0) throw new ConfigurationError(`Configuration: ${wrong.join('; ')}.`);
  return config;
}

/** Variables that look like ours and are not: a misspelt name, worth a warning at the start. */
export function unknownVariables(
  environment: Readonly<Record<string, string | undefined>>,
): readonly string[] {
  return Object.keys(environment).filter((name) => name.startsWith('RINGBINDER_') && !(name in VARIABLES));
}

/**
 * Structured logs, one JSON object a line, without secrets: known fields are redacted, and the finished line is
 * searched for what looks like a token or a password in a URL, wherever it came from (an error's message, a query).
 */
import { type DestinationStream, type Logger, pino } from 'pino';

const REDACTED_PATHS = [
  'authorization',
  'token',
  'secret',
  'password',
  'databaseUrl',
  'adminToken',
  'headers.authorization',
  'headers.cookie',
  'req.headers.authorization',
  'req.headers.cookie',
  'config.databaseUrl',
  'config.adminToken',
];

/** The look-up part of a token is no secret and tells which one it was; the rest is. */
const TOKEN = /(rbt_[a-z0-9]{12}_)[A-Za-z0-9_-]{8,}/g;
/** User and password of any URL, up to the last @ before a quote, blank or path. */
const URL_PASSWORD = /([a-z][a-z0-9+.-]*:\/\/[^\s"'/:@]*):[^\s"'/]+@/gi;

/** `text` with tokens and URL passwords made unreadable. Every line comes through here, and few hold what could be one. */
export function withoutSecrets(text: string): string {
  const tokenless = text.includes('rbt_') ? text.replace(TOKEN, '$1[redacted]') : text;
  return tokenless.includes('://') ? tokenless.replace(URL_PASSWORD, '$1:[redacted]@') : tokenless;
}

/** @param destination standard output unless a test reads along. */
export function createLogger(level: string, destination?: DestinationStream): Logger {
  const options = {
    level,
    base: { pid: process.pid },
    redact: { paths: REDACTED_PATHS, censor: '[redacted]' },
    hooks: { streamWrite: withoutSecrets },
  };
  return destination === undefined ? pino(options) : pino(options, destination);
}

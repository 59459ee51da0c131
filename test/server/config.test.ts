import { existsSync, readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import {
  CONFIGURATION,
  ConfigurationError,
  configurationTable,
  readConfig,
  unknownVariables,
} from '../../server/config.ts';
import { createLogger, withoutSecrets } from '../../server/logger.ts';

const TOKEN = `rbt_abcdefghjkm0_${'A'.repeat(43)}`;

describe('configuration', () => {
  it('has a default for everything that is needed to start', () => {
    const config = readConfig({});
    expect(config.databaseUrl).toBeUndefined();
    expect(config.host).toBe('127.0.0.1');
    expect(config.threads).toBeGreaterThanOrEqual(1);
    expect(config.trustProxy).toBe(false);
  });

  it('reads every variable in its own type', () => {
    const config = readConfig({
      DATABASE_URL: 'postgresql://lab@db/ringbinder',
      PORT: '0',
      RINGBINDER_ADMIN_TOKEN: TOKEN,
      RINGBINDER_THREADS: '3',
      RINGBINDER_TRUST_PROXY: '10.0.0.0/8, 127.0.0.1',
    });
    expect(config).toMatchObject({
      databaseUrl: 'postgresql://lab@db/ringbinder',
      port: 0,
      adminToken: TOKEN,
      threads: 3,
      trustProxy: ['10.0.0.0/8', '127.0.0.1'],
    });
  });

  it.each([
    ['DATABASE_URL', 'mysql://db/x', /postgres:\/\//],
    ['PORT', '80000', /0 to 65535/],
    ['PORT', '8o', /whole number/],
    ['RINGBINDER_THREADS', '0', /1 to 256/],
    ['RINGBINDER_COMPUTATION_TIMEOUT_S', '-1', /whole number/],
    ['LOG_LEVEL', 'loud', /one of trace/],
    ['RINGBINDER_ADMIN_TOKEN', 'hunter2', /43 base64url/],
  ])(
    'refuses %s=%s, names the variable and what it takes, and never echoes the value',
    (name, value, takes) => {
      const attempt = () => readConfig({ [name]: value });
      expect(attempt).toThrow(ConfigurationError);
      expect(attempt).toThrow(takes);
      expect(attempt).toThrow(new RegExp(`${name} must be`));
      expect(attempt).not.toThrow(new RegExp(`${value.replace(/[/.]/g, '\\$&')}(?!\\d)`));
    },
  );

  it('names all wrong variables at once, and knows a misspelt one', () => {
    expect(() => readConfig({ PORT: 'x', LOG_LEVEL: 'y' })).toThrow(/PORT.*LOG_LEVEL|LOG_LEVEL.*PORT/);
    expect(unknownVariables({ RINGBINDER_THREAD: '2', RINGBINDER_THREADS: '2', HOME: '/' })).toEqual([
      'RINGBINDER_THREAD',
    ]);
  });

  it('takes an empty variable for an absent one', () => {
    expect(readConfig({ DATABASE_URL: '', PORT: '' }).port).toBe(readConfig({}).port);
  });

  it('is described in the README, line by line', () => {
    const readme = new URL('../../README.md', import.meta.url);
    expect(existsSync(readme)).toBe(true);
    const text = readFileSync(readme, 'utf8');
    for (const line of configurationTable().split('\n')) expect(text).toContain(line);
    expect(CONFIGURATION.length).toBeGreaterThanOrEqual(10);
  });
});

describe('logs', () => {
  const logged = (write: (logger: ReturnType<typeof createLogger>) => void): string => {
    let text = '';
    write(
      createLogger('info', {
        write(line: string) {
          text += line;
        },
      }),
    );
    return text;
  };

  it('carry no authorization header, token or database password', () => {
    const url = 'postgres://lab:s3cr%40t@db:5432/x';
    const text = logged((logger) => {
      logger.info({ req: { headers: { authorization: `Bearer ${TOKEN}` } } }, 'in');
      logger.info({ config: { databaseUrl: url } }, `connecting to ${url}`);
      logger.error(new Error(`no route to ${url} for ${TOKEN}`));
    });
    expect(text.split('\n').filter(Boolean)).toHaveLength(4 - 1);
    expect(text).not.toContain('s3cr');
    expect(text).not.toContain('A'.repeat(8));
    expect(text).toContain('postgres://lab:[redacted]@db:5432/x');
    expect(text).toContain('rbt_abcdefghjkm0_[redacted]');
    for (const line of text.trim().split('\n')) expect(() => JSON.parse(line)).not.toThrow();
  });

  it('leave ordinary text alone', () => {
    const text = 'GET http://lab.example:8137/v1/chips?first=5 by a@b';
    expect(withoutSecrets(text)).toBe(text);
  });
});

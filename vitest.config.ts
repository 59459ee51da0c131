import { defineConfig } from 'vitest/config';

export default defineConfig({
  // The package comes in two forms that do not know each other's types; Node takes this one, for everybody.
  resolve: { alias: [{ find: /^graphql$/, replacement: 'graphql/index.js' }] },
  test: {
    include: ['test/**/*.test.ts'],
    globalSetup: ['test/support/global-setup.ts'],
    testTimeout: 60_000,
    hookTimeout: 120_000,
    maxWorkers: 2,
  },
});

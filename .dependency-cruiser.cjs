/** Who may import whom. Types count like values; `scripts/check-imports.mjs` runs this and checks that it saw something. */

/** A rule in one line: modules under `from` import nothing that matches `to`, but for `except`. */
const forbid = (name, comment, from, to, { fromExcept, toExcept } = {}) => ({
  name,
  comment,
  severity: 'error',
  from: { path: from, ...(fromExcept ? { pathNot: fromExcept } : {}) },
  to: { path: to, ...(toExcept ? { pathNot: toExcept } : {}) },
});

const packages = (...names) => `(^|/)node_modules/(${names.join('|')})/`;

/**
 * Files that declare types and nothing else: the language all layers share. They may be imported as they are, so that
 * naming a type does not load (or, for cycles, involve) the folder it is declared in.
 */
const DECLARATIONS = [
  '^src/chip/(model|setting)\\.ts$',
  '^src/circuit/circuit\\.ts$',
  '^src/filter/(specification|transfer-function)\\.ts$',
  '^src/response/response\\.ts$',
  '^src/design/design\\.ts$',
  '^server/store/(store|records)\\.ts$',
];
const FACES = ['^(src|server)/[^/]+/index\\.ts$', ...DECLARATIONS];

module.exports = {
  forbidden: [
    {
      name: 'no-cycles',
      comment:
        'A cycle means that two modules are one, or that one of them holds something that belongs elsewhere.',
      severity: 'error',
      from: {},
      to: { circular: true },
    },
    {
      name: 'resolvable',
      comment: 'Every import must lead somewhere.',
      severity: 'error',
      from: {},
      to: { couldNotResolve: true },
    },
    forbid(
      'core-stands-alone',
      'The numerical core: no I/O, no clock, no framework. It imports itself and complex.js.',
      '^src/',
      '.',
      { toExcept: `^src/|${packages('complex\\.js')}` },
    ),
    forbid(
      'schema-is-rules',
      'What crosses the wire: zod rules over the core, nothing that does anything.',
      '^schema/',
      '.',
      { toExcept: `^(schema|src)/|${packages('zod')}` },
    ),
    forbid(
      'server-stands-on-its-own-feet',
      'What runs does not need tests, scripts or examples.',
      '^server/',
      '^(test|scripts|examples)/',
    ),
    forbid('demo-is-a-leaf', 'Invented data lives in the demo alone.', '^server/(?!demo/)', '^server/demo/'),
    forbid(
      'only-the-store-talks-to-postgresql',
      'The driver and Prisma stay behind server/store; server/embedded asks a server whether it is well.',
      '^(src|schema|server)/',
      packages('pg', 'pg-[^/]+', 'prisma', '@prisma/[^/]+'),
      { fromExcept: '^server/(store|embedded)/' },
    ),
    forbid(
      'only-the-doors-know-http',
      'Operations, store and jobs do not know which door somebody came through.',
      '^(src|schema|server)/',
      packages('fastify', 'fastify-[^/]+', '@fastify/[^/]+', 'mercurius'),
      { fromExcept: '^server/(app\\.ts|rest/|graphql/)' },
    ),
    forbid(
      'only-jobs-know-the-queue',
      'The queue is a detail of jobs; the store puts work into it in its own transactions.',
      '^(src|schema|server)/',
      packages('graphile-worker', 'piscina'),
      { fromExcept: '^server/(jobs|store)/' },
    ),
    forbid(
      'only-plots-draw',
      'Plotting libraries stay behind server/plots.',
      '^(src|schema|server)/',
      packages('vega', 'vega-[^/]+'),
      { fromExcept: '^server/plots/' },
    ),
    {
      name: 'declarations-declare',
      comment: 'A file that others may import past the face of its folder imports types alone.',
      severity: 'error',
      from: { path: DECLARATIONS },
      to: { dependencyTypesNot: ['type-only', 'type-import'] },
    },
    {
      name: 'folders-have-a-face',
      comment: 'Others import a folder through its index.ts only, so that what is behind it can change.',
      severity: 'error',
      from: { path: '^(src|server)/([^/]+)/' },
      to: {
        path: '^(src|server)/[^/]+/.+',
        pathNot: ['^$1/$2/', ...FACES],
      },
    },
    {
      name: 'folders-have-a-face-for-those-outside',
      comment: 'The same for modules that stand in no folder of their own.',
      severity: 'error',
      from: { path: '^(schema/|server/[^/]+\\.ts$)' },
      to: {
        path: '^(src|server)/[^/]+/.+',
        pathNot: FACES,
      },
    },
  ],
  options: {
    tsPreCompilationDeps: true,
    tsConfig: { fileName: 'tsconfig.json' },
    doNotFollow: { path: ['node_modules', '^server/store/generated/'] },
    exclude: { path: ['^dist/'] },
    enhancedResolveOptions: {
      exportsFields: ['exports'],
      conditionNames: ['import', 'types', 'node', 'default'],
    },
  },
};

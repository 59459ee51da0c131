// Runs the import rules of .dependency-cruiser.cjs, and makes sure that they were applied to something: a cruiser that
// cannot read the compiler it finds sees no modules at all and reports no violations.
import { createRequire } from 'node:module';
import { cruise, format } from 'dependency-cruiser';
import extractTSConfig from 'dependency-cruiser/config-utl/extract-ts-config';

const FOLDERS = ['src', 'schema', 'server'];
/** Far below what is there, far above what a misread tree would show. */
const LEAST_MODULES = 50;
const LEAST_IMPORTS = 200;

const { forbidden, options } = createRequire(import.meta.url)('../.dependency-cruiser.cjs');
const { output } = await cruise(FOLDERS, { ...options, validate: true, ruleSet: { forbidden } }, undefined, {
  tsConfig: extractTSConfig('tsconfig.json'),
});
const own = output.modules.filter(({ source }) => FOLDERS.some((folder) => source.startsWith(`${folder}/`)));
const imports = own.reduce((sum, { dependencies }) => sum + dependencies.length, 0);
const seen = new Set(own.map(({ source }) => source.split('/')[0]));

if (own.length < LEAST_MODULES || imports < LEAST_IMPORTS || seen.size < FOLDERS.length) {
  console.error(
    `Import check: only ${own.length} modules with ${imports} imports in ${[...seen]}: it is blind.`,
  );
  process.exit(1);
}
const { violations, error } = output.summary;
if (error > 0) {
  console.error((await format(output, { outputType: 'err' })).output);
  process.exit(1);
}
console.log(`Imports: ${own.length} modules, ${imports} imports, ${violations.length} violations.`);

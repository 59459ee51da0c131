/**
 * What must agree between the parts of a chip model: couplers with cells, channels with elements, the crosstalk
 * matrix with the channels. A model that passes can be simulated and set without further questions.
 */
import type { z } from 'zod';
import type { ChipModelInput, CouplerInput, InterferometerCellInput } from './chip-parts.ts';

type Issues = z.core.$ZodRawIssue[];
type Path = readonly (string | number)[];

function report(issues: Issues, path: Path, input: unknown, message: string, allowed?: unknown): void {
  const params = { code: 'BAD_INPUT', ...(allowed === undefined ? {} : { allowed }) };
  issues.push({ code: 'custom', path: [...path], input, message, params });
}

function reportRepeats(
  issues: Issues,
  values: readonly string[],
  pathOf: (i: number) => Path,
  what: string,
): void {
  const seen = new Set<string>();
  values.forEach((value, i) => {
    if (seen.has(value)) report(issues, pathOf(i), value, `${what} "${value}" is given twice`);
    seen.add(value);
  });
}

function checkCoupler(coupler: CouplerInput, path: Path, issues: Issues): void {
  const { tunable, powerCrossCoupling: fixed, minCoupling: low, maxCoupling: high } = coupler;
  if (!tunable && fixed === undefined) {
    report(
      issues,
      [...path, 'powerCrossCoupling'],
      undefined,
      'a fixed coupler needs its powerCrossCoupling',
      { min: 0, max: 1 },
    );
  }
  if (tunable && fixed !== undefined) {
    report(
      issues,
      [...path, 'powerCrossCoupling'],
      fixed,
      'a tunable coupler has minCoupling and maxCoupling instead',
    );
  }
  for (const name of ['minCoupling', 'maxCoupling', 'heatedArm'] as const) {
    if (!tunable && coupler[name] !== undefined) {
      report(issues, [...path, name], coupler[name], `a fixed coupler has no ${name}`);
    }
  }
  if (tunable && (low ?? 0) >= (high ?? 1)) {
    report(issues, [...path, 'minCoupling'], low ?? 0, 'must be below maxCoupling', { below: high ?? 1 });
  }
}

function checkCell(cell: InterferometerCellInput, path: Path, issues: Issues): void {
  const rings = (cell.ringsPerArm[0] ?? 0) + (cell.ringsPerArm[1] ?? 0);
  const expected = ['input', 'output', ...Array.from({ length: rings }, (_, k) => `ring${k + 1}`)];
  const given = cell.couplers.map((c) => c.element);
  reportRepeats(issues, given, (i) => [...path, 'couplers', i, 'element'], 'coupler');
  given.forEach((element, i) => {
    if (expected.includes(element)) return;
    const message = `the cell has ${rings} rings, so there is no coupler "${element}"`;
    report(issues, [...path, 'couplers', i, 'element'], element, message, expected);
  });
  const missing = expected.filter((element) => !given.includes(element));
  if (missing.length > 0) {
    report(issues, [...path, 'couplers'], given, `couplers are missing: ${missing.join(', ')}`, expected);
  }
  for (const [i, c] of cell.couplers.entries()) checkCoupler(c, [...path, 'couplers', i], issues);
}

/** What a heater can sit on: tunable couplers, rings and arms, as element paths. */
function drivableElements(cells: ChipModelInput['cells']): string[] {
  return cells.flatMap(({ interferometer: cell }) => {
    const rings = (cell.ringsPerArm[0] ?? 0) + (cell.ringsPerArm[1] ?? 0);
    return [
      ...cell.couplers.filter((c) => c.tunable).map((c) => `${cell.name}.${c.element}.coupling`),
      ...Array.from({ length: rings }, (_, k) => `${cell.name}.ring${k + 1}.phase`),
      `${cell.name}.arm.phase`,
    ];
  });
}

/** An element without a heater would sit at a coupling or phase nobody has stated, so each needs its channel. */
function checkChannels(model: ChipModelInput, issues: Issues): void {
  const drivable = drivableElements(model.cells);
  const driven = model.channels.map((c) => c.drives);
  reportRepeats(
    issues,
    model.channels.map((c) => c.channel),
    (i) => ['channels', i, 'channel'],
    'channel',
  );
  reportRepeats(issues, driven, (i) => ['channels', i, 'drives'], 'element');
  driven.forEach((path, i) => {
    if (drivable.includes(path)) return;
    report(
      issues,
      ['channels', i, 'drives'],
      path,
      'names no tunable coupler, ring phase or arm phase of this chip',
      drivable,
    );
  });
  const missing = drivable.filter((path) => !driven.includes(path));
  if (missing.length > 0) {
    report(issues, ['channels'], driven, `no channel drives ${missing.join(', ')}`, drivable);
  }
  model.channels.forEach((c, i) => {
    if (c.resolutionMa > c.currentLimitMa) {
      report(issues, ['channels', i, 'resolutionMa'], c.resolutionMa, 'must not exceed currentLimitMa', {
        max: c.currentLimitMa,
      });
    }
  });
}

/**
 * Square, unit diagonal, strictly diagonally dominant by rows: the matrix can then be inverted, and no heater acts
 * on its neighbour as strongly as that neighbour's own.
 */
function checkCrosstalk(model: ChipModelInput, issues: Issues): void {
  const { crosstalk } = model;
  if (crosstalk === undefined) return;
  const n = model.channels.length;
  if (crosstalk.length !== n) {
    report(issues, ['crosstalk'], crosstalk.length, `must have one row for each of the ${n} channels`, {
      rows: n,
    });
  }
  crosstalk.forEach((row, i) => {
    if (row.length !== n) {
      report(issues, ['crosstalk', i], row.length, `must have one entry for each of the ${n} channels`, {
        columns: n,
      });
      return;
    }
    if (row[i] !== undefined && row[i] !== 1) {
      report(
        issues,
        ['crosstalk', i, i],
        row[i],
        'the diagonal is 1: a heater acts fully on its own element',
        1,
      );
    }
    const others = row.reduce((sum, value, j) => sum + (j === i ? 0 : Math.abs(value)), 0);
    if (others >= 1) {
      const message = 'all other heaters together must act less on an element than its own heater does';
      report(issues, ['crosstalk', i], others, message, { sumBelow: 1 });
    }
  });
}

export function checkReferences(model: ChipModelInput, issues: Issues): void {
  reportRepeats(
    issues,
    model.cells.map((c) => c.interferometer.name),
    (i) => ['cells', i, 'interferometer', 'name'],
    'cell',
  );
  for (const [i, c] of model.cells.entries()) {
    checkCell(c.interferometer, ['cells', i, 'interferometer'], issues);
  }
  checkChannels(model, issues);
  checkCrosstalk(model, issues);
}

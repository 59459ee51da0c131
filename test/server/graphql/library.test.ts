import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { startNext } from '../rest/computing.ts';
import { ask, askTwice, read } from './ask.ts';
import {
  type Lab,
  openLab,
  publishRelease,
  REQUEST,
  registerChip,
  requestDesign,
  SERIAL,
  SPECIFICATION,
  saveVersion,
} from './lab.ts';

let lab: Lab;
beforeAll(async () => {
  lab = await openLab();
});
afterAll(() => lab?.service.stop());

const design = (fields: string) => `query ($id: ID!) { design(id: $id) { ${fields} } }`;
const ofDesign = async (fields: string) =>
  (await read(lab.service, design(fields), { variables: { id: lab.designId } })).design;

describe('a design', () => {
  it('answers the same compiled and not compiled [cross-check]', async () => {
    const query = design(`
      id hash order family architecture reason createdAt alternatives { family order fits reason }
      chip { serial } chipRevision { number hash }
      specification { __typename ... on FamilySpecification { order centre { frequencyThz } band { low { wavelengthNm } } } }
      circuit { cells { __typename ... on InterferometerCircuit { cell rings { element arm parked } } } netlist }
      setting { totalPowerMw channels { channel drives state currentMa limitMa } parked { element how } }
      transferFunction(output: OUT2) { gain { re im } zeros { re im } poles { re im } sections { peakDb } }
      figures { rippleDb rejectionDb notDefined { figure reason } }
      response(reduceTo: 8) { offsetGhz transmissionDb groupDelayPs gaps { from to reason } reduced }
      compliance { met worstMarginDb bands { margin band { index interval { low { offsetGhz } } } } }`);
    const [plain, compiled] = await askTwice(lab.service, query, { variables: { id: lab.designId } });
    expect(plain.errors).toEqual([]);
    expect(compiled).toEqual({ ...plain, headers: compiled.headers });
    expect(plain.data.design).toMatchObject({
      id: lab.designId,
      order: 3,
      chip: { serial: SERIAL },
      specification: { __typename: 'FamilySpecification', order: 3, centre: { frequencyThz: 193.1 } },
    });
  });

  it('tells the same curve as REST [cross-check]', async () => {
    const { response } = await ofDesign(
      'response(stage: CHIP, output: OUT2, grid: {offsetGhz: {start: -20, stop: 20, points: 101}}) { stage output offsetGhz transmissionDb phaseRad field { re im } groupDelayPs }',
    );
    const path = `/v1/designs/${lab.designId}/response.json?stage=CHIP&output=OUT2&unit=offsetGhz&start=-20&stop=20&points=101`;
    const { json } = await lab.service.call(path);
    expect(json).toMatchObject(response);
    expect(response.offsetGhz).toHaveLength(101);
  });

  it('has null where the group delay has no value, and says where [property]', async () => {
    // More than 60 dB below the peak the delay is not defined: a fine grid across the nulls of this filter meets it.
    const { response } = await ofDesign(
      'response(stage: TARGET, output: OUT2, grid: {offsetGhz: {start: -0.001, stop: 0.001, points: 21}}) { groupDelayPs gaps { from to reason } }',
    );
    const gaps: { from: number; to: number }[] = response.gaps;
    const inGap = (i: number) => gaps.some(({ from, to }) => i >= from && i <= to);
    for (const [i, delay] of response.groupDelayPs.entries())
      expect([i, delay === null]).toEqual([i, inGap(i)]);
  });

  it('refuses an input port as an output, a grid that is too fine, a unit that is another', async () => {
    const refused = async (fields: string) => {
      const { status, data, errors } = await ask(lab.service, design(fields), {
        variables: { id: lab.designId },
      });
      return { status, data, code: errors[0]?.extensions.code, pointer: errors[0]?.extensions.pointer };
    };
    expect(await refused('id transferFunction(output: IN1) { gain { re } }')).toMatchObject({
      data: { design: null },
      code: 'BAD_INPUT',
      pointer: '/output',
    });
    expect(await refused('id figures(output: IN2) { rippleDb }')).toMatchObject({
      status: 200,
      data: { design: { id: lab.designId, figures: null } },
      code: 'BAD_INPUT',
    });
    expect(
      await refused('id response(grid: {offsetGhz: {start: 0, stop: 1, points: 20002}}) { floorDb }'),
    ).toMatchObject({ status: 200, data: { design: { response: null } }, pointer: '/grid/offsetGhz/points' });
    expect(
      await refused('id response(grid: {frequencyThz: {start: 1550, stop: 1551, points: 11}}) { floorDb }'),
    ).toMatchObject({ data: { design: { response: null } }, code: 'WRONG_UNIT' });
  });
});

describe('asking', () => {
  it('answers a repeat from the store, writing nothing', async () => {
    const count = async () =>
      (await lab.service.store.pool.query('select count(*) from request')).rows[0].count;
    const before = await count();
    const { requestDesign: asked } = await read(lab.service, REQUEST, {
      variables: { input: { chip: SERIAL, specification: SPECIFICATION } },
    });
    expect(asked.request).toMatchObject({
      state: 'DONE',
      progress: 1,
      cached: true,
      design: { id: lab.designId },
    });
    expect(await count()).toBe(before);
    const query =
      'query ($id: ID!) { node(id: $id) { id ... on DesignRequest { createdBy { name } asked chip { serial } } } }';
    const { node } = await read(lab.service, query, { variables: { id: asked.request.id } });
    expect(node).toMatchObject({ id: asked.request.id, createdBy: null, chip: { serial: SERIAL } });
  });

  it('answers the same request to the same idempotency key, and refuses it for another body', async () => {
    const input = {
      chip: SERIAL,
      specification: { family: { ...SPECIFICATION.family, order: 2 } },
      idempotencyKey: 'k-1',
    };
    const first = await read(lab.service, REQUEST, { variables: { input } });
    const again = await read(lab.service, REQUEST, { variables: { input } });
    expect(again.requestDesign.request.id).toBe(first.requestDesign.request.id);
    await (await startNext(lab.service.store)).finish();
    const other = { ...input, specification: SPECIFICATION };
    const { errors, data, status } = await ask(lab.service, REQUEST, { variables: { input: other } });
    expect([status, data, errors[0]?.extensions.code]).toEqual([
      200,
      { requestDesign: null },
      'IDEMPOTENCY_KEY_REUSED',
    ]);
  });

  it('cancels, and says so a second time', async () => {
    const id = await requestDesign(lab.service, { family: { ...SPECIFICATION.family, rippleDb: 0.25 } });
    const cancel =
      'mutation ($input: CancelDesignRequestInput!) { cancelDesignRequest(input: $input) { request { state design { id } } } }';
    for (let time = 0; time < 2; time++) {
      const { cancelDesignRequest } = await read(lab.service, cancel, { variables: { input: { id } } });
      expect(cancelDesignRequest.request).toEqual({ state: 'CANCELLED', design: null });
    }
  });

  it('says what would be refused without asking, with requests that would be taken', async () => {
    const check = `query ($input: RequestDesignInput!) { checkSpecification(input: $input) {
      ok order rings designHash cached specification { __typename } problem { code title detail pointer limit errors { code } nearest { reason input changes { pointer given works } } } } }`;
    const good = await read(lab.service, check, {
      variables: { input: { chip: SERIAL, specification: SPECIFICATION } },
    });
    expect(good.checkSpecification).toMatchObject({
      ok: true,
      problem: null,
      order: 3,
      rings: 3,
      cached: true,
      designHash: lab.designId.slice(4),
    });
    const tooMuch = { family: { ...SPECIFICATION.family, order: 9 } };
    const { checkSpecification: bad } = await read(lab.service, check, {
      variables: { input: { chip: SERIAL, specification: tooMuch } },
    });
    expect(bad).toMatchObject({
      ok: false,
      order: null,
      problem: { code: 'SPECIFICATION_UNREACHABLE', limit: 'RINGS' },
    });
    for (const { input } of bad.problem.nearest) {
      const { checkSpecification: way } = await read(lab.service, check, { variables: { input } });
      expect(way.ok).toBe(true);
    }
  });

  it('leaves the data of a sibling mutation intact when one is refused', async () => {
    const query = `mutation ($a: RegisterChipInput!, $b: RegisterChipInput!) {
      first: registerChip(input: $a) { chip { serial } } second: registerChip(input: $b) { chip { serial } } }`;
    const { chip } = await read(
      lab.service,
      'query ($s: String!) { chip(serial: $s) { head { model { input } } } }',
      { variables: { s: SERIAL } },
    );
    const model = chip.head.model.input;
    const variables = { a: { serial: 'SIBLING-1', model }, b: { serial: SERIAL, model } };
    const { status, data, errors } = await ask(lab.service, query, { variables });
    expect(status).toBe(200);
    expect(data).toEqual({ first: { chip: { serial: 'SIBLING-1' } }, second: null });
    expect(errors).toMatchObject([
      { path: ['second'], extensions: { code: 'NAME_TAKEN', pointer: '/serial' } },
    ]);
  });
});

describe('the library', () => {
  it('hangs together: version, release, design, chip, and back', async () => {
    const query = `query ($v: ID!) { node(id: $v) { __typename ... on ConfigurationVersion {
      number stale note contentHash createdBy { name kind } chipRevision { number chip { serial } }
      configuration { name latest { number } version(number: 1) { id } versions { edges { node { id } } } }
      source { ... on Design { id versions { edges { node { id } } } } }
      releases { id name sequence current chip { serial release { id } releases { name } } version { id } } } } }`;
    const { node } = await read(lab.service, query, { variables: { v: lab.versionId } });
    const { versionId: id, releaseId, designId } = lab;
    expect(node).toMatchObject({
      __typename: 'ConfigurationVersion',
      number: 1,
      stale: false,
      createdBy: { kind: 'PERSON' },
      chipRevision: { number: 1, chip: { serial: SERIAL } },
      configuration: {
        name: 'flat-top',
        latest: { number: 1 },
        version: { id },
        versions: { edges: [{ node: { id } }] },
      },
      source: { id: designId, versions: { edges: [{ node: { id } }] } },
      releases: [
        {
          id: releaseId,
          name: 'current',
          sequence: 1,
          current: true,
          chip: { release: { id: releaseId } },
          version: { id },
        },
      ],
    });
  });

  it('finds nothing under ids that are none, and under names that are not there', async () => {
    const query = `query ($s: String!) { a: node(id: "nonsense") { id } b: node(id: "chp_0") { id } c: design(id: "dsn_1") { id }
      chip(serial: "NONE") { id } here: chip(serial: $s) { revision(number: 7) { id } zero: revision(number: 0) { id }
      configuration(name: "none") { id } release(name: "none") { id } } }`;
    expect(await read(lab.service, query, { variables: { s: SERIAL } })).toEqual({
      a: null,
      b: null,
      c: null,
      chip: null,
      here: { revision: null, zero: null, configuration: null, release: null },
    });
  });

  it('revises a chip, and refuses a revision of what is the head no more', async () => {
    await registerChip(lab.service, 'REVISED-1');
    const { chip } = await read(
      lab.service,
      '{ chip(serial: "REVISED-1") { head { number model { input } } } }',
    );
    const revise =
      'mutation ($input: ReviseChipInput!) { reviseChip(input: $input) { chipRevision { number note chip { head { number } } } } }';
    const model = { ...chip.head.model.input, totalPowerLimitMw: 900 };
    const input = { chip: 'REVISED-1', expectedRevision: 1, model, note: 'a limit on record' };
    const { reviseChip } = await read(lab.service, revise, { variables: { input } });
    expect(reviseChip.chipRevision).toEqual({
      number: 2,
      note: 'a limit on record',
      chip: { head: { number: 2 } },
    });
    const late = await ask(lab.service, revise, {
      variables: { input: { ...input, model: chip.head.model.input } },
    });
    expect(late.errors[0]?.extensions).toMatchObject({
      code: 'PRECONDITION_FAILED',
      pointer: '/expectedRevision',
      allowed: 2,
    });
  });

  it('tells the history, newest first, with what it was done to', async () => {
    const query = `query ($filter: HistoryFilter) { history(filter: $filter) { edges { node { action subjectLabel at actor { name } chip { serial } detail
      subject { __typename id ... on Chip { serial } } } } } }`;
    const { history } = await read(lab.service, query, { variables: { filter: { chip: SERIAL } } });
    const entries: {
      action: string;
      at: string;
      chip: { serial: string };
      subject: { __typename: string } | null;
    }[] = history.edges.map(({ node }: { node: object }) => node);
    expect(entries.every(({ chip }) => chip.serial === SERIAL)).toBe(true);
    const at = entries.map((entry) => entry.at);
    expect(at).toEqual(at.toSorted().toReversed());
    const kinds = Object.fromEntries(entries.map(({ action, subject }) => [action, subject?.__typename]));
    expect(kinds).toMatchObject({
      'chip.registered': 'Chip',
      'design.requested': 'DesignRequest',
      'design.computed': 'Design',
      'version.saved': 'ConfigurationVersion',
      'release.published': 'Release',
    });
  });

  it('lists tokens without their secrets, and shows a secret once', async () => {
    const token = lab.service.tokens.ADMIN;
    const make =
      'mutation ($input: CreateTokenInput!) { createToken(input: $input) { secret token { id role label actor { name kind } createdBy { name } expiresAt } } }';
    const input = {
      actor: 'invented bench PC',
      role: 'INSTRUMENT',
      label: 'bench',
      expiresAt: '2099-01-01T00:00:00+02:00',
    };
    const { createToken } = await read(lab.service, make, { variables: { input }, token });
    expect(createToken.token).toMatchObject({
      role: 'INSTRUMENT',
      actor: { kind: 'INSTRUMENT' },
      expiresAt: '2098-12-31T22:00:00.000Z',
    });
    const asNew = await read(lab.service, '{ me { role actor { name } tokenExpiresAt } }', {
      token: createToken.secret,
    });
    expect(asNew.me).toMatchObject({ role: 'INSTRUMENT', actor: { name: 'invented bench PC' } });
    const { status, data } = await ask(lab.service, '{ tokens { id label revokedAt } }', { token });
    expect(status).toBe(200);
    expect(JSON.stringify(data)).not.toContain(createToken.secret.slice(17));
    const revoke = 'mutation ($id: ID!) { revokeToken(input: {id: $id}) { token { revokedAt } } }';
    const { revokeToken } = await read(lab.service, revoke, {
      variables: { id: createToken.token.id },
      token: createToken.secret,
    });
    expect(revokeToken.token.revokedAt).toMatch(/Z$/);
    expect((await ask(lab.service, '{ me { role } }', { token: createToken.secret })).status).toBe(401);
  });
});

it('publishes again, going back is another publication', async () => {
  const version = await saveVersion(lab.service, lab.designId);
  const accept = [
    'MASK_NOT_MET',
    ...version.setting.cautions.map((caution: { code: string }) => caution.code),
  ];
  expect((await publishRelease(lab.service, version.number, accept)).sequence).toBe(2);
  expect((await publishRelease(lab.service, 1, accept)).sequence).toBe(3);
  const input = { chip: SERIAL, configuration: 'flat-top', version: 1, accept: [] };
  const { errors } = await ask(
    lab.service,
    'mutation ($input: PublishReleaseInput!) { publishRelease(input: $input) { release { id } } }',
    { variables: { input } },
  );
  expect(errors[0]?.extensions).toMatchObject({ code: 'CAUTION_NOT_ACCEPTED', pointer: '/accept' });
});

it('keeps the reason of a computation that failed', async () => {
  const id = await requestDesign(lab.service, { family: { ...SPECIFICATION.family, rippleDb: 0.75 } });
  await (await startNext(lab.service.store)).fail();
  const { designRequest } = await read(
    lab.service,
    'query ($id: ID!) { designRequest(id: $id) { state design { id } problem { code title detail errors { code } nearest { reason } } } }',
    { variables: { id } },
  );
  expect(designRequest).toMatchObject({
    state: 'FAILED',
    design: null,
    problem: { code: 'COMPUTATION_TIMED_OUT', errors: [], nearest: [] },
  });
});

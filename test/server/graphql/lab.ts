/** A small library for these tests, made through GraphQL itself; the design is the core's own. All of it is invented. */

import { startNext } from '../rest/computing.ts';
import { inventedChip } from '../rest/invented-chips.ts';
import { type Service, type ServiceOptions, startService } from '../rest/service.ts';
import { read } from './ask.ts';

export const SERIAL = 'INVENTED-1';

/** An order that the chip's four rings can take. */
export const SPECIFICATION = {
  family: {
    family: 'CHEBYSHEV_I',
    shape: 'LOW_PASS',
    order: 3,
    rippleDb: 0.5,
    band: { offsetGhz: { low: -5, high: 5 } },
  },
};

export const REQUEST = /* GraphQL */ `
  mutation ($input: RequestDesignInput!) {
    requestDesign(input: $input) { request { id state progress cached design { id } } }
  }
`;

export interface Lab {
  readonly service: Service;
  readonly designId: string;
  readonly requestId: string;
  readonly versionId: string;
  readonly releaseId: string;
}

export async function registerChip(service: Service, serial: string): Promise<void> {
  await read(
    service,
    'mutation ($input: RegisterChipInput!) { registerChip(input: $input) { chip { id } } }',
    {
      variables: { input: { serial, description: 'invented', model: inventedChip() } },
    },
  );
}

/** Id of a request that is queued. */
export async function requestDesign(
  service: Service,
  specification: object = SPECIFICATION,
): Promise<string> {
  const { requestDesign: asked } = await read(service, REQUEST, {
    variables: { input: { chip: SERIAL, specification } },
  });
  return asked.request.id;
}

export async function saveVersion(service: Service, design: string, configuration = 'flat-top') {
  const { saveVersion: saved } = await read(
    service,
    `mutation ($input: SaveVersionInput!) { saveVersion(input: $input) { version { id number setting { cautions { code } } } } }`,
    { variables: { input: { chip: SERIAL, configuration, design, note: 'invented' } } },
  );
  return saved.version;
}

const PUBLISH = `mutation ($input: PublishReleaseInput!) { publishRelease(input: $input) { release { id sequence } } }`;

/** Every caution taken: these tests are about the door. */
export async function publishRelease(service: Service, version: number, accept: readonly string[] = []) {
  const input = { chip: SERIAL, configuration: 'flat-top', version, accept };
  const { publishRelease: published } = await read(service, PUBLISH, { variables: { input } });
  return published.release;
}

export async function openLab(options: ServiceOptions = {}): Promise<Lab> {
  const service = await startService(options);
  await registerChip(service, SERIAL);
  const requestId = await requestDesign(service);
  await (await startNext(service.store)).finish();
  const { designRequest } = await read(
    service,
    'query ($id: ID!) { designRequest(id: $id) { state problem { detail } design { id compliance { met } } } }',
    {
      variables: { id: requestId },
    },
  );
  if (designRequest.state !== 'DONE') throw new Error(JSON.stringify(designRequest));
  const designId: string = designRequest.design.id;
  const version = await saveVersion(service, designId);
  const accept = [
    'MASK_NOT_MET',
    ...version.setting.cautions.map((caution: { code: string }) => caution.code),
  ];
  const release = await publishRelease(service, 1, accept);
  return { service, designId, requestId, versionId: version.id, releaseId: release.id };
}

/** Writing. Inputs go to the operations as they came: what they may be is decided there, by the same rules as for REST. */
import type { GraphqlContext } from '../context.ts';
import { chipNode, releaseNode, requestNode, revisionNode, tokenNode, versionNode } from './nodes.ts';
import type { TypeResolvers } from './resolve.ts';

interface Input {
  readonly input: unknown;
}

export const Mutation: TypeResolvers = {
  async registerChip(_: unknown, { input }: Input, { operations, viewer }: GraphqlContext) {
    return { chip: chipNode((await operations.registerChip(viewer, input)).record) };
  },
  async reviseChip(_: unknown, { input }: Input, { operations, viewer }: GraphqlContext) {
    return { chipRevision: revisionNode((await operations.reviseChip(viewer, input)).record) };
  },
  async requestDesign(_: unknown, { input }: Input, { operations, viewer }: GraphqlContext) {
    return { request: requestNode(await operations.requestDesign(viewer, input)) };
  },
  async cancelDesignRequest(_: unknown, { input }: Input, { operations, viewer }: GraphqlContext) {
    return { request: requestNode(await operations.cancelDesignRequest(viewer, input)) };
  },
  async saveVersion(_: unknown, { input }: Input, { operations, viewer }: GraphqlContext) {
    return { version: versionNode((await operations.saveVersion(viewer, input)).record) };
  },
  async publishRelease(_: unknown, { input }: Input, { operations, viewer }: GraphqlContext) {
    return { release: releaseNode((await operations.publishRelease(viewer, input)).record) };
  },
  async createToken(_: unknown, { input }: Input, { operations, viewer }: GraphqlContext) {
    const { record, secret } = await operations.createToken(viewer, input);
    return { token: tokenNode(record), secret };
  },
  async revokeToken(_: unknown, { input }: Input, { operations, viewer }: GraphqlContext) {
    return { token: tokenNode(await operations.revokeToken(viewer, input)) };
  },
};

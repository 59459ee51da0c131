/**
 * GraphQL subscriptions over WebSocket, as a program of the lab would hold them open:
 *
 *     node examples/watch.mjs request req_...     a design request, until it has ended
 *     node examples/watch.mjs release HL-PR6-02   every publication for a chip, until Ctrl-C
 *
 * RINGBINDER_URL and RINGBINDER_TOKEN are read from the environment. Uses graphql-ws and ws, which `npm ci` installs;
 * any client of the protocol graphql-transport-ws does.
 */
import { createClient } from 'graphql-ws';
import WebSocket from 'ws';

const WATCHED = {
  request: `subscription ($it: ID!) {
    designRequestChanged(id: $it) { state progress design { id reason } problem { detail } }
  }`,
  release: `subscription ($it: String!) {
    releasePublished(chip: $it) { name sequence note version { number configuration { name } } }
  }`,
};

const [what, it] = process.argv.slice(2);
const { RINGBINDER_URL: url, RINGBINDER_TOKEN: token } = process.env;
if (!Object.hasOwn(WATCHED, what ?? '') || !it || !url || !token) {
  console.error(
    'usage: RINGBINDER_URL=... RINGBINDER_TOKEN=... node examples/watch.mjs request ID | release SERIAL',
  );
  process.exit(2);
}

/** The token is not valid, or not any more: coming back with it would not help. */
const FORBIDDEN = 4403;

const client = createClient({
  url: `${url.replace(/^http/, 'ws')}/graphql`,
  webSocketImpl: WebSocket,
  connectionParams: { authorization: `Bearer ${token}` },
  // A lost connection is taken up again (five tries, half a minute), and the state at that time is sent first: nothing
  // final is missed.
  retryAttempts: 5,
  shouldRetry: (end) => end.code !== FORBIDDEN,
});

try {
  for await (const { data, errors } of client.iterate({ query: WATCHED[what], variables: { it } })) {
    if (errors) throw new Error(errors.map(({ message }) => message).join('\n'));
    console.log(JSON.stringify(Object.values(data)[0]));
  }
} catch (end) {
  console.error(end.reason || end.message || String(end));
  process.exitCode = 1;
} finally {
  await client.dispose();
}

/** The first administrator: whoever starts the service for the first time must be able to get in. */
import type { Store } from '../store/store.ts';
import { generateToken, tokenPartsOf } from './token.ts';

/**
 * Makes the first admin token if there has never been one; of several processes that start at once one wins.
 * @param given the token from the environment; absent: one is generated
 * @returns the token to print once to the terminal, never through a logger; null when there is nothing to print
 * @throws when `given` is not in the form of a token
 */
export async function ensureFirstAdmin(
  store: Pick<Store, 'bootstrapAdmin'>,
  given?: string,
): Promise<string | null> {
  if (given !== undefined) {
    const parts = tokenPartsOf(given);
    if (parts === null)
      throw new Error('The first admin token must read rbt_<12 of a-z, 0-9>_<43 of base64url>.');
    await store.bootstrapAdmin(parts);
    return null;
  }
  const { token, lookup, secretHash } = generateToken();
  return (await store.bootstrapAdmin({ lookup, secretHash })) ? token : null;
}

/** Content addresses. */
import { createHash } from 'node:crypto';

/** SHA-256 of the UTF-8 bytes of a text, hex. */
export function sha256Hex(text: string): string {
  return createHash('sha256').update(text, 'utf8').digest('hex');
}

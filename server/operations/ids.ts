/**
 * Opaque ids of the wire: a prefix for the kind and the bare key in base32 (RFC 4648 alphabet order does not matter
 * here; the digits and letters that are hard to confuse are used). Designs carry their hash itself.
 */

/** 32 signs without i, l, o, u. */
const SIGNS = '0123456789abcdefghjkmnpqrstvwxyz';

export type UuidPrefix = 'chp' | 'rev' | 'req' | 'cfg' | 'ver' | 'act' | 'tok';

function toBase32(bytes: Uint8Array): string {
  let text = '';
  let held = 0;
  let bits = 0;
  for (const byte of bytes) {
    held = ((held << 8) | byte) & 0xfff;
    bits += 8;
    while (bits >= 5) {
      bits -= 5;
      text += SIGNS[(held >> bits) & 31];
    }
  }
  return bits > 0 ? text + SIGNS[(held << (5 - bits)) & 31] : text;
}

/** Null for signs that are none, and for texts that no bytes encode to: one id has one spelling. */
function fromBase32(text: string): Buffer | null {
  const bytes: number[] = [];
  let held = 0;
  let bits = 0;
  for (const sign of text) {
    const value = SIGNS.indexOf(sign);
    if (value < 0) return null;
    held = ((held << 5) | value) & 0xfff;
    bits += 5;
    if (bits < 8) continue;
    bits -= 8;
    bytes.push((held >> bits) & 255);
  }
  const read = Buffer.from(bytes);
  return toBase32(read) === text ? read : null;
}

const UUID_BYTES = 16;

function uuidBytes(uuid: string): Buffer {
  return Buffer.from(uuid.replaceAll('-', ''), 'hex');
}

function uuidOf(bytes: Buffer): string {
  return bytes.toString('hex').replace(/^(.{8})(.{4})(.{4})(.{4})(.{12})$/, '$1-$2-$3-$4-$5');
}

export function wireId(prefix: UuidPrefix, uuid: string): string {
  return `${prefix}_${toBase32(uuidBytes(uuid))}`;
}

/** The bare uuid, or null when the id is not of this kind. */
export function uuidOfId(prefix: UuidPrefix, id: string): string | null {
  if (!id.startsWith(`${prefix}_`)) return null;
  const bytes = fromBase32(id.slice(prefix.length + 1));
  return bytes?.length === UUID_BYTES ? uuidOf(bytes) : null;
}

const HASH = /^[0-9a-f]{64}$/;

function hashOfId(prefix: 'dsn' | 'req', id: string): string | null {
  const hash = id.startsWith(`${prefix}_`) ? id.slice(prefix.length + 1) : '';
  return HASH.test(hash) ? hash : null;
}

export const designId = (hash: string): string => `dsn_${hash}`;
export const hashOfDesignId = (id: string): string | null => hashOfId('dsn', id);

/** A request that was answered from the store and wrote nothing has its id from the design. */
export const cachedRequestId = (hash: string): string => `req_${hash}`;
export const hashOfCachedRequestId = (id: string): string | null => hashOfId('req', id);

export interface ReleaseKey {
  readonly chipId: string;
  readonly name: string;
  readonly sequence: number;
}

export function releaseId({ chipId, name, sequence }: ReleaseKey): string {
  const counted = Buffer.alloc(4);
  counted.writeUInt32BE(sequence);
  return `rel_${toBase32(Buffer.concat([uuidBytes(chipId), counted, Buffer.from(name, 'ascii')]))}`;
}

export function releaseKeyOfId(id: string): ReleaseKey | null {
  const bytes = id.startsWith('rel_') ? fromBase32(id.slice(4)) : null;
  if (bytes === null || bytes.length <= UUID_BYTES + 4) return null;
  return {
    chipId: uuidOf(bytes.subarray(0, UUID_BYTES)),
    sequence: bytes.readUInt32BE(UUID_BYTES),
    name: bytes.subarray(UUID_BYTES + 4).toString('ascii'),
  };
}

/** History entries are numbered. */
export function historyId(number: string): string {
  const bytes = Buffer.alloc(8);
  bytes.writeBigUInt64BE(BigInt(number));
  return `hst_${toBase32(bytes)}`;
}

export function historyNumberOfId(id: string): string | null {
  const bytes = id.startsWith('hst_') ? fromBase32(id.slice(4)) : null;
  return bytes?.length === 8 ? String(bytes.readBigUInt64BE()) : null;
}

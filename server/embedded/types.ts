/** Structured logging as the rest of the server does it: fields first, then the sentence. */
export interface EmbeddedLogger {
  info(fields: object, text: string): void;
  warn(fields: object, text: string): void;
}

export interface EmbeddedOptions {
  /** Where the data lives; made when missing. */
  readonly folder: string;
  /** TCP port on 127.0.0.1. Absent: a free one. Ignored when a running server is adopted. */
  readonly port?: number;
  readonly logger: EmbeddedLogger;
  /** False only for data that may be lost: a crash of the machine then loses it. Default true. */
  readonly durable?: boolean;
  /**
   * WRAPPER ties the server to this process through a shell and a pipe; CONTROL starts it by pg_ctl, detached, and a
   * killed owner leaves it running for the next one to adopt. Default: WRAPPER, on Windows CONTROL.
   */
  readonly launcher?: 'WRAPPER' | 'CONTROL';
}

export interface Embedded {
  /** With the password of the database's superuser in it: never log it. */
  readonly url: string;
  readonly port: number;
  /** The folder that really holds the data. */
  readonly folder: string;
  /** True: the server was running already and somebody else ends it. */
  readonly adopted: boolean;
  /** Fast, clean shutdown of a server that this call started; nothing for an adopted one. */
  stop(): Promise<void>;
}

/** Everything a launcher needs. */
export interface Launch {
  readonly binaries: Binaries;
  readonly folder: string;
  readonly port: number;
  readonly settings: readonly string[];
  readonly owner: Owner;
}

export interface Binaries {
  readonly postgres: string;
  readonly initdb: string;
  readonly pgCtl: string;
}

/** The operating-system user that runs the server; empty: the one that runs us. */
export interface Owner {
  readonly uid?: number;
  readonly gid?: number;
}

export type Launched =
  | { readonly started: true; stop(): Promise<void> }
  | { readonly started: false; readonly log: string };

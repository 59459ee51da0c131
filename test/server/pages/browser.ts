/** A real browser with an eye on what a page does behind the reader's back: requests, errors, broken policies. */
import { existsSync } from 'node:fs';
import { mkdir } from 'node:fs/promises';
import { join } from 'node:path';
import { type Browser, chromium, type Page } from 'playwright-core';

/** Where Debian and its relatives put it. */
const EXECUTABLE = process.env.CHROMIUM ?? '/usr/bin/chromium';

/** No sandbox: tests often run as root in a container. The rest keeps the browser itself from calling anybody. */
const FLAGS = [
  '--no-sandbox',
  '--disable-gpu',
  '--disable-quic',
  '--no-first-run',
  '--disable-background-networking',
  '--disable-component-update',
  '--disable-sync',
  '--host-resolver-rules=MAP lab.test 127.0.0.1',
];

/**
 * How instrument PCs reach a service: by a name, without TLS. Browsers trust 127.0.0.1 like HTTPS and let pages do more
 * there, so a page that works on the machine of its author may be empty in the lab.
 */
export const labUrl = (serviceUrl: string): string => serviceUrl.replace('127.0.0.1', 'lab.test');

const VIEWPORT = { width: 1280, height: 800 };

/** Set by hand to look at the pages: every one that is opened leaves a picture there. */
const PICTURES = process.env.PAGE_PICTURES;

/** Node is all that the project asks for: without the program these tests are skipped; one that does not start fails them. */
export const hasBrowser = existsSync(EXECUTABLE);

/** The reason of a skip, for the title of what is skipped. */
export const notShown = hasBrowser ? '' : ` (not run: ${EXECUTABLE} is not there)`;

export async function launchBrowser(): Promise<Browser> {
  try {
    return await chromium.launch({ executablePath: EXECUTABLE, args: FLAGS });
  } catch (cause) {
    throw new Error(
      `These tests look at the pages in a real browser, and ${EXECUTABLE} does not start: repair it, or name another in CHROMIUM.`,
      { cause },
    );
  }
}

export interface Seen {
  /** URLs of every request and socket, in order. */
  readonly requests: string[];
  /** Errors and warnings of the console, thrown errors, requests that failed. */
  readonly complaints: string[];
  /** Directive and what it kept out. */
  readonly violations: string[];
}

export interface OpenPage {
  readonly page: Page;
  readonly seen: Seen;
  /** A picture for people, when they asked for pictures. */
  picture(name: string): Promise<void>;
  close(): Promise<void>;
}

/** Tells of each violation while the page lives; the console's wording is the browser's own. */
const REPORT_VIOLATIONS = `document.addEventListener('securitypolicyviolation', (event) =>
  window.reportViolation(event.violatedDirective + ' ' + event.blockedURI))`;

/** A page of its own profile: no cookie, no storage, no cache of another test. */
export async function openPage(
  browser: Browser,
  options: { readonly token?: string; readonly width?: number; readonly height?: number } = {},
): Promise<OpenPage> {
  const { token, width = VIEWPORT.width, height = VIEWPORT.height } = options;
  const context = await browser.newContext({
    viewport: { width, height },
    ...(token === undefined ? {} : { extraHTTPHeaders: { authorization: `Bearer ${token}` } }),
  });
  const page = await context.newPage();
  const seen: Seen = { requests: [], complaints: [], violations: [] };
  await context.exposeFunction('reportViolation', (text: string) => seen.violations.push(text));
  await context.addInitScript(REPORT_VIOLATIONS);
  context.on('request', (request) => seen.requests.push(request.url()));
  page.on('websocket', (socket) => seen.requests.push(socket.url()));
  page.on('console', (message) => {
    if (message.type() === 'error' || message.type() === 'warning') seen.complaints.push(message.text());
  });
  page.on('pageerror', (error) => seen.complaints.push(String(error)));
  context.on('requestfailed', (request) =>
    seen.complaints.push(`${request.url()}: ${request.failure()?.errorText}`),
  );
  return {
    page,
    seen,
    async picture(name) {
      if (PICTURES === undefined) return;
      await mkdir(PICTURES, { recursive: true });
      await page.screenshot({ path: join(PICTURES, `${name}.png`) });
    },
    close: () => context.close(),
  };
}

/** The places a page asked that are not the service itself, over HTTP or as a socket. */
export function elsewhere({ requests }: Seen, url: string): string[] {
  const { origin } = new URL(url);
  const own = [origin, origin.replace(/^http/, 'ws')];
  return requests.filter(
    (asked) => !/^(data|blob|about):/.test(asked) && !own.includes(new URL(asked).origin),
  );
}

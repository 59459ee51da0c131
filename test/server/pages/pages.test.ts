/** Every page for people, as a real browser shows it: it works, can be read, and asks nobody but the service. */
import type { Browser, Locator, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import { problemPage, problemSlugs } from '../../../server/errors.ts';
import { type Lab, openLab, SERIAL } from '../graphql/lab.ts';
import { startNext } from '../rest/computing.ts';
import {
  elsewhere,
  hasBrowser,
  labUrl,
  launchBrowser,
  notShown,
  type OpenPage,
  openPage,
} from './browser.ts';

let browser: Browser;
let lab: Lab;
let base: string;

beforeAll(async () => {
  browser = await launchBrowser();
  lab = await openLab();
  base = labUrl(lab.service.url);
});
afterAll(async () => {
  await browser?.close();
  await lab?.service.stop();
});

/** Nothing behind the reader's back. */
function expectQuiet({ seen }: OpenPage): void {
  expect(seen.requests.length).toBeGreaterThan(0);
  expect(elsewhere(seen, base)).toEqual([]);
  expect(seen.violations).toEqual([]);
  expect(seen.complaints).toEqual([]);
}

/** Wider than its frame by more than rounding, px. */
const OVERFLOW_PX = 1;

/** Mean of red, green and blue, of 255: apart by more than 4.5:1 in contrast (WCAG 2.2 success criterion 1.4.3, from memory). */
const DARK = 64;
const BRIGHT = 178;

async function expectNoSidewaysScroll(page: Page): Promise<void> {
  const root = 'document.documentElement';
  const wider = await page.evaluate<number>(`${root}.scrollWidth - ${root}.clientWidth`);
  expect(wider).toBeLessThanOrEqual(OVERFLOW_PX);
}

describe.skipIf(!hasBrowser)(`/graphiql${notShown}`, () => {
  let open: OpenPage;
  let page: Page;
  beforeEach(async () => {
    open = await openPage(browser);
    page = open.page;
    await page.goto(`${base}/graphiql`);
    await runButton().waitFor();
  });
  afterEach(() => open?.close());

  const runButton = (): Locator => page.locator('.graphiql-execute-button');
  const result = (text: string): Locator => page.locator('.result-window', { hasText: text });

  async function giveToken(token: string): Promise<void> {
    await page.fill('#token', token);
    await page.click('#access button[type=submit]');
  }

  async function runTab(name: string, variables?: object): Promise<void> {
    await page.getByRole('tab', { name }).click();
    if (variables) {
      await page.locator('.graphiql-editor-tool .CodeMirror').first().click();
      await page.keyboard.press('ControlOrMeta+A');
      await page.keyboard.insertText(JSON.stringify(variables));
    }
    await runButton().click();
  }

  it('takes a token, runs the first query and shows its result', async () => {
    await open.picture('graphiql-without-token');
    await giveToken(lab.service.tokens.DESIGNER);
    await page.locator('#viewer', { hasText: 'invented designer, DESIGNER' }).waitFor();
    await runButton().click();
    await result(SERIAL).waitFor();
    await open.picture('graphiql-query');
    await expectNoSidewaysScroll(page);
    expect(page.url()).toBe(`${base}/graphiql`);
    expectQuiet(open);
  });

  it('follows a request over its socket from the question to the design', async () => {
    await giveToken(lab.service.tokens.DESIGNER);
    await runTab('Ask', { chip: SERIAL });
    await result('QUEUED').waitFor();
    const id = /req_\w+/.exec((await result('QUEUED').textContent()) ?? '')?.[0];
    await runTab('Watch', { id });
    await result('"state": "QUEUED"').waitFor();
    await (await startNext(lab.service.store)).finish();
    await result('"state": "DONE"').waitFor();
    await result('currentMa').waitFor();
    await open.picture('graphiql-subscription');
    expect(open.seen.requests.filter((url) => url.startsWith('ws:')).length).toBeGreaterThan(0);
    expectQuiet(open);
  });

  it('says why a token is not taken, and forgets one when asked', async () => {
    await giveToken('rbt_of-nobody');
    await page.locator('#viewer[data-state=refused]').waitFor();
    await open.picture('graphiql-refused');
    expect(elsewhere(open.seen, base)).toEqual([]);
    expect(open.seen.violations).toEqual([]);
    // The answers to that token, and nothing else.
    expect(open.seen.complaints.length).toBeGreaterThan(0);
    for (const text of open.seen.complaints) expect(text).toMatch(/status of 401/);
    await page.click('#forget');
    await page.locator('#viewer[data-state=none]').waitFor();
    expect(await page.inputValue('#token')).toBe('');
    expect(await page.evaluate('JSON.stringify(sessionStorage)')).not.toContain('rbt_of-nobody');
  });

  it('fits a narrow window with the documentation open, and is dark as a whole where the editor is', async () => {
    await page.emulateMedia({ colorScheme: 'dark' });
    await page.setViewportSize({ width: 800, height: 700 });
    await giveToken(lab.service.tokens.READER);
    await page.locator('.graphiql-sidebar button').first().click();
    await page.locator('.graphiql-plugin', { hasText: 'subscription' }).waitFor();
    await open.picture('graphiql-narrow-dark');
    await expectNoSidewaysScroll(page);
    const brightness = (property: string, selector: string) =>
      page.evaluate<number>(
        `getComputedStyle(document.querySelector('${selector}')).${property}.match(/[\\d.]+/g).slice(0, 3).reduce((sum, c) => sum + Number(c) / 3, 0)`,
      );
    expect(await brightness('backgroundColor', 'body')).toBeLessThan(DARK);
    for (const selector of ['#access', 'footer', '#token']) {
      expect(await brightness('color', selector), selector).toBeGreaterThan(BRIGHT);
    }
  });

  it('shows the whole of its examples beside the buttons', async () => {
    const lines = '.graphiql-query-editor .CodeMirror-scroll';
    for (const name of ['Chips', 'Check', 'Ask', 'Watch', 'Designs']) {
      await page.getByRole('tab', { name }).click();
      await page.locator('.graphiql-query-editor', { hasText: name }).waitFor();
      const wider = `(({ scrollWidth, clientWidth }) => scrollWidth - clientWidth)(document.querySelector('${lines}'))`;
      expect([name, (await page.evaluate<number>(wider)) <= OVERFLOW_PX]).toEqual([name, true]);
    }
  });
});

describe.skipIf(!hasBrowser)(`/docs${notShown}`, () => {
  it('shows every operation of the document, opens one and asks it with a token', async () => {
    const open = await openPage(browser);
    const { page } = open;
    await page.goto(`${base}/docs`);
    await page.locator('.opblock').first().waitFor();
    await open.picture('docs');
    const { json } = await lab.service.call('/openapi.json', { token: null });
    const operations = Object.values<object>(json.paths).flatMap((methods) => Object.keys(methods));
    expect(operations.length).toBeGreaterThan(30);
    expect(await page.locator('.opblock').count()).toBe(operations.length);

    await page.locator('.authorize').first().click();
    await page.fill('.modal-ux input', lab.service.tokens.READER);
    await page.click('.modal-ux button[type=submit]');
    await open.picture('docs-token');
    await page.click('.modal-ux .btn-done');
    const me = page.locator('.opblock', { hasText: '/v1/me' });
    await me.locator('.opblock-summary-control').click();
    await me.locator('.try-out__btn').click();
    await me.locator('.execute').click();
    await me.locator('.live-responses-table', { hasText: 'READER' }).waitFor();
    await me.scrollIntoViewIfNeeded();
    await open.picture('docs-operation');
    await expectNoSidewaysScroll(page);
    expectQuiet(open);
    await open.close();
  });
});

describe.skipIf(!hasBrowser)(`/problems${notShown}`, () => {
  it('explains each kind of problem on a page with its title, code and what to do', async () => {
    const open = await openPage(browser, { width: 480 });
    const { page } = open;
    expect(problemSlugs().length).toBeGreaterThan(20);
    for (const slug of problemSlugs()) {
      await page.goto(`${base}/problems/${slug}`);
      const [title] = problemPage(slug)!.slice(2).split('\n');
      expect([slug, await page.title()]).toEqual([slug, title]);
      expect(await page.getByRole('heading', { level: 1 }).textContent()).toBe(title);
      const text = (await page.locator('main').textContent()) ?? '';
      expect(text).toContain(slug.toUpperCase().replaceAll('-', '_'));
      expect(text.length).toBeGreaterThan(title!.length + 60);
      // Nothing of Markdown is left over.
      expect(text).not.toMatch(/[`#]|\*\*/);
      await expectNoSidewaysScroll(page);
    }
    await open.picture('problem');
    expectQuiet(open);
    await open.close();
  });
});

describe.skipIf(!hasBrowser)(`plots${notShown}`, () => {
  /** Fewer marks than these, and it would be an empty frame; at least as many words as a scale of four ticks an axis. */
  const PLOTS = {
    transmission: { says: /dB/, lines: 3, symbols: 0, texts: 8 },
    'group-delay': { says: /ps/, lines: 2, symbols: 0, texts: 8 },
    'pole-zero': { says: /3 poles.*3 zeros/, lines: 1, symbols: 4, texts: 8 },
  };

  it('are drawn with visible marks, no word cut off, with a title and a description', async () => {
    const open = await openPage(browser, { token: lab.service.tokens.READER });
    const { page } = open;
    const boxesOf = async (selector: string) => {
      const boxes = await Promise.all((await page.locator(selector).all()).map((mark) => mark.boundingBox()));
      return boxes.filter((box) => box !== null).filter(({ width, height }) => width + height > 0);
    };
    for (const [name, { says, ...least }] of Object.entries(PLOTS)) {
      const response = await page.goto(`${base}/v1/designs/${lab.designId}/plots/${name}.svg`);
      expect([name, response?.headers()['content-type']]).toEqual([name, 'image/svg+xml']);
      await open.picture(`plot-${name}`);
      expect(await page.locator('#plot-title').textContent()).toContain(SERIAL);
      expect(await page.locator('#plot-description').textContent()).toMatch(says);
      const texts = await boxesOf('.mark-text text');
      expect((await boxesOf('.mark-line path')).length, name).toBeGreaterThanOrEqual(least.lines);
      expect((await boxesOf('.mark-symbol.role-mark path')).length, name).toBeGreaterThanOrEqual(
        least.symbols,
      );
      expect(texts.length, name).toBeGreaterThanOrEqual(least.texts);
      const [frame] = await boxesOf('svg');
      for (const { x, y, width, height } of texts) {
        expect(x, name).toBeGreaterThanOrEqual(frame!.x);
        expect(y, name).toBeGreaterThanOrEqual(frame!.y);
        expect(x + width, name).toBeLessThanOrEqual(frame!.x + frame!.width);
        expect(y + height, name).toBeLessThanOrEqual(frame!.y + frame!.height);
      }
    }
    expectQuiet(open);
    await open.close();
  });
});

describe.skipIf(!hasBrowser)(`/openapi.json${notShown}`, () => {
  it('is shown as text, not offered for download', async () => {
    const open = await openPage(browser);
    await open.page.goto(`${base}/openapi.json`);
    const text = (await open.page.locator('pre').textContent()) ?? '';
    expect(JSON.parse(text)).toMatchObject({ openapi: '3.1.0' });
    expectQuiet(open);
    await open.close();
  });
});

describe.skipIf(!hasBrowser)(`the watch over the pages${notShown}`, () => {
  it('sees a picture from elsewhere, and the policy that keeps it out', async () => {
    const open = await openPage(browser);
    await open.page.goto(`${base}/problems/not-found`);
    const address = 'http://elsewhere.test/a.png';
    await open.page.evaluate(`document.body.append(Object.assign(new Image(), { src: '${address}' }))`);
    await expect.poll(() => open.seen.violations).toEqual([`img-src ${address}`]);
    expect(open.seen.complaints.length).toBeGreaterThan(0);
    await open.page.route(address, (route) => route.abort());
    await open.page.goto('about:blank');
    await open.page.evaluate(`document.body.append(Object.assign(new Image(), { src: '${address}' }))`);
    await expect.poll(() => elsewhere(open.seen, base)).toContain(address);
    await open.close();
  });
});

import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { createServer } from 'node:http';
import type { AddressInfo } from 'node:net';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { LivePage, readPageWish } from '../../../tools/live/live-page.js';
import { syntheticBench } from '../../bridge/live/synthetic.js';

describe('--page', () => {
  test.each([
    [undefined, { address: '127.0.0.1', port: undefined }],
    [true, { address: '127.0.0.1', port: undefined }],
    ['8080', { address: '127.0.0.1', port: 8080 }],
    [':8080', { address: '127.0.0.1', port: 8080 }],
    ['192.0.2.7', { address: '192.0.2.7', port: undefined }],
    ['192.0.2.7:80', { address: '192.0.2.7', port: 80 }],
    ['bench.example:8080', { address: 'bench.example', port: 8080 }],
    ['[::1]:8080', { address: '::1', port: 8080 }],
  ])('%s', (said, wish) => {
    expect(readPageWish(said, true)).toMatchObject({ ...wish, control: true });
  });

  test('off, and nothing said, are no page', () => {
    expect(readPageWish('off', false)).toBeUndefined();
    expect(readPageWish(undefined, false)).toBeUndefined();
  });

  test.each(['8080:1', '127.0.0.1:99999', 'http://127.0.0.1/', 'a b', '70000'])('%s is refused', (said) => {
    expect(() => readPageWish(said, false)).toThrow(/--page: not understood, .*write it as/);
  });

  test('control without a page is refused', () => {
    expect(() => readPageWish('off', true)).toThrow(/--control: hands come in through the live page/);
  });
});

describe('the place of a page', () => {
  let folder: string;
  beforeAll(() => {
    folder = mkdtempSync(path.join(tmpdir(), 'oilspring-page-'));
    writeFileSync(path.join(folder, 'index.html'), '<!doctype html><title>built</title>');
  });
  afterAll(() => rmSync(folder, { recursive: true, force: true }));

  test('is the next free port when none was asked for, and an error when one was', async () => {
    const first = await LivePage.reserve(readPageWish(true, false)!, folder);
    const second = await LivePage.reserve(readPageWish(true, false)!, folder);
    expect(second.port).toBeGreaterThan(first.port);
    await expect(LivePage.reserve(readPageWish(String(first.port), false)!, folder)).rejects.toThrow(
      /cannot listen there: EADDRINUSE/,
    );
    await first.close();
    await second.close();
  });

  test('says that the bench is being built, then serves the page at the same address', async () => {
    const page = await LivePage.reserve(readPageWish(':0', false)!, folder);
    const early = await fetch(page.url);
    expect([early.status, await early.text()]).toEqual([503, expect.stringContaining('The bench is being built.')]);
    expect(await (await fetch(`${page.url}wait.js`)).text()).toContain('location.reload');
    await page.serve(syntheticBench().source);
    const late = await fetch(page.url);
    expect([late.status, await late.text()]).toEqual([200, expect.stringContaining('built')]);
    const { port } = page;
    await page.close();
    // the port is free again
    const other = createServer();
    await new Promise<void>((resolve, reject) => {
      other.once('error', reject);
      other.listen(port, '127.0.0.1', () => resolve());
    });
    expect((other.address() as AddressInfo).port).toBe(port);
    await new Promise((resolve) => other.close(resolve));
  });

  test('has a token with control, new each time, behind the # of its address', async () => {
    const page = await LivePage.reserve(readPageWish(':0', true)!, folder);
    const other = await LivePage.reserve(readPageWish(':0', true)!, folder);
    expect(page.token).toMatch(/^[\w-]{20}$/);
    expect(page.token).not.toBe(other.token);
    expect(page.invitation).toBe(`${page.url}#token=${page.token} (whoever has it may steer the bench)`);
    await page.close();
    await other.close();
    const plain = await LivePage.reserve(readPageWish(':0', false)!, folder);
    expect([plain.token, plain.invitation]).toEqual([undefined, plain.url]);
    await plain.close();
  });

  test('says when the page is not built', async () => {
    await expect(LivePage.reserve(readPageWish(true, false)!, path.join(folder, 'none'))).rejects.toThrow(
      /the live page is not built/,
    );
  });
});

import { type ChildProcess, spawn } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { afterEach, describe, expect, it } from 'vitest';
import { calledAs } from '../../packages/cli/src/called-as.js';

describe('the next command', () => {
  const npx = { npm_command: 'exec', npm_config_local_prefix: '/opt/wake' };
  it.each([
    ['linked or installed', {}, '/data', 'wakeloom'],
    ['through npx in the program folder', npx, '/opt/wake', 'npx wakeloom'],
    ['through npx below it', npx, '/opt/wake/docs', 'npx wakeloom'],
    ['through npx from elsewhere', npx, '/data', 'npx --prefix /opt/wake wakeloom'],
    ['through npx from a folder of a similar name', npx, '/opt/wake-2', 'npx --prefix /opt/wake wakeloom'],
    ['with blanks', { ...npx, npm_config_local_prefix: '/my flow' }, '/data', 'npx --prefix "/my flow" wakeloom'],
    ['by npm start', { npm_lifecycle_event: 'start' }, '/opt/wake', 'npx wakeloom'],
  ])('is called as it was: %s', (_, env, folder, words) => {
    expect(calledAs(env, folder)).toBe(words);
  });
});

describe('npm run page', () => {
  const script = fileURLToPath(new URL('../../scripts/serve-page.mjs', import.meta.url));
  let child: ChildProcess | undefined;
  afterEach(() => void child?.kill('SIGKILL'));

  const start = (port: string) =>
    new Promise<string>((resolve, reject) => {
      const server = spawn(process.execPath, [script, port], { stdio: ['ignore', 'pipe', 'pipe'] });
      child = server;
      server.stdout.setEncoding('utf8').on('data', resolve);
      server.stderr.setEncoding('utf8').on('data', (text: string) => reject(new Error(text)));
    });

  it('serves the page and its files on this computer only, and ends with Ctrl-C', async () => {
    const said = await start('0');
    const [origin] = /^http:\/\/127\.0\.0\.1:\d+\//.exec(said)!;
    const page = await fetch(origin);
    expect([page.status, page.headers.get('content-type')]).toEqual([200, 'text/html; charset=utf-8']);
    const html = await page.text();
    expect(html).toContain('<title>Wakeloom</title>');
    const script = /src="\.\/(assets\/[^"]+\.js)"/.exec(html)![1]!;
    const head = await fetch(origin + script, { method: 'HEAD' });
    expect([head.status, head.headers.get('content-type')]).toEqual([200, 'text/javascript; charset=utf-8']);
    for (const outside of [
      'nothing.js',
      '..%2f..%2f..%2fpackage.json',
      '%2e%2e/index.html/..%2f..%2fpackage.json',
      '%',
    ])
      expect((await fetch(origin + outside)).status, outside).toBe(404);
    expect((await fetch(origin, { method: 'POST' })).status).toBe(404);
    const ended = new Promise((resolve) => child!.on('close', resolve));
    child!.kill('SIGINT');
    expect(await ended).toBe(0);
  });

  it('refuses what is no port', async () => {
    await expect(start('page')).rejects.toThrow('got "page", expected a port from 0 to 65535');
  });
});

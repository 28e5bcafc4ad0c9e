import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { checkDirections, directionFault, importsOf } from '../../scripts/check-directions.mjs';

describe('importsOf', () => {
  it('finds every kind of import with its line and whether only types come over', () => {
    const text = [
      "import { a } from './one.js';",
      "import type { B } from './two.js';",
      "import { type C, type D } from './three.js';",
      "import { type E, f } from './four.js';",
      "export * from './five.js';",
      "export type { G } from './six.js';",
      "const late = await import('./seven.js');",
      "let h: import('./eight.js').H;",
      "import './nine.js';",
      '// import { no } from "./comment.js"',
    ].join('\n');
    expect(importsOf(text)).toEqual([
      { specifier: './one.js', typeOnly: false, line: 1 },
      { specifier: './two.js', typeOnly: true, line: 2 },
      { specifier: './three.js', typeOnly: true, line: 3 },
      { specifier: './four.js', typeOnly: false, line: 4 },
      { specifier: './five.js', typeOnly: false, line: 5 },
      { specifier: './six.js', typeOnly: true, line: 6 },
      { specifier: './seven.js', typeOnly: false, line: 7 },
      { specifier: './eight.js', typeOnly: true, line: 8 },
      { specifier: './nine.js', typeOnly: false, line: 9 },
    ]);
  });
});

describe('directionFault', () => {
  const value = (specifier: string) => ({ specifier, typeOnly: false });
  const type = (specifier: string) => ({ specifier, typeOnly: true });

  it.each([
    ['tracker/src/linking/reach.ts', value('../math/sort.js')],
    ['tracker/src/linking/reach.ts', value('./gate.js')],
    ['tracker/src/linking/reach.ts', type('../run/settings.js')],
    ['tracker/src/store/run-record.ts', type('../pipeline/stages.js')],
    ['tracker/src/pipeline/list.ts', value('../linking/link.js')],
    ['tracker/src/workers/worker.ts', value('../pipeline/process.js')],
    ['tracker/src/node/index.ts', value('node:fs')],
    ['tracker/src/node/index.ts', value('../workers/pool.js')],
    ['tracker/src/workers/entry-node.ts', value('node:worker_threads')],
    ['tracker/src/index.ts', value('./store/export.js')],
    ['tracker/src/store/write.ts', value('hash-wasm')],
    ['cli/src/main.ts', value('@wakeloom/tracker/node')],
    ['web-viewer/src/main.tsx', value('@wakeloom/tracker')],
  ])('%s may import %o', (file, one) => {
    expect(directionFault(file, one)).toBeNull();
  });

  it.each([
    ['tracker/src/linking/reach.ts', value('../noise/estimate.js'), /sibling stage/],
    ['tracker/src/linking/reach.ts', value('../run/settings.js'), /contract/],
    ['tracker/src/linking/reach.ts', value('../pipeline/process.js'), /linking may not import pipeline/],
    ['tracker/src/math/sort.ts', value('../linking/reach.js'), /math may not import linking/],
    ['tracker/src/core/columns.ts', value('../math/sort.js'), /core may not import math/],
    ['tracker/src/pipeline/list.ts', value('../trust/twin.js'), /pipeline may not import trust/],
    ['tracker/src/linking/reach.ts', value('node:fs'), /browsers too/],
    ['tracker/src/workers/worker.ts', value('node:worker_threads'), /browsers too/],
    ['tracker/src/workers/worker.ts', value('../node/files.js'), /workers may not import node/],
    ['tracker/src/index.ts', value('./node/index.js'), /browser-safe/],
    ['tracker/src/linking/reach.ts', value('@wakeloom/cli'), /nothing of @wakeloom/],
    ['tracker/src/linking/reach.ts', value('../../../cli/src/main.js'), /leave its package/],
    ['tracker/src/gadgets/one.ts', value('../core/errors.js'), /no place in the house/],
    ['cli/src/main.ts', value('@wakeloom/web-viewer'), /tracker only/],
    ['web-viewer/src/main.tsx', value('@wakeloom/tracker/node'), /Node-only/],
    ['web-viewer/src/main.tsx', value('node:fs'), /no Node modules/],
  ])('%s may not import %o', (file, one, why) => {
    expect(directionFault(file, one)).toMatch(why);
  });
});

describe('checkDirections', () => {
  let folder: string;
  const put = (path: string, text: string) => {
    mkdirSync(dirname(join(folder, path)), { recursive: true });
    writeFileSync(join(folder, path), text);
  };
  beforeAll(() => {
    folder = mkdtempSync(join(tmpdir(), 'wakeloom-directions-'));
    put('cli/src/main.ts', "import '@wakeloom/tracker';\n");
    put('web-viewer/src/main.tsx', 'export const page = <p />;\n');
    put('tracker/src/core/errors.ts', 'export {};\n');
  });
  afterAll(() => rmSync(folder, { recursive: true }));

  it('says nothing about a tree that keeps the directions, and names file and line of one that does not', () => {
    put('tracker/src/linking/link.ts', "import '../core/errors.js';\n");
    expect(checkDirections(folder)).toEqual([]);
    put('tracker/src/linking/link.ts', "import '../core/errors.js';\nimport { bins } from '../eulerian/bins.js';\n");
    expect(checkDirections(folder)).toEqual([
      'packages/tracker/src/linking/link.ts:2: import of "../eulerian/bins.js": a stage may not import a sibling stage (linking -> eulerian)',
    ]);
  });
});

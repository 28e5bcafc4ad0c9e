import { execFileSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { crc32, StoreZip } from '../../packages/web-viewer/src/state/store-zip.js';
import { needs } from '../helpers/need.js';

const READ = `
import json, sys, zipfile
archive = zipfile.ZipFile(sys.argv[1])
print(json.dumps({
  "broken": archive.testzip(),
  "files": [[i.filename, i.file_size, i.compress_type, list(i.date_time), sum(archive.read(i))] for i in archive.infolist()],
}))`;

describe('archive of stored files', () => {
  it('has the published check value of CRC-32', () => {
    // The check value of "123456789" for CRC-32/ISO-HDLC in the catalogue of parametrised CRC algorithms.
    expect(crc32(new TextEncoder().encode('123456789'))).toBe(0xcbf43926);
    expect(crc32(new Uint8Array(0))).toBe(0);
  });

  it.skipIf(!needs('python3'))("is read whole by Python's zipfile", () => {
    const files: [string, Uint8Array<ArrayBuffer>][] = [
      ['run.json', new TextEncoder().encode('{"run":"a"}')],
      ['pathlines.nc', Uint8Array.from({ length: 100_000 }, (_, i) => (i * 7919) % 251)],
      ['empty', new Uint8Array(0)],
      ['Größe µm.csv', Uint8Array.of(1, 2, 3)],
    ];
    const zip = new StoreZip(new Date(2026, 1, 3, 14, 25, 36));
    for (const [name, bytes] of files) zip.add(name, bytes);
    const folder = mkdtempSync(join(tmpdir(), 'wakeloom-zip-'));
    try {
      const path = join(folder, 'result.zip');
      writeFileSync(path, Buffer.concat(zip.finish()));
      const read = JSON.parse(execFileSync('/usr/bin/python3', ['-c', READ, path], { encoding: 'utf8' }));
      const sum = (bytes: Uint8Array) => bytes.reduce((total, byte) => total + byte, 0);
      expect(read).toEqual({
        broken: null,
        files: files.map(([name, bytes]) => [name, bytes.length, 0, [2026, 2, 3, 14, 25, 36], sum(bytes)]),
      });
    } finally {
      rmSync(folder, { recursive: true, force: true });
    }
  });
});

/** What lies about in a real archive and is no recording, or not any more. */
import { mkdirSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { deflateSync } from 'node:zlib';
import { randomFrom } from './random.ts';

/** CRC-32 as PNG asks for it. */
function crc32(bytes: Uint8Array): number {
  let crc = 0xffffffff;
  for (const byte of bytes) {
    crc ^= byte;
    for (let k = 0; k < 8; k++) crc = crc & 1 ? (crc >>> 1) ^ 0xedb88320 : crc >>> 1;
  }
  return (crc ^ 0xffffffff) >>> 0;
}

/** A grey picture as PNG. */
function png(width: number, height: number, grey: (x: number, y: number) => number): Buffer {
  const raw = Buffer.alloc(height * (width + 1));
  for (let y = 0; y < height; y++)
    for (let x = 0; x < width; x++) raw[y * (width + 1) + 1 + x] = Math.max(0, Math.min(255, Math.round(grey(x, y))));
  const chunk = (name: string, data: Buffer): Buffer => {
    const body = Buffer.concat([Buffer.from(name, 'latin1'), data]);
    const out = Buffer.alloc(body.length + 8);
    out.writeUInt32BE(data.length, 0);
    body.copy(out, 4);
    out.writeUInt32BE(crc32(body), body.length + 4);
    return out;
  };
  const head = Buffer.alloc(13);
  head.writeUInt32BE(width, 0);
  head.writeUInt32BE(height, 4);
  head[8] = 8;
  return Buffer.concat([
    Buffer.from([0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a]),
    chunk('IHDR', head),
    chunk('IDAT', deflateSync(raw)),
    chunk('IEND', Buffer.alloc(0)),
  ]);
}

/** @param root the archive */
export function writeStrays(root: string): void {
  const at = (folder: string, name: string): string => {
    const place = path.join(root, 'recordings', folder);
    mkdirSync(place, { recursive: true });
    return path.join(place, name);
  };
  writeFileSync(
    at('2026-03-11-loft', 's2-plan.nwb'),
    'To do on the loft rig: order glass, ask about the heater, put the bridge on the checklist.\n',
  );
  const random = randomFrom('slice picture');
  writeFileSync(
    at('2026-03-25-loft', 's2-pair.png'),
    png(160, 120, (x, y) => {
      const soma = (cx: number, cy: number): number => 90 * Math.exp(-((x - cx) ** 2 + (y - cy) ** 2) / 90);
      return (
        110 + soma(52, 66) + soma(104, 50) - 60 * Math.exp(-((y - 60 - 0.3 * (x - 30)) ** 2) / 6) + 9 * random.normal()
      );
    }),
  );
  writeFileSync(
    at('2026-05-14-tank', 'bench-sheet.csv'),
    [
      'dish;cell;time;pipette MOhm;seal GOhm;remark',
      'd1;1;13:40;2,4;1,8;good striation',
      'd1;2;14:16;2,6;2,2;bath bottle: see shelf',
      'd2;1;14:55;2,5;1,1;',
      ';;;;;"third dish dead, all rounded up"',
      '',
    ].join('\r\n'),
  );
  writeFileSync(at('2026-06-18-quay', 'empty.nwb'), '');
}

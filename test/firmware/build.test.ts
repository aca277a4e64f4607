/** The committed .hex files are what the sources give: with the compiler here, this rebuilds them. */
import { spawnSync } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { afterAll, expect, test } from 'vitest';
import { EMULATED_BOARDS } from '../../hardware-sim/emulator/emulatedBoard.js';
import { parseHex } from '../../hardware-sim/emulator/hexFile.js';
import { packageRoot } from '../../server/packageRoot.js';

const FIRMWARE = path.join(packageRoot, 'hardware-sim', 'firmware');
const folder = fs.mkdtempSync(path.join(os.tmpdir(), 'lapwing-firmware-'));
afterAll(() => fs.rmSync(folder, { recursive: true, force: true }));

function build(script: string, out: string): string {
  const { status, stdout, stderr, error } = spawnSync('sh', [script, out], { encoding: 'utf8' });
  const hint = 'sudo apt-get install gcc-avr avr-libc binutils-avr (Debian, Ubuntu)';
  if (error !== undefined || status !== 0) throw new Error(`${stdout}${stderr}\n${hint}`);
  return stdout;
}

test('two builds, one of them from another folder, give the committed bytes', () => {
  const elsewhere = path.join(folder, 'a folder with another name');
  fs.cpSync(FIRMWARE, elsewhere, { recursive: true });
  const here = path.join(folder, 'here');
  build(path.join(FIRMWARE, 'build.sh'), here);
  const there = path.join(folder, 'there');
  build(path.join(elsewhere, 'build.sh'), there);
  for (const board of Object.keys(EMULATED_BOARDS)) {
    const committed = fs.readFileSync(path.join(FIRMWARE, 'hex', `${board}.hex`), 'utf8');
    expect(fs.readFileSync(path.join(here, `${board}.hex`), 'utf8')).toBe(committed);
    expect(fs.readFileSync(path.join(there, `${board}.hex`), 'utf8')).toBe(committed);
  }
}, 180_000);

test('the firmware leaves room for a boot loader of 2 KB', () => {
  const hex = fs.readFileSync(path.join(FIRMWARE, 'hex', 'atmega328p.hex'), 'utf8');
  const words = parseHex(hex, 0x4000);
  const used = words.findLastIndex((word) => word !== 0xffff) + 1;
  expect(used * 2).toBeLessThan(30 * 1024);
});

test.each([
  ['cut short', (text: string) => text.slice(0, text.lastIndexOf(':')), /no end record/],
  ['with a flipped digit', (text: string) => text.replace(':10', ':11'), /line 1/],
])('a .hex file that is %s is not run', (_, spoil, message) => {
  const hex = fs.readFileSync(path.join(FIRMWARE, 'hex', 'atmega328p.hex'), 'latin1');
  expect(() => parseHex(spoil(hex), 0x4000)).toThrow(message);
});

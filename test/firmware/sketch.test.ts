/**
 * The sketch is compiled, for two boards, against the hobby platform's own sources where they are
 * installed (Debian: arduino-core-avr), and against the same declarations everywhere. It is never run:
 * FIRMWARE.md says so.
 */
import { spawnSync } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { afterAll, expect, test } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';

const PLATFORM = '/usr/share/arduino/hardware/arduino/avr';
const installed = fs.existsSync(PLATFORM);
const folder = fs.mkdtempSync(path.join(os.tmpdir(), 'lapwing-sketch-'));
afterAll(() => fs.rmSync(folder, { recursive: true, force: true }));

function run(command: string, args: readonly string[]): string {
  const { status, stdout, stderr } = spawnSync(command, args, { encoding: 'utf8' });
  expect(status, `${command} ${args.join(' ')}\n${stdout}${stderr}`).toBe(0);
  return stdout;
}

const script = path.join(packageRoot, 'hardware-sim/firmware/sketch/makeSketch.sh');
const sketch = path.dirname(run('sh', [script, folder]).trim());

/** Of the platform's core, what a sketch that uses pins, time and the line is linked with. */
const CORE = ['wiring', 'wiring_digital', 'wiring_analog', 'WInterrupts', 'hooks'];
const C = ['-std=gnu11'];
const CPP = ['-x', 'c++', '-std=gnu++11', '-fno-exceptions', '-fno-threadsafe-statics'];
const CORE_CPP = ['HardwareSerial', 'HardwareSerial0', 'Print', 'main', 'abi', 'new', 'WString'];

interface Target {
  readonly chip: string;
  readonly include: readonly string[];
}

/** Compiles every file of the sketch, warnings being errors. @returns the object files */
function compileSketch({ chip, include }: Target, out: string): string[] {
  const own = fs.readdirSync(sketch).filter((name) => name.endsWith('.c'));
  expect(own.length).toBeGreaterThan(8);
  const strict = ['-Wall', '-Wextra', '-Werror'];
  // As the platform does with a sketch's own file: its header first.
  const ino = [path.join(sketch, 'lapwing.ino'), '-include', 'Arduino.h', ...CPP];
  return [
    ...own.map((name) =>
      compile({ chip, include }, out, [path.join(sketch, name), ...C, ...strict]),
    ),
    compile({ chip, include }, out, [...ino, ...strict]),
  ];
}

function compile({ chip, include }: Target, out: string, args: readonly string[]): string {
  const object = path.join(out, `${path.basename(args[0]!)}.o`);
  const common = [`-mmcu=${chip}`, '-DF_CPU=16000000L', '-DARDUINO=10819', '-Os'];
  // The compiler's own name for what the platform asks of a newer one.
  const newer = '-DDECIMAL_DIG=__DECIMAL_DIG__';
  const sections = ['-ffunction-sections', '-fdata-sections'];
  const compiler = args.includes('c++') ? 'avr-g++' : 'avr-gcc';
  const [file, ...more] = args;
  const folders = include.flatMap((one) => ['-I', one]);
  run(compiler, [...common, newer, ...sections, ...folders, ...more, '-c', file!, '-o', object]);
  return object;
}

test('the sketch is compiled without a warning against what it asks of the platform', () => {
  const include = [path.join(packageRoot, 'test/firmware/platform')];
  const out = fs.mkdtempSync(path.join(folder, 'declared-'));
  expect(compileSketch({ chip: 'atmega328p', include }, out).length).toBeGreaterThan(9);
}, 180_000);

test.each(
  installed
    ? ([
        ['atmega328p', 'standard', 32_256, 2_048],
        ['atmega2560', 'mega', 253_952, 8_192],
      ] as const)
    : [],
)(
  "for the %s it is linked with the platform's own sources, and fits",
  (chip, variant, flash, memory) => {
    const core = path.join(PLATFORM, 'cores/arduino');
    const target = { chip, include: [core, path.join(PLATFORM, 'variants', variant)] };
    const out = fs.mkdtempSync(path.join(folder, `${chip}-`));
    const objects = [
      ...compileSketch(target, out),
      ...CORE.map((name) => compile(target, out, [path.join(core, `${name}.c`), ...C, '-w'])),
      ...CORE_CPP.map((name) =>
        compile(target, out, [path.join(core, `${name}.cpp`), ...CPP, '-w']),
      ),
    ];
    const elf = path.join(out, 'sketch.elf');
    run('avr-gcc', [`-mmcu=${chip}`, '-Os', '-Wl,--gc-sections', ...objects, '-lm', '-o', elf]);
    const [text, data, bss] = run('avr-size', [elf])
      .split('\n')[1]!
      .trim()
      .split(/\s+/)
      .map(Number);
    expect(text! + data!).toBeLessThan(flash);
    expect(data! + bss!).toBeLessThan(memory - 128);
  },
  180_000,
);

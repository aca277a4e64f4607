import { spawnSync } from 'node:child_process';
import { existsSync } from 'node:fs';
import { delimiter, join } from 'node:path';
import { Command, Option } from 'commander';
import { LapwingError } from '../errors/codes.js';
import { packageRoot } from '../packageRoot.js';

/** How each board's own boot loader is spoken to: common practice, no source. */
export const FLASHABLE = {
  atmega328p: { programmer: 'arduino', baud: 115_200, what: '8-bit, ATmega328P at 16 MHz' },
  atmega2560: { programmer: 'wiring', baud: 115_200, what: '8-bit, ATmega2560 at 16 MHz' },
} as const;
export type FlashableBoard = keyof typeof FLASHABLE;

interface FlashFlags {
  board: FlashableBoard;
  port?: string;
  baud?: string;
  dryRun?: boolean;
}

/** The avrdude command that puts the committed firmware on a board. */
export function flashArguments(board: FlashableBoard, port: string, baud?: string): string[] {
  const { programmer, baud: usual } = FLASHABLE[board];
  const hex = join(packageRoot, 'hardware-sim', 'firmware', 'hex', `${board}.hex`);
  const speed = baud ?? String(usual);
  // -D: the boot loader erases what it writes, and must not be asked to erase itself.
  return ['-p', board, '-c', programmer, '-P', port, '-b', speed, '-D', '-U', `flash:w:${hex}:i`];
}

/** `lapwing flash`: puts the firmware on a board where avrdude is installed, and says how else. */
export function flashCommand(): Command {
  const board = new Option('--board <chip>', 'the chip on the board')
    .choices(Object.keys(FLASHABLE))
    .default('atmega328p');
  return new Command('flash')
    .description("put Lapwing's firmware on a board, or tell how")
    .addOption(board)
    .option('--port <path>', 'where the board is; `lapwing ports` lists them')
    .option('--baud <rate>', "the boot loader's speed (older small boards: 57600)")
    .option('--dry-run', 'only print the command')
    .action((flags: FlashFlags) => {
      const port = flags.port ?? 'PORT';
      const args = flashArguments(flags.board, port, flags.baud);
      const command = ['avrdude', ...args.map(quoted)].join(' ');
      if (flags.dryRun || flags.port === undefined || !onPath('avrdude')) {
        process.stdout.write(`${howTo(flags.board, command, onPath('avrdude'))}\n`);
        return;
      }
      process.stdout.write(`${command}\n`);
      const { status } = spawnSync('avrdude', args, { stdio: 'inherit' });
      if (status !== 0) {
        throw new LapwingError('flashFailed', `avrdude ended with status ${status}.`);
      }
      process.stdout.write(`done; now: lapwing selftest ${port} --outputs-free\n`);
    });
}

function howTo(board: FlashableBoard, command: string, installed: boolean): string {
  const page = join(packageRoot, 'hardware-sim', 'firmware', 'FIRMWARE.md');
  return [
    `Firmware for ${FLASHABLE[board].what}. Unplug everything from the outputs first.`,
    ...(installed ? [] : ['avrdude is not installed here (Debian: sudo apt-get install avrdude).']),
    'The command, with the port from `lapwing ports`:',
    '',
    `  ${command}`,
    '',
    `Then: lapwing selftest PORT --outputs-free. Wiring: ${page}`,
  ].join('\n');
}

function quoted(text: string): string {
  return /[\s'"\\$]/.test(text) ? `'${text.replaceAll("'", "'\\''")}'` : text;
}

function onPath(program: string): boolean {
  const folders = (process.env.PATH ?? '').split(delimiter);
  const names = process.platform === 'win32' ? [`${program}.exe`] : [program];
  return folders.some((folder) => names.some((name) => existsSync(join(folder, name))));
}

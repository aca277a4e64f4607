import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { BoardLink } from '../../server/link/boardLink.js';
import { portOpener } from '../../server/link/resolvePort.js';
import { PseudoTerminal } from './pseudoTerminal.js';
import { Recorder } from './recorder.js';
import { ScriptedBoard } from './scriptedBoard.js';
import { until } from './until.js';

/** A board on a pseudo-terminal behind a stable name that follows it, as udev would keep one. */
class PluggedBoard extends ScriptedBoard {
  terminal!: PseudoTerminal;
  #ticks: NodeJS.Timeout;

  constructor(readonly stablePath: string) {
    super();
    this.plug();
    this.#ticks = setInterval(() => {
      if (this.tag !== 0) this.say('sample', { count: 1 });
    }, 20);
  }

  plug(): void {
    this.terminal = new PseudoTerminal((bytes) => this.receive(bytes));
    this.write = (bytes) => this.terminal.write(bytes);
    fs.rmSync(this.stablePath, { force: true });
    fs.symlinkSync(this.terminal.path, this.stablePath);
  }

  unplug(): void {
    this.terminal.unplug();
    fs.rmSync(this.stablePath, { force: true });
  }

  end(): void {
    clearInterval(this.#ticks);
    this.terminal.unplug();
  }
}

/** How many descriptors of this process lead to `device`. */
function descriptorsOf(device: string): number {
  return fs.readdirSync('/proc/self/fd').filter((fd) => {
    try {
      return fs.readlinkSync(`/proc/self/fd/${fd}`) === device;
    } catch {
      return false;
    }
  }).length;
}

for (const means of ['terminal', 'stream'] as const) {
  describe(`a link over a pseudo-terminal (${means})`, () => {
    let folder: string;
    let board: PluggedBoard;
    let handler: Recorder;
    let link: BoardLink;

    beforeEach(() => {
      folder = fs.mkdtempSync(path.join(os.tmpdir(), 'lapwing-link-'));
      board = new PluggedBoard(path.join(folder, 'board'));
      handler = new Recorder();
      link = newLink(handler);
    });
    afterEach(async () => {
      await link.close();
      board.end();
      fs.rmSync(folder, { recursive: true });
    });

    function newLink(forHandler: Recorder): BoardLink {
      const openPort = portOpener(board.stablePath, { baudRate: 500_000, means });
      return new BoardLink({ openPort, handler: forHandler });
    }
    const upCount = () => handler.of('up').length;

    it('carries every byte value both ways', async () => {
      link.start();
      await until('up', () => link.state === 'up');
      for (let byte = 0; byte < 256; byte++) {
        board.say('edge', { boardUs: byte * 0x01010101, count: byte - 128, input: byte });
        expect(link.send('beat', { finishedUs: byte * 0x01010101, wanted: ~byte >>> 0 })).toBe(
          true,
        );
      }
      await until('all edges', () => handler.of('edge').length === 256);
      await until('all beats', () => board.of('beat').length === 256);
      expect(handler.of('edge').map((item) => item.message.input)).toEqual(
        Array.from({ length: 256 }, (_, byte) => byte),
      );
      expect(board.of('beat').at(-1)).toEqual({ finishedUs: 0xffffffff, wanted: 0xffffff00 });
      expect(handler.of('gap')).toEqual([]);
      expect(link.counters.bad).toBe(0);
    });

    it('goes down when the cable is pulled, and up again when it is back under another name', async () => {
      link.start();
      await until('up', () => link.state === 'up');
      const first = board.terminal.path;
      board.terminal.write(board.bytesOf('edge', { input: 1 }).subarray(0, 9));
      board.unplug();
      await until('down', () => handler.of('down').length === 1);
      expect(handler.of('down')[0]!.why.code).toMatch(/LINK_(UNPLUGGED|SILENT|WRITE_FAILED)/);
      expect(link.send('quiet', { outputs: 0xffff })).toBe(false);
      await until('a failed attempt', () => handler.of('waiting').length > 0);
      expect(handler.of('waiting')[0]!.why.code).toBe('LINK_PORT_MISSING');
      // Keeps the old name from being used again at once.
      const placeholder = new PseudoTerminal(() => {});
      board.plug();
      await until('up again', () => upCount() === 2);
      expect(board.terminal.path).not.toBe(first);
      expect(handler.of('up')[1]!.event.sameBoot).toBe(true);
      board.say('edge', { input: 2 });
      await until('an edge', () => handler.of('edge').length > 0);
      expect(handler.of('edge').map((item) => item.message.input)).toEqual([2]);
      expect(board.stale).toEqual([]);
      placeholder.unplug();
    });

    it('loses the link when the board takes nothing, and sends none of that under the next', async () => {
      link.start();
      await until('up', () => link.state === 'up');
      board.terminal.pause(true);
      let sent = 0;
      // A pseudo-terminal holds some 20 kB; the frame that does not fit ends the connection.
      while (link.send('beat', { finishedUs: sent, wanted: 0 })) sent++;
      expect(link.send('quiet', { outputs: 0xffff })).toBe(false);
      await until('down', () => handler.of('down').length === 1);
      expect(handler.of('down')[0]!.why.code).toBe('LINK_WRITE_FAILED');
      board.terminal.pause(false);
      await until('up again', () => upCount() === 2);
      expect(link.send('quiet', { outputs: 1 })).toBe(true);
      await until('the only quiet', () => board.of('quiet').length > 0);
      const last = board.received.findLastIndex((item) => item.name === 'identify');
      const since = board.received.slice(last + 1);
      expect(since.map((item) => item.name)).toEqual(['quiet']);
      expect(since[0]!.tag).toBe(handler.of('up')[1]!.event.tag);
    });

    it('refuses a port that another link holds, and takes it when it is free', async () => {
      link.start();
      await until('up', () => link.state === 'up');
      const second = new Recorder();
      const other = newLink(second);
      other.start();
      await until('refused', () => second.of('waiting').length > 0);
      expect(second.of('waiting')[0]!.why.code).toBe('LINK_PORT_BUSY');
      expect(link.state).toBe('up');
      await link.close();
      await until('the other is up', () => other.state === 'up');
      await other.close();
    });

    it('closes every descriptor once, however often it connects', async () => {
      // The board's own, which keep the terminal alive while no link is there.
      const idle = descriptorsOf(board.terminal.path);
      link.start();
      await until('up', () => link.state === 'up');
      expect(descriptorsOf(board.terminal.path)).toBeGreaterThan(idle);
      await link.close();
      for (let round = 0; round < 20; round++) {
        const again = newLink(new Recorder());
        again.start();
        if (round % 2 === 0) await until('up', () => again.state === 'up');
        await again.close();
      }
      expect(descriptorsOf(board.terminal.path)).toBe(idle);
    });
  });
}

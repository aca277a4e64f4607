import { describe, expect, it } from 'vitest';
import { inProcessPair } from '../../server/link/inProcessPort.js';

/** A pair whose deferred work runs only when the test says so. */
function pair() {
  const later: (() => void)[] = [];
  const made = inProcessPair({ defer: (task) => void later.push(task) });
  const log: string[] = [];
  made.host.listen({ bytes: (bytes) => log.push(`host ${bytes}`), closed: () => log.push('gone') });
  made.board.onBytes = (bytes) => log.push(`board ${bytes}`);
  const runLater = () => {
    for (const task of later.splice(0)) task();
  };
  return { ...made, log, runLater };
}

describe('the in-process port', () => {
  it('delivers what the board sends at once, and what the host writes not within the write', () => {
    const { host, board, log, runLater } = pair();
    board.send(Uint8Array.of(1));
    expect(log).toEqual(['host 1']);
    expect(host.write(Uint8Array.of(2))).toBe(true);
    expect(log).toEqual(['host 1']);
    runLater();
    expect(log).toEqual(['host 1', 'board 2']);
  });

  it('never delivers inside a delivery: answers follow, in order', () => {
    const { host, board, log } = pair();
    let inside = 0;
    let deepest = 0;
    const within = (task: () => void) => {
      deepest = Math.max(deepest, ++inside);
      task();
      inside--;
    };
    host.listen({
      bytes: (bytes) =>
        within(() => {
          log.push(`host ${bytes}`);
          if (bytes[0]! < 4) host.write(Uint8Array.of(bytes[0]! + 1));
        }),
      closed: () => {},
    });
    board.onBytes = (bytes) =>
      within(() => {
        log.push(`board ${bytes}`);
        board.send(Uint8Array.of(bytes[0]! + 1));
      });
    board.send(Uint8Array.of(0));
    expect(log).toEqual(['host 0', 'board 1', 'host 2', 'board 3', 'host 4']);
    expect(deepest).toBe(1);
  });

  it('keeps a copy of what the host wrote, whose buffer is used again', () => {
    const { host, log, runLater } = pair();
    const buffer = Uint8Array.of(7);
    host.write(buffer);
    buffer[0] = 8;
    runLater();
    expect(log).toEqual(['board 7']);
  });

  it('loses what was on its way when the cable is pulled, and takes nothing more', () => {
    const { host, board, log, runLater } = pair();
    host.write(Uint8Array.of(1));
    board.unplug();
    runLater();
    expect(log).toEqual(['gone']);
    expect(host.write(Uint8Array.of(2))).toBe(false);
    board.send(Uint8Array.of(3));
    expect(log).toEqual(['gone']);
  });

  it('delivers nothing after the host has closed it, and does not tell the host of that', async () => {
    const { host, board, log } = pair();
    await host.close();
    board.send(Uint8Array.of(1));
    expect(log).toEqual([]);
  });
});

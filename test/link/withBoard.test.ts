import { beforeEach, describe, expect, it } from 'vitest';
import { Board } from '../../hardware-sim/board/board.js';
import { FramedOutput } from '../../hardware-sim/board/boardOutput.js';
import { BoardLink } from '../../server/link/boardLink.js';
import { inProcessPair } from '../../server/link/inProcessPort.js';
import { blank } from '../../server/wire/codec.js';
import { FAULT, OUTCOME } from '../../server/wire/messages.js';
import { FaultyPort } from './faultyPort.js';
import { Recorder } from './recorder.js';
import { VirtualTimers } from './virtualTimers.js';

/** The link and the whole simulated board on one virtual clock. */
class Bench {
  readonly timers = new VirtualTimers();
  readonly handler = new Recorder();
  readonly board = new Board({ boardId: 5, startUs: 0xffff_0000 });
  readonly link: BoardLink;
  readonly #startUs = this.board.worldUs;
  port!: FaultyPort;
  beating = true;

  constructor() {
    this.link = new BoardLink({
      handler: this.handler,
      timers: this.timers,
      openPort: async () => {
        const defer = (task: () => void) => void this.timers.set(0, task);
        const { host, board } = inProcessPair({ defer });
        this.board.connect(new FramedOutput((bytes) => board.send(bytes)));
        board.onBytes = (bytes) => this.board.receiveBytes(bytes);
        this.port = new FaultyPort(host, [4096]);
        return this.port;
      },
    });
    // Beats come from what was finished, as in the loop: here, from each sample.
    this.handler.onSample = ({ boardUs }) => {
      if (this.beating) this.link.send('beat', { finishedUs: boardUs, wanted: 0xffff });
    };
  }

  async run(ms: number): Promise<void> {
    for (let n = 0; n < ms; n++) {
      await this.timers.advance(1);
      this.board.advanceTo(this.#startUs + this.timers.now() * 1000);
    }
  }

  configure(): void {
    this.link.send('configure', {
      ...blank('configure'),
      output: 0,
      longestOnUs: 50_000,
      allowanceUs: 1_000_000,
      allowanceRises: 100,
    });
  }

  pulse(id: number): void {
    const expiryUs = this.board.boardUs + 20_000;
    const shape = { widthUs: 2_000, repeats: 1, expiryUs };
    this.link.send('pulse', { ...blank('pulse'), id, output: 0, ...shape });
  }
}

describe('the link with the simulated board', () => {
  let bench: Bench;
  beforeEach(async () => {
    bench = new Bench();
    bench.link.start();
    await bench.run(20);
  });

  it('comes up, keeps up over the wrap of board time, and loses nothing', async () => {
    const events = bench.handler.of('up').map((item) => item.event);
    expect(events).toMatchObject([{ identity: { boardId: 5, model: 'simulated' } }]);
    await bench.run(2_000);
    expect(bench.board.boardUs).toBeGreaterThan(0xffff_ffff);
    expect(bench.link.state).toBe('up');
    expect(bench.handler.of('down')).toEqual([]);
    expect(bench.link.counters).toMatchObject({ lost: 0, bad: 0 });
    // The wire's promise: a sample at least every 5 ms.
    expect(bench.handler.of('sample').length).toBeGreaterThanOrEqual(400);
  });

  it('carries a pulse to the board and its outcomes back', async () => {
    bench.configure();
    bench.pulse(1);
    await bench.run(10);
    const outcomes = bench.handler.of('outcome').map((item) => item.message);
    expect(outcomes).toMatchObject([
      { id: 1, kind: OUTCOME.fired },
      { id: 1, kind: OUTCOME.done, onUs: 2_000 },
    ]);
  });

  it('is told what the board kept when the host fell silent and came back', async () => {
    bench.configure();
    bench.pulse(1);
    await bench.run(10);
    bench.beating = false;
    await bench.run(300);
    const faults = bench.handler.of('fault').map((item) => item.message.fault);
    expect(faults).toEqual([FAULT.watchdogSlots, FAULT.watchdogOutputs]);
    expect(bench.handler.of('down').map((item) => item.why.code)).toEqual(['LINK_TAG_ENDED']);
    expect(bench.link.state).toBe('up');
    expect(bench.handler.of('up')[1]!.event).toMatchObject({ sameBoard: true, sameBoot: true });
    const repeated = bench.handler.of('outcome').filter((item) => item.message.repeated === 1);
    expect(repeated.map((item) => item.message.id)).toEqual([1, 1]);
  });

  it('notices that the board was reset', async () => {
    bench.board.reset();
    await bench.run(20);
    expect(bench.link.state).toBe('up');
    expect(bench.handler.of('up')[1]!.event).toMatchObject({ sameBoard: true, sameBoot: false });
  });

  it('never lets what lay in the line for 3 s act, and shakes hands anew', async () => {
    bench.configure();
    await bench.run(5);
    let rises = 0;
    bench.board.probe(() => rises++);
    bench.port.holdingWrites = true;
    for (let id = 1; id <= 20; id++) bench.pulse(id);
    await bench.run(3_000);
    expect(bench.handler.of('down').map((item) => item.why.code)).toContain('LINK_TAG_ENDED');
    bench.port.releaseWrites();
    await bench.run(300);
    expect(rises).toBe(0);
    const faults = bench.handler.of('fault').map((item) => item.message.fault);
    expect(faults).toContain(FAULT.watchdogOutputs);
    expect(bench.link.state).toBe('up');
    bench.configure();
    bench.pulse(1);
    await bench.run(10);
    expect(rises).toBe(2);
  });

  it('never lets a command of an ended connection act', async () => {
    bench.configure();
    await bench.run(5);
    let rises = 0;
    bench.board.probe(() => rises++);
    bench.pulse(1);
    // It still lies in the port as the board resets, and reaches it afterwards.
    bench.board.reset();
    await bench.run(50);
    expect(rises).toBe(0);
    expect(bench.handler.of('outcome')).toEqual([]);
    expect(bench.link.state).toBe('up');
  });
});

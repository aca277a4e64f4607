import { describe, expect, it } from 'vitest';
import { LapwingError } from '../../server/errors/codes.js';
import { ANSWER_MS, GRACE_MS, IDENTIFY_MS, SILENCE_MS } from '../../server/link/boardLink.js';
import type { BytePort } from '../../server/link/bytePort.js';
import { cobsEncode } from '../../server/wire/cobs.js';
import { crc16 } from '../../server/wire/crc16.js';
import { FAULT, type MessageOf } from '../../server/wire/messages.js';
import { VirtualLink } from './virtualLink.js';

/** A port that takes only the first half of the next write of at least `from` bytes. */
class ShortWrites implements BytePort {
  shortNext = false;
  readonly sent: number[] = [];
  constructor(readonly inner: BytePort) {}
  readonly name = 'short';
  readonly transport = 'serial';
  listen: BytePort['listen'] = (listener) => this.inner.listen(listener);
  write(bytes: Uint8Array): boolean {
    if (!this.shortNext) return this.inner.write(bytes);
    this.inner.write(bytes.subarray(0, bytes.length >> 1));
    return false;
  }
  close = () => this.inner.close();
}

describe('the handshake', () => {
  it('opens with a delimiter and a fresh tag, and both sides then use that tag', async () => {
    const rig = new VirtualLink();
    const first: Uint8Array[] = [];
    rig.wrap = (port) => ({
      name: port.name,
      transport: port.transport,
      listen: (listener) => port.listen(listener),
      close: () => port.close(),
      write: (bytes) => {
        first.push(bytes.slice());
        return port.write(bytes);
      },
    });
    await rig.up();
    expect(first[0]).toEqual(Uint8Array.of(0));
    const asked = rig.board.of('identify')[0] as MessageOf['identify'];
    expect(asked.newTag).toBeGreaterThan(0);
    expect(rig.handler.of('up')[0]!.event).toMatchObject({
      tag: asked.newTag,
      port: 'virtual',
      previous: undefined,
      sameBoard: false,
      sameBoot: false,
    });
    expect(rig.link.send('quiet', { outputs: 0xffff })).toBe(true);
    await rig.timers.advance(1);
    expect(rig.board.received.at(-1)).toEqual({
      name: 'quiet',
      tag: asked.newTag,
      message: { outputs: 0xffff },
    });
  });

  it('never uses tag 0 nor the same tag twice running', async () => {
    // Numbers a bad generator could give: nonce, then candidate tags.
    const numbers = [5, 0x10000, 7, 9, 0xffff0007, 0, 8];
    const rig = new VirtualLink({ random: () => numbers.shift() ?? 99 });
    await rig.up();
    expect(rig.handler.of('up')[0]!.event.tag).toBe(7);
    rig.board.watchdog();
    await rig.timers.advance(5);
    expect(rig.handler.of('up')[1]!.event.tag).toBe(8);
  });

  it('asks again while no answer comes, and takes only the answer to its last question', async () => {
    const rig = new VirtualLink();
    rig.board.answers = false;
    rig.link.start();
    await rig.timers.advance(IDENTIFY_MS * 2 + 10);
    const asked = rig.board.of('identify') as MessageOf['identify'][];
    expect(asked.length).toBe(3);
    expect(new Set(asked.map((one) => one.nonce)).size).toBe(3);
    rig.board.tag = asked[0]!.newTag;
    rig.board.say('identity', { ...rig.board.identity, nonce: asked[0]!.nonce });
    expect(rig.link.state).toBe('connecting');
    rig.board.tag = asked[2]!.newTag;
    rig.board.say('identity', { ...rig.board.identity, nonce: asked[2]!.nonce });
    expect(rig.link.state).toBe('up');
  });

  it('asks at once when a board introduces itself after reset', async () => {
    const rig = new VirtualLink();
    rig.board.answers = false;
    rig.link.start();
    await rig.timers.advance(10);
    rig.board.answers = true;
    rig.board.say('identity', { ...rig.board.identity, nonce: 0 });
    await rig.timers.advance(1);
    expect(rig.link.state).toBe('up');
  });

  it('hands on the outcomes that the board kept, after saying that the link is up', async () => {
    const rig = new VirtualLink();
    rig.board.onMessage = (name) => {
      if (name === 'identify') rig.board.say('outcome', { id: 9, repeated: 1 });
    };
    await rig.up();
    expect(rig.handler.heard.filter((item) => item.what !== 'batch').slice(0, 2)).toMatchObject([
      { what: 'up' },
      { what: 'outcome', message: { id: 9, repeated: 1 } },
    ]);
  });

  it('names both versions when the board speaks another protocol, and goes on asking', async () => {
    const rig = new VirtualLink();
    rig.board.identity.protocol = 9;
    rig.link.start();
    await rig.timers.advance(50);
    const [refused] = rig.handler.of('waiting');
    expect(refused!.why.code).toBe('LINK_PROTOCOL');
    expect(refused!.why.message).toBe(
      'The board (scripted) speaks protocol 9; this Lapwing speaks 1.',
    );
    expect(rig.link.send('quiet', { outputs: 1 })).toBe(false);
    rig.board.identity.protocol = 1;
    await rig.timers.advance(100);
    expect(rig.link.state).toBe('up');
  });

  it('names both versions even when the other one has another identity', async () => {
    const rig = new VirtualLink();
    rig.board.answers = false;
    rig.board.onMessage = () => {
      const { nonce } = rig.board.of('identify').at(-1) as MessageOf['identify'];
      // As on the wire page: type, sequence, tag, then nonce and protocol, which never move.
      const bytes = Uint8Array.of(0x01, 0, 0, 0, 0, 0, 0, 0, 7, 1, 2, 3, 0, 0);
      const view = new DataView(bytes.buffer);
      view.setUint32(4, nonce, true);
      view.setUint16(12, crc16(bytes, 0, 12), true);
      const stuffed = new Uint8Array(20);
      rig.cable.send(stuffed.subarray(0, cobsEncode(bytes, bytes.length, stuffed) + 1));
    };
    rig.link.start();
    await rig.timers.advance(50);
    expect(rig.handler.of('waiting')[0]!.why.message).toBe(
      'The board speaks protocol 7; this Lapwing speaks 1.',
    );
  });

  it('understands a board that refuses our protocol with a fault alone', async () => {
    const rig = new VirtualLink();
    rig.board.answers = false;
    rig.board.onMessage = () => rig.board.say('fault', { fault: FAULT.badProtocol, detail: 1 });
    rig.link.start();
    await rig.timers.advance(50);
    expect(rig.handler.of('waiting')[0]!.why.message).toBe(
      'The board refuses protocol 1, which this Lapwing speaks.',
    );
  });

  it('says what it heard where no board answers', async () => {
    const rig = new VirtualLink();
    rig.board.answers = false;
    rig.link.start();
    await rig.timers.advance(ANSWER_MS + IDENTIFY_MS);
    expect(rig.handler.of('waiting')[0]!.why.message).toContain('not a byte came in 3 s');
    await rig.timers.advance(200);
    rig.cable.send(Uint8Array.of(1, 2, 3, 4));
    await rig.timers.advance(ANSWER_MS + IDENTIFY_MS);
    expect(rig.handler.of('waiting')[1]!.why.message).toContain('4 bytes came, and no frame');
    expect(rig.handler.of('waiting')[1]!.why.code).toBe('LINK_NO_ANSWER');
  });

  it('refuses a board that is not the one the rig file names', async () => {
    const rig = new VirtualLink({ boardId: 78 });
    rig.link.start();
    await rig.timers.advance(50);
    expect(rig.handler.of('waiting')[0]!.why.code).toBe('LINK_OTHER_BOARD');
    expect(rig.handler.of('waiting')[0]!.why.message).toContain('Board 77 (scripted) answered');
    expect(rig.handler.of('up')).toEqual([]);
  });
});

describe('what the board says', () => {
  it('reports lost frames by their sequence, over the wrap of its 8 bits', async () => {
    const rig = new VirtualLink();
    await rig.up();
    rig.sample(false);
    rig.handler.heard.length = 0;
    for (let n = 0; n < 600; n++) {
      if (n === 100 || n === 400 || n === 401) rig.board.loseOne();
      else rig.board.say('clock', { wraps: n });
    }
    expect(rig.handler.of('gap').map((item) => item.frames)).toEqual([1, 2]);
    const at = rig.handler.heard.findIndex((item) => item.what === 'gap');
    expect(rig.handler.heard[at + 1]).toMatchObject({ what: 'clock', message: { wraps: 101 } });
    expect(rig.link.counters.lost).toBe(3);
  });

  it('drops and counts frames under another tag, and stays up', async () => {
    const rig = new VirtualLink();
    await rig.up();
    const { tag } = rig.board;
    rig.board.tag = tag ^ 0x5555;
    rig.board.say('edge', { input: 3 });
    rig.board.tag = tag;
    expect(rig.handler.of('edge')).toEqual([]);
    expect(rig.link.counters.foreign).toBe(1);
    expect(rig.link.state).toBe('up');
  });

  it('reports a broken frame and takes the next', async () => {
    const rig = new VirtualLink();
    await rig.up();
    const broken = rig.board.bytesOf('edge', { input: 1 });
    broken[3]! ^= 0x10;
    rig.cable.send(broken);
    rig.board.say('edge', { input: 2 });
    expect(rig.handler.of('bad').length).toBe(1);
    expect(rig.handler.of('edge').map((item) => item.message.input)).toEqual([2]);
    expect(rig.handler.of('gap').map((item) => item.frames)).toEqual([1]);
  });

  it('says once when everything that came together has been handed on', async () => {
    const rig = new VirtualLink();
    await rig.up();
    const before = rig.handler.batches;
    const two = [rig.board.bytesOf('clock'), rig.board.bytesOf('clock')];
    rig.cable.send(Buffer.concat(two));
    expect(rig.handler.batches).toBe(before + 1);
    expect(rig.handler.heard.at(-1)).toEqual({ what: 'batch' });
  });
});

describe('losing the link', () => {
  it('notices silence in 250 ms, and never sooner', async () => {
    const rig = new VirtualLink();
    await rig.up();
    rig.sample(false);
    await rig.timers.advance(SILENCE_MS - 10);
    expect(rig.link.state).toBe('up');
    await rig.timers.advance(10 + GRACE_MS);
    expect(rig.handler.of('down').map((item) => item.why.code)).toEqual(['LINK_SILENT']);
  });

  it('is not deceived by noise, nor by frames that are not its own', async () => {
    const rig = new VirtualLink();
    await rig.up();
    rig.sample(false);
    const { tag } = rig.board;
    for (let at = 0; at < SILENCE_MS + GRACE_MS; at += 5) {
      rig.cable.send(Uint8Array.of(1, 2, 3, 0));
      rig.board.tag = tag ^ 1;
      rig.board.say('sample');
      rig.board.tag = tag;
      await rig.timers.advance(5);
    }
    expect(rig.handler.of('down')[0]!.why.code).toBe('LINK_SILENT');
  });

  it('stays up when the silence was its own and the bytes were waiting', async () => {
    const rig = new VirtualLink();
    await rig.up();
    rig.sample(false);
    await rig.timers.advance(SILENCE_MS + GRACE_MS - 11);
    rig.board.say('sample');
    await rig.timers.advance(SILENCE_MS - 10);
    expect(rig.link.state).toBe('up');
  });

  it('goes down as soon as the port closes', async () => {
    const rig = new VirtualLink();
    await rig.up();
    rig.cable.unplug();
    expect(rig.link.state).toBe('down');
    expect(rig.handler.of('down').map((item) => item.why.code)).toEqual(['LINK_UNPLUGGED']);
    expect(rig.link.send('quiet', { outputs: 1 })).toBe(false);
  });

  it('goes down on a short write, tells the handler only afterwards, and sends nothing of it again', async () => {
    const rig = new VirtualLink();
    let port!: ShortWrites;
    rig.wrap = (inner) => {
      port = new ShortWrites(inner);
      return port;
    };
    await rig.up();
    port.shortNext = true;
    let downsDuringSend = -1;
    rig.handler.onSample = () => {
      rig.handler.onSample = () => {};
      expect(rig.link.send('quiet', { outputs: 3 })).toBe(false);
      expect(rig.link.send('quiet', { outputs: 3 })).toBe(false);
      downsDuringSend = rig.handler.of('down').length;
    };
    await rig.timers.advance(6);
    expect(downsDuringSend).toBe(0);
    expect(rig.handler.of('down').map((item) => item.why.code)).toEqual(['LINK_WRITE_FAILED']);
    await rig.timers.advance(200);
    expect(rig.link.state).toBe('up');
    expect(rig.board.of('quiet')).toEqual([]);
  });

  it('hands on nothing that was decoded after the link was lost', async () => {
    const rig = new VirtualLink();
    await rig.up();
    const bytes = Buffer.concat([rig.board.bytesOf('sample'), rig.board.bytesOf('edge')]);
    rig.handler.onSample = () => rig.cable.unplug();
    rig.cable.send(bytes);
    expect(rig.handler.of('edge')).toEqual([]);
  });

  it('shakes hands again on the same port when the watchdog has tripped', async () => {
    const rig = new VirtualLink();
    await rig.up();
    const before = rig.handler.of('up')[0]!.event;
    rig.board.answers = false;
    rig.board.watchdog();
    const story = rig.handler.heard.filter((item) => !['batch', 'sample'].includes(item.what));
    expect(story.slice(-2).map((item) => item.what)).toEqual(['fault', 'down']);
    expect(rig.handler.of('down')[0]!.why.code).toBe('LINK_TAG_ENDED');
    expect(rig.link.state).toBe('connecting');
    expect(rig.link.send('quiet', { outputs: 1 })).toBe(false);
    rig.board.answers = true;
    await rig.timers.advance(IDENTIFY_MS + 1);
    const after = rig.handler.of('up')[1]!.event;
    expect(after).toMatchObject({ sameBoard: true, sameBoot: true, previous: before.identity });
    expect(after.tag).not.toBe(before.tag);
    expect(rig.attempts.length).toBe(1);
  });

  it('shakes hands again when a frame without a tag is all that tells of the end', async () => {
    const rig = new VirtualLink();
    await rig.up();
    rig.board.reset();
    rig.board.say('fault', { fault: FAULT.brownOut });
    await rig.timers.advance(1);
    expect(rig.handler.of('fault').map((item) => item.message.fault)).toEqual([FAULT.brownOut]);
    expect(rig.handler.of('down').map((item) => item.why.code)).toEqual(['LINK_TAG_ENDED']);
    expect(rig.link.state).toBe('up');
  });

  it('tells a board that was reset from one that only lost its connection', async () => {
    const rig = new VirtualLink();
    await rig.up();
    rig.board.reset();
    rig.board.say('identity', { ...rig.board.identity, nonce: 0 });
    await rig.timers.advance(1);
    expect(rig.handler.of('down').map((item) => item.why.code)).toEqual(['LINK_TAG_ENDED']);
    const { event } = rig.handler.of('up')[1]!;
    expect(event).toMatchObject({ sameBoard: true, sameBoot: false });
    expect(event.previous!.bootId).not.toBe(event.identity.bootId);
  });

  it('reports another board than before as such, even where its boot number is the same', async () => {
    const rig = new VirtualLink();
    await rig.up();
    rig.cable.unplug();
    rig.board.identity.boardId = 78;
    await rig.timers.advance(150);
    expect(rig.handler.of('up')[1]!.event).toMatchObject({ sameBoard: false, sameBoot: false });
  });

  it('knows the board of a resumed session', async () => {
    const before = new VirtualLink();
    const previous = { ...before.board.identity };
    const rig = new VirtualLink();
    rig.link.remember(previous);
    await rig.up();
    expect(rig.handler.of('up')[0]!.event).toMatchObject({ sameBoot: true, previous });
  });
});

describe('connecting again', () => {
  it('waits 100 ms, then twice as long each time up to 2 s, and anew after a success', async () => {
    const rig = new VirtualLink();
    rig.refuse = new LapwingError('linkPortMissing', 'not there');
    rig.link.start();
    await rig.timers.advance(9_000);
    const waits = rig.attempts.slice(1).map((at, n) => at - rig.attempts[n]!);
    expect(waits).toEqual([100, 200, 400, 800, 1_600, 2_000, 2_000]);
    expect(rig.handler.of('waiting').map((item) => item.retryMs)).toEqual([
      100, 200, 400, 800, 1_600, 2_000, 2_000, 2_000,
    ]);
    expect(rig.link.trouble!.code).toBe('LINK_PORT_MISSING');
    rig.refuse = undefined;
    await rig.timers.advance(2_000);
    expect(rig.link.state).toBe('up');
    expect(rig.link.trouble).toBeUndefined();
    const before = rig.attempts.length;
    rig.cable.unplug();
    const lostAt = rig.timers.now();
    await rig.timers.advance(150);
    expect(rig.attempts.slice(before)).toEqual([lostAt + 100]);
  });

  it('opens a fresh port each time, and lets go of the old one first', async () => {
    const rig = new VirtualLink();
    const log: string[] = [];
    let serial = 0;
    rig.wrap = (port) => {
      const number = ++serial;
      log.push(`open ${number}`);
      return {
        name: port.name,
        transport: port.transport,
        listen: (listener) => port.listen(listener),
        write: (bytes) => port.write(bytes),
        close: async () => {
          await port.close();
          await new Promise<void>((resolve) => rig.timers.set(500, () => resolve()));
          log.push(`closed ${number}`);
        },
      };
    };
    await rig.up();
    rig.sample(false);
    await rig.timers.advance(2_000);
    expect(log.slice(0, 3)).toEqual(['open 1', 'closed 1', 'open 2']);
  });

  it('never acts on what came through the old port', async () => {
    const rig = new VirtualLink();
    await rig.up();
    const old = rig.board.write;
    rig.sample(false);
    const half = rig.board.bytesOf('edge', { input: 1 });
    rig.cable.send(half.subarray(0, 5));
    rig.cable.unplug();
    await rig.timers.advance(150);
    expect(rig.link.state).toBe('up');
    old(half.subarray(5));
    rig.cable.send(half.subarray(5));
    rig.board.say('edge', { input: 2 });
    expect(rig.handler.of('edge').map((item) => item.message.input)).toEqual([2]);
  });

  it('is silent for good once closed, also while a port is being opened', async () => {
    const rig = new VirtualLink();
    await rig.up();
    let closed = false;
    rig.cable.onClosed = () => {
      closed = true;
    };
    await rig.link.close();
    const heard = rig.handler.heard.length;
    await rig.timers.advance(5_000);
    expect(closed).toBe(true);
    expect(rig.handler.heard.length).toBe(heard);
    expect(rig.attempts.length).toBe(1);

    const opening = new VirtualLink();
    let opened = 0;
    opening.wrap = (port) => {
      opened++;
      return { ...port, close: async () => void opened-- };
    };
    opening.link.start();
    await opening.link.close();
    await opening.timers.advance(5_000);
    expect(opening.attempts.length).toBeLessThanOrEqual(1);
    expect(opened).toBe(0);
    expect(opening.handler.heard).toEqual([]);
  });
});

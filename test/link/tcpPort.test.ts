import net from 'node:net';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { BoardLink } from '../../server/link/boardLink.js';
import { parseAddress, portOpener } from '../../server/link/resolvePort.js';
import { blank } from '../../server/wire/codec.js';
import { Recorder } from './recorder.js';
import { ScriptedBoard } from './scriptedBoard.js';
import { until } from './until.js';

describe('a link over TCP', () => {
  const board = new ScriptedBoard();
  let sockets: net.Socket[] = [];
  let server: net.Server;
  let port: number;
  let handler: Recorder;
  let link: BoardLink;

  async function listen(at: number): Promise<void> {
    server = net.createServer((socket) => {
      sockets.push(socket);
      socket.setNoDelay(true);
      socket.on('error', () => {});
      socket.on('data', (bytes) => board.receive(bytes));
      board.write = (bytes) => void socket.write(bytes.slice());
    });
    await new Promise<void>((resolve) => server.listen(at, '127.0.0.1', resolve));
    port = (server.address() as net.AddressInfo).port;
  }
  async function stop(): Promise<void> {
    for (const socket of sockets) socket.destroy();
    sockets = [];
    await new Promise((resolve) => server.close(resolve));
  }

  beforeEach(async () => {
    await listen(0);
    handler = new Recorder();
    const openPort = portOpener(`tcp://127.0.0.1:${port}`, { baudRate: 500_000 });
    link = new BoardLink({ openPort, handler });
  });
  afterEach(async () => {
    await link.close();
    await stop();
  });

  it('carries messages both ways, and says that its transport is TCP', async () => {
    link.start();
    await until('up', () => link.state === 'up');
    expect(handler.of('up')[0]!.event).toMatchObject({
      transport: 'tcp',
      port: `tcp://127.0.0.1:${port}`,
    });
    for (let n = 0; n < 100; n++) {
      board.say('clock', { boardUs: n * 1_000_000, wraps: n });
      expect(link.send('beat', { finishedUs: n, wanted: 0 })).toBe(true);
    }
    await until('all', () => handler.of('clock').length === 100 && board.of('beat').length === 100);
    expect(handler.of('gap')).toEqual([]);
  });

  it('goes down when the other side goes away, is refused, and comes back', async () => {
    link.start();
    await until('up', () => link.state === 'up');
    await stop();
    await until('down', () => handler.of('down').length === 1);
    expect(handler.of('down')[0]!.why.code).toBe('LINK_UNPLUGGED');
    await until('refused', () => handler.of('waiting').length > 0);
    expect(handler.of('waiting')[0]!.why.code).toBe('LINK_TCP_REFUSED');
    expect(handler.of('waiting')[0]!.why.message).toBe(
      `Nothing listens at tcp://127.0.0.1:${port}.`,
    );
    await listen(port);
    await until('up again', () => handler.of('up').length === 2);
  });

  it('loses the link rather than wait when the other side takes nothing', async () => {
    link.start();
    await until('up', () => link.state === 'up');
    for (const socket of sockets) socket.pause();
    let sent = 0;
    // Some megabytes fit into the kernel's buffers; a frame more must not be kept for later.
    while (link.send('pulse', { ...blank('pulse'), id: sent })) sent++;
    await until('down', () => handler.of('down').length === 1);
    expect(handler.of('down')[0]!.why.code).toBe('LINK_WRITE_FAILED');
  });
});

describe('the address of a port', () => {
  it('is a path, or tcp:// with a host and a port', () => {
    expect(parseAddress(' /dev/ttyACM0 ')).toEqual({ kind: 'serial', path: '/dev/ttyACM0' });
    expect(parseAddress('COM3')).toEqual({ kind: 'serial', path: 'COM3' });
    expect(parseAddress('tcp://rig-2.local:7001')).toEqual({
      kind: 'tcp',
      host: 'rig-2.local',
      port: 7001,
    });
    expect(parseAddress('tcp://[::1]:7001')).toEqual({ kind: 'tcp', host: '::1', port: 7001 });
  });

  it.each([
    '',
    'tcp://',
    'tcp://host',
    'tcp://host:0',
    'tcp://host:70000',
    'tcp://a:b:1',
    'udp://a:1',
  ])('is refused as %j', (address) => {
    expect(() => parseAddress(address)).toThrowError(
      expect.objectContaining({ code: 'LINK_BAD_ADDRESS' }),
    );
  });
});

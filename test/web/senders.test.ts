import type { IncomingMessage } from 'node:http';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { callerOf, plainAddress, Senders } from '../../server/web/senders.js';
import { cookieOf, startGuarded } from './access/signedIn.js';

function from(remoteAddress: string, headers: Record<string, string> = {}): IncomingMessage {
  return { socket: { remoteAddress }, headers } as unknown as IncomingMessage;
}

describe('who asks', () => {
  test('is the other end of the connection, whatever the request says, without a proxy', () => {
    const senders = new Senders();
    const forged = { 'x-forwarded-for': '127.0.0.1', 'x-forwarded-proto': 'https' };
    expect(senders.of(from('10.0.0.7', forged))).toEqual({ address: '10.0.0.7', secure: false });
    expect(senders.of(from('::ffff:10.0.0.7')).address).toBe('10.0.0.7');
  });

  test('is what a named proxy says: the last hop that is no proxy of ours', () => {
    const senders = new Senders(['10.0.0.2', '192.168.0.0/16', 'fd00::/8']);
    const of = (address: string, way: string) =>
      senders.of(from(address, { 'x-forwarded-for': way, 'x-forwarded-proto': 'https' }));
    expect(of('10.0.0.2', '203.0.113.9')).toEqual({ address: '203.0.113.9', secure: true });
    // What a caller wrote in front itself is not believed.
    expect(of('10.0.0.2', '127.0.0.1, 203.0.113.9').address).toBe('203.0.113.9');
    expect(of('10.0.0.2', '203.0.113.9, 192.168.3.4').address).toBe('203.0.113.9');
    expect(of('fd00::1', '2001:db8::1').address).toBe('2001:db8::1');
    expect(of('10.0.0.2', 'rubbish').address).toBe('10.0.0.2');
    expect(of('10.0.0.3', '203.0.113.9')).toEqual({ address: '10.0.0.3', secure: false });
  });

  test('never takes a chain of forged hops for anything but the last that our proxy wrote', () => {
    const senders = new Senders(['10.0.0.2']);
    fc.assert(
      fc.property(
        fc.array(fc.oneof(fc.ipV4(), fc.ipV6(), fc.string())),
        fc.ipV4(),
        (forged, real) => {
          fc.pre(real !== '10.0.0.2');
          const way = [...forged, real].join(', ');
          expect(senders.of(from('10.0.0.2', { 'x-forwarded-for': way })).address).toBe(real);
        },
      ),
      { seed: 6 },
    );
  });

  test.each(['', 'proxy.example', '10.0.0.0/0', '10.0.0.0/33', '10.0.0', '::1/129', '10.0.0.2/x'])(
    'a proxy named %j is refused at the start',
    (proxy) => {
      expect(() => new Senders([proxy])).toThrow(expect.objectContaining({ code: 'WEB_LISTEN' }));
    },
  );

  test('counts for limits as one subscriber, however many IPv6 addresses that one has', () => {
    expect(callerOf('10.0.0.7')).toBe('10.0.0.7');
    expect(callerOf('2001:db8:1:2:3:4:5:6')).toBe(callerOf('2001:db8:1:2::9'));
    expect(callerOf('2001:db8:1:2::9')).not.toBe(callerOf('2001:db8:1:3::9'));
    expect(callerOf('::1')).toBe('0:0:0:0::/64');
    expect(plainAddress('fe80::1%eth0')).toBe('fe80::1');
    fc.assert(
      fc.property(fc.ipV6(), (address) => {
        const plain = plainAddress(address);
        // The address parser of the platform agrees which four groups come first.
        const whole = new URL(`http://[${plain}]`).hostname;
        expect(callerOf(whole.slice(1, -1))).toBe(callerOf(plain));
      }),
      { seed: 6 },
    );
  });
});

describe('behind a reverse proxy', () => {
  const forwarded = {
    host: 'rig1.example',
    origin: 'https://rig1.example',
    'x-forwarded-for': '203.0.113.9',
    'x-forwarded-proto': 'https',
  };
  const options = { proxies: ['127.0.0.1'], allowedHosts: ['rig1.example'] };

  test('the page works under its own name, with a cookie for TLS, and acts say where from', async () => {
    const rig = await startGuarded(options);
    const body = { name: 'anna', secret: rig.secrets.get('anna')! };
    const answer = await rig.ask('POST', '/api/sign-in', forwarded, body);
    expect(answer.status).toBe(200);
    expect(answer.headers['strict-transport-security']).toBeDefined();
    expect(String(answer.headers['set-cookie'])).toMatch(/^__Host-.*Secure$/);
    const browser = { ...forwarded, cookie: cookieOf(answer) };
    await rig.ask('POST', '/api/quiet', browser, {});
    expect(rig.loop.heard.find((one) => one.say === 'quiet')).toMatchObject({
      who: 'anna',
      from: 'dashboard 203.0.113.9',
    });
    // The same cookie over a way that is not encrypted is none.
    const plain = { ...browser, 'x-forwarded-proto': 'http' };
    expect((await rig.ask('GET', '/api/me', plain)).status).toBe(401);
  });

  test('each caller has a limit of its own, not the proxy for all', async () => {
    const { ask } = await startGuarded({ ...options, requestsPerS: 5 });
    const status = async (address: string) =>
      (await ask('GET', '/healthz', { ...forwarded, 'x-forwarded-for': address })).status;
    let flood = 0;
    for (let n = 0; n < 60; n++) flood = await status('203.0.113.9');
    expect(flood).toBe(429);
    expect(await status('203.0.113.10')).toBe(200);
  });

  test('names that were not given at the start are refused, forwarded or not', async () => {
    const { ask } = await startGuarded(options);
    const evil = { ...forwarded, host: 'evil.example', origin: 'https://evil.example' };
    expect((await ask('GET', '/api/me', evil)).status).toBe(421);
    const smuggled = { ...evil, 'x-forwarded-host': 'rig1.example' };
    expect((await ask('GET', '/api/me', smuggled)).status).toBe(421);
  });
});

import { resolve } from 'node:path';
import { Command } from 'commander';
import { LapwingError } from '../errors/codes.js';
import { readRig } from '../session/rig/readRig.js';
import { accessFiles, People } from '../web/access/people.js';
import { isLoopback } from '../web/gates.js';
import { type Listening, pageAddresses, parseListen } from '../web/listening.js';
import { Senders } from '../web/senders.js';
import { certificateWarning, readTls } from '../web/tls.js';
import { portOption, rigOption, wholeNumber } from './arguments.js';
import { runLive } from './live.js';
import { secretLines, secretsNote } from './people.js';

interface ServeFlags {
  rig: string;
  port: number;
  rules?: string;
  records?: string;
  listen?: string;
  name?: string[];
  tlsCert?: string;
  tlsKey?: string;
  behindProxy?: string[];
  signIn?: boolean;
  viewers: number;
}

const several = (value: string, before: string[] = []) => [...before, value];

/** `lapwing serve --rig RIG`: the page, from which sessions are begun and ended. */
export function serveCommand(): Command {
  return new Command('serve')
    .description('serve the page of a rig; sessions are begun and ended there')
    .addOption(rigOption())
    .addOption(portOption())
    .option('--rules <folder>', "instead of the rig file's rules folder")
    .option('--records <folder>', "instead of the rig file's record folder")
    .option(
      '--listen <address:port>',
      'open the page to the network: 0.0.0.0:8711; people sign in, and the first time their secrets are printed',
    )
    .option('--viewers <n>', 'viewers made that first time', wholeNumber(0, 50), 1)
    .option('--name <host>', 'a host name that the page is opened under; repeatable', several)
    .option('--tls-cert <file>', 'serve over TLS: the certificate with its chain, PEM')
    .option('--tls-key <file>', 'and its key, PEM')
    .option(
      '--behind-proxy <address>',
      'believe what a reverse proxy at this address says of callers; repeatable',
      several,
    )
    .option('--sign-in', 'people sign in on this machine too')
    .action(async (flags: ServeFlags) => {
      const rig = readRig(flags.rig);
      const web = listeningOf(flags);
      if (web.signIn) await firstPeople(rig.name, flags.rig, flags.viewers);
      cautions(web);
      await runLive({
        rig,
        rigPath: flags.rig,
        exitWhenEnded: false,
        web,
        hello: (url) =>
          pageAddresses(web, Number(new URL(url).port))
            .map((address) => `dashboard: ${address}`)
            .join('\n'),
        ...(flags.records === undefined ? {} : { recordFolder: resolve(flags.records) }),
        ...(flags.rules === undefined ? {} : { rulesFolder: resolve(flags.rules) }),
      });
    });
}

/** @throws LapwingError WEB_LISTEN, WEB_TLS: before any process starts */
function listeningOf(flags: ServeFlags): Listening {
  const at = flags.listen === undefined ? undefined : parseListen(flags.listen);
  const { host, port } = at ?? { host: '127.0.0.1', port: flags.port };
  const { name: names = [], behindProxy: proxies = [], tlsCert, tlsKey } = flags;
  // Wrong addresses are told now.
  new Senders(proxies);
  const signIn = flags.signIn === true || !isLoopback(host) || proxies.length > 0;
  const base = { host, port, signIn, names, proxies };
  if (tlsCert === undefined && tlsKey === undefined) return base;
  if (tlsCert === undefined || tlsKey === undefined) {
    throw new LapwingError('webTls', '`--tls-cert` and `--tls-key` go together.');
  }
  readTls(tlsCert, tlsKey);
  return { ...base, tls: { cert: resolve(tlsCert), key: resolve(tlsKey) } };
}

/** The first time: an operator and viewers. Their secrets are printed here and kept nowhere. */
async function firstPeople(rigName: string, rigPath: string, viewers: number): Promise<void> {
  const people = new People(accessFiles(rigName).peopleFile);
  if (people.all.length > 0) return;
  const made = [{ name: 'operator', secret: await people.add('operator', 'operator') }];
  for (let n = 1; n <= viewers; n++) {
    const name = viewers === 1 ? 'viewer' : `viewer-${n}`;
    made.push({ name, secret: await people.add(name, 'viewer') });
  }
  console.log(`May sign in from now on:\n${secretLines(made)}\n${secretsNote(rigPath)}`);
}

function cautions(web: Listening): void {
  const { host, tls, proxies = [] } = web;
  const warning = tls && certificateWarning(readTls(tls.cert, tls.key), new Date());
  if (warning) console.error(`Warning: ${warning}`);
  if (isLoopback(host) || tls || proxies.length > 0) return;
  console.error(
    'Warning: without TLS, whoever can listen on this network can read the secrets and steer the rig.\n' +
      '  Give --tls-cert and --tls-key, put it behind a proxy that has them, or use an SSH tunnel.',
  );
}

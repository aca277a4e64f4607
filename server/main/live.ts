import { resolve } from 'node:path';
import { LocalClient } from '../loop/localClient.js';
import type { BeginOptions } from '../loop/options.js';
import { rigAddress } from '../loop/rigLock.js';
import type { Rig } from '../session/rig/rig.js';
import type { Listening } from '../web/listening.js';
import { Launcher } from './launcher.js';
import { StatusLine } from './statusLine.js';
import { tellPortWarnings } from './tellWarnings.js';

export interface LiveOptions {
  readonly rig: Rig;
  readonly rigPath: string;
  readonly begin?: BeginOptions;
  readonly resume?: boolean;
  readonly web?: Listening;
  readonly recordFolder?: string;
  readonly rulesFolder?: string;
  readonly animalsFolder?: string;
  readonly exitWhenEnded: boolean;
  readonly simulatedRig?: readonly string[];
  /** Printed once the page can be opened. */
  readonly hello?: (url: string) => string;
}

/**
 * Runs a rig until its session has ended or Ctrl-C: the first ends the session in order, a second
 * at once.
 */
export async function runLive(options: LiveOptions): Promise<void> {
  const { rig } = options;
  tellPortWarnings(rig.port);
  const status = new StatusLine(process.stdout);
  const launcher = new Launcher(
    {
      rig,
      loop: {
        rigPath: resolve(options.rigPath),
        exitWhenEnded: options.exitWhenEnded,
        ...(options.begin === undefined ? {} : { begin: options.begin }),
        ...(options.resume === undefined ? {} : { resume: options.resume }),
        ...(options.recordFolder === undefined ? {} : { recordFolder: options.recordFolder }),
        ...(options.rulesFolder === undefined ? {} : { rulesFolder: options.rulesFolder }),
        ...(options.animalsFolder === undefined ? {} : { animalsFolder: options.animalsFolder }),
      },
      ...(options.web === undefined ? {} : { web: options.web }),
      ...(options.simulatedRig === undefined ? {} : { simulatedRig: options.simulatedRig }),
    },
    {
      ready: () => client.start(),
      webReady: (url) => status.say(options.hello?.(url) ?? `dashboard: ${url}`),
      restarted: (what, why) => status.say(`the ${what} process ${why}; started again`),
      notice: (text) => status.say(text),
      sessionEnded: (folder, reason) => status.say(`session ended: ${reason}\nrecord: ${folder}`),
    },
  );
  const { socketPath, tokenFile } = rigAddress(rig.name);
  const client = new LocalClient({
    ...{ socketPath, tokenFile, client: 'status line' },
    callbacks: {
      state: (state) => status.show(state),
      events: (events) => {
        for (const { event } of events) status.event(event);
      },
    },
  });
  client.watch(5);
  const stopListening = endOnSignals(launcher, client, options.exitWhenEnded, status);
  try {
    await launcher.start();
    await launcher.finished;
  } finally {
    stopListening();
    client.close();
    launcher.stop();
    status.close();
  }
}

/** The first signal ends the session and then the program; the second ends both at once. */
function endOnSignals(
  launcher: Launcher,
  client: LocalClient,
  exitWhenEnded: boolean,
  status: StatusLine,
): () => void {
  let signals = 0;
  const onSignal = () => {
    signals++;
    if (signals > 1) {
      status.say('ending at once');
      if (signals === 2) launcher.stop();
      else launcher.kill();
      return;
    }
    status.say('ending the session; once more to end at once');
    client.end('ended from the keyboard').then(
      () => {
        // With a session to wait for, the loop leaves by itself when the record is closed.
        if (!exitWhenEnded) launcher.stop();
      },
      () => launcher.stop(),
    );
  };
  process.on('SIGINT', onSignal);
  process.on('SIGTERM', onSignal);
  return () => {
    process.off('SIGINT', onSignal);
    process.off('SIGTERM', onSignal);
  };
}

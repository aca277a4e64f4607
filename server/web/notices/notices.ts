/**
 * Alarms pushed out to an HTTP address, for whoever is in another room. Told from the alarms that
 * every page shows, so that they agree; that the loop itself is away is said from here.
 */
import type { FastifyBaseLogger } from 'fastify';
import type { AlarmView } from '../../loop/alarms/alarms.js';
import type { Setup, Snapshot } from '../../loop/protocol.js';
import type { AlarmLevel } from '../../session/inputs.js';
import type { Rig, RigNotify } from '../../session/rig/rig.js';
import { bodyOf, type Notice, type Scene, sceneOf } from './body.js';
import { Sender, type SenderTimes } from './sender.js';

/** Goes before the rig file's address, which is copied into every session's folder. */
export const NOTIFY_URL = 'LAPWING_NOTIFY_URL';

/** Where alarms of a rig go, if anywhere: the address from the environment, or the rig file's. */
export function notifyOf({ notify }: Rig): RigNotify | undefined {
  const url = process.env[NOTIFY_URL];
  if (!url) return notify;
  return { ...DEFAULTS, ...notify, url };
}

const DEFAULTS: Omit<RigNotify, 'url'> = {
  ...{ from: 'warn', body: undefined, contentType: 'application/json', mostPerMin: 6 },
};

/** A web process that was itself started first gives the loop so long. */
const AWAY_MS = 3_000;

const GRAVITY: Record<AlarmLevel, number> = { note: 0, warn: 1, bad: 2 };

export class Notices {
  readonly #sender: Sender;
  readonly #from: AlarmLevel;
  #on = new Map<string, Pick<AlarmView, 'level' | 'text' | 'remedy'>>();
  #scene: Scene = sceneOf(undefined, undefined);
  #away: NodeJS.Timeout | undefined;
  #awayTold = false;

  constructor(
    settings: RigNotify,
    log: FastifyBaseLogger,
    times?: SenderTimes,
    private readonly awayMs = AWAY_MS,
  ) {
    const { contentType, mostPerMin } = settings;
    this.#from = settings.from;
    const { url } = settings;
    const body = (notices: readonly Notice[]) => bodyOf(notices, this.#scene, settings);
    this.#sender = new Sender({ url, contentType, most: mostPerMin, body }, log, times);
  }

  /** Every state of the loop. */
  see(state: Snapshot, setup: Setup | undefined): void {
    this.#back();
    this.#scene = sceneOf(setup, state);
    const now = new Map(state.alarms.map((one) => [one.alarm as string, one]));
    for (const [alarm, one] of now) {
      if (!this.#on.has(alarm)) this.#tell(alarm, 'raised', one);
    }
    for (const [alarm, one] of this.#on) {
      if (!now.has(alarm as AlarmView['alarm'])) this.#tell(alarm, 'cleared', one);
    }
    this.#on = now;
  }

  /** The loop cannot be reached; told when it stays so. */
  loopAway(text: string, remedy: string): void {
    if (this.#away !== undefined || this.#awayTold) return;
    this.#away = setTimeout(() => {
      this.#away = undefined;
      this.#awayTold = true;
      this.#tell('loop', 'raised', { level: 'bad', text: `The loop is away: ${text}`, remedy });
    }, this.awayMs);
    this.#away.unref();
  }

  close(): void {
    clearTimeout(this.#away);
    this.#sender.close();
  }

  #back(): void {
    clearTimeout(this.#away);
    this.#away = undefined;
    if (!this.#awayTold) return;
    this.#awayTold = false;
    this.#tell('loop', 'cleared', { level: 'bad', text: 'The loop is away', remedy: '' });
  }

  #tell(
    alarm: string,
    state: Notice['state'],
    { level, text, remedy }: Pick<AlarmView, 'level' | 'text' | 'remedy'>,
  ): void {
    if (GRAVITY[level] < GRAVITY[this.#from]) return;
    this.#sender.add({ alarm, level, state, text, remedy, at: new Date().toISOString() });
  }
}

/** The web process's side that faces the loop: what it says goes into the mirror and to the pages. */
import type { FastifyBaseLogger } from 'fastify';
import { LocalClient, type LocalClientOptions, quietOnce } from '../loop/localClient.js';
import type { AskedBy, Setup } from '../loop/protocol.js';
import type { Actor, OperatorAct } from '../session/inputs.js';
import type { Mirror } from './mirror.js';
import type { Notices } from './notices/notices.js';
import type { Stream } from './stream.js';

export interface LoopPlace {
  /** The loop's socket and its token, given or in a file. */
  readonly socketPath: string;
  readonly token?: string;
  readonly tokenFile?: string;
  readonly loopTimeoutMs?: number;
}

const QUIET_TIMEOUT_MS = 2000;

export class LoopSide {
  readonly client: LocalClient;
  private readonly place: Omit<LocalClientOptions, 'client'>;

  /** @param sessionBegan called with a setup whose session was not there before */
  constructor(
    { socketPath, token, tokenFile, loopTimeoutMs }: LoopPlace,
    private readonly mirror: Mirror,
    private readonly stream: Stream,
    log: FastifyBaseLogger,
    private readonly sessionBegan: () => void,
    notices?: Notices,
  ) {
    this.place = {
      socketPath,
      ...(token === undefined ? {} : { token }),
      ...(tokenFile === undefined ? {} : { tokenFile }),
      ...(loopTimeoutMs === undefined ? {} : { requestTimeoutMs: loopTimeoutMs }),
    };
    this.client = new LocalClient({
      ...this.place,
      client: 'web',
      fromOldest: true,
      callbacks: {
        up: (hello) => {
          log.info({ rig: hello.rig }, 'connected to the loop');
          mirror.beginLife();
          stream.startOver();
        },
        down: (why) => {
          log.warn({ code: why.code }, `the loop is away: ${why.message}`);
          mirror.loseLoop(why.message, why.remedy);
          stream.announce(mirror.loop);
          notices?.loopAway(why.message, why.remedy);
        },
        setup: (setup) => this.setUp(setup),
        state: (state) => {
          mirror.takeState(state);
          notices?.see(state, mirror.setup);
          stream.changed();
        },
        events: (events) => {
          mirror.takeEvents(events);
          stream.changed();
        },
      },
    });
  }

  start(): void {
    this.client.watch(20);
    this.client.start();
  }

  /** Over the standing connection; and, if that fails in any way, over one of its own. */
  async stopEverything(by: AskedBy): Promise<void> {
    try {
      await this.client.quiet(by);
    } catch {
      await quietOnce({ requestTimeoutMs: QUIET_TIMEOUT_MS, ...this.place }, by);
    }
  }

  /** Records an act that decides nothing, if there is a record. */
  async record(act: OperatorAct, by: Actor): Promise<void> {
    if (this.mirror.setup?.session) await this.client.act(act, by.who, by.from);
  }

  private setUp(setup: Setup): void {
    const before = this.mirror.setup?.session?.folder;
    this.mirror.setup = setup;
    this.stream.announce({ tell: 'setup', setup });
    if (setup.session && setup.session.folder !== before) this.sessionBegan();
  }
}

import { setTimeout as delay } from 'node:timers/promises';
import { BoardLink } from '../link/boardLink.js';
import type { LinkHandler, LinkUp } from '../link/linkHandler.js';
import { portOpener } from '../link/resolvePort.js';
import type { RareInput } from '../session/inputs.js';
import type { Rig } from '../session/rig/rig.js';
import type { SendCommand } from '../session/runner.js';
import { CAPABILITY, type Identity } from '../wire/messages.js';

const HANDSHAKE_MS = 3_000;
/** Ids of a loop that was killed, which the board may know and has not told. */
const ID_MARGIN = 1_000;

/** The rig's board over all sessions: its port, who answered on it last, the ids that it knows. */
export class Board {
  readonly link: BoardLink;
  #lastUp: LinkUp | undefined;
  /** The highest id that the board has been seen to know. */
  #highestId = 0;

  constructor(rig: Rig, port: string | undefined, handler: LinkHandler) {
    const { baudRate, boardId } = rig;
    this.link = new BoardLink({
      openPort: portOpener(port ?? rig.port, { baudRate }),
      handler,
      ...(boardId === undefined ? {} : { boardId }),
    });
  }

  /** Whether any board has answered since the loop was started. */
  get hasAnswered(): boolean {
    return this.#lastUp !== undefined;
  }

  /** A session's first id, which no board can have seen. */
  get nextFirstId(): number {
    return this.#highestId + ID_MARGIN;
  }

  readonly send: SendCommand = (name, message) => {
    this.link.send(name, message);
    if ('id' in message) this.saw(message.id);
  };

  /** Every output goes idle, whatever a session thinks of it. */
  quietAll(): void {
    this.link.send('quiet', { outputs: 0xffff });
  }

  answered(event: LinkUp): void {
    this.#lastUp = event;
  }

  /** The board knows this id. */
  saw(id: number): void {
    this.#highestId = Math.max(this.#highestId, id);
  }

  /** What a new runner is told of the board that answers; undefined while none does. */
  linkUp(): RareInput | undefined {
    if (this.#lastUp === undefined || this.link.state !== 'up') return undefined;
    return linkUpInput({ ...this.#lastUp, sameBoot: false });
  }

  /** A board that lost us meanwhile is given the time of a handshake. */
  async untilUp(): Promise<void> {
    const untilMs = performance.now() + HANDSHAKE_MS;
    do await frames();
    while (this.link.state !== 'up' && performance.now() < untilMs);
  }
}

export function linkUpInput({ identity, tag, sameBoot, transport }: LinkUp): RareInput {
  return {
    kind: 'link up',
    identity,
    tag,
    sameBoot,
    overNetwork: transport === 'tcp' && !isSimulated(identity),
  };
}

export function isSimulated({ capabilities }: Identity): boolean {
  return (capabilities & CAPABILITY.simulated) !== 0;
}

/** Lets everything that has come from the board in the meantime be taken. */
export function frames(): Promise<void> {
  return delay(1);
}

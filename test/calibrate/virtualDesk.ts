import { SimulatedRig, type SimulatedRigOptions } from '../../hardware-sim/simulatedRig.js';
import type {
  Answers,
  Desk,
  GuideBench,
  GuideView,
  Hands,
  Question,
} from '../../server/calibrate/guides/guide.js';
import { Bench } from '../../server/loop/bench.js';
import type { BenchItem, Tried, TryRequest } from '../../server/loop/protocol.js';
import type { RareInput } from '../../server/session/inputs.js';
import { idleRules } from '../../server/session/prepare.js';
import type { BoardListener } from '../../server/session/rehearsal.js';
import type { Rig } from '../../server/session/rig/rig.js';
import { type SendCommand, SessionRunner } from '../../server/session/runner.js';
import {
  CAPABILITY,
  type HostMessageName,
  type Identity,
  type MessageOf,
  PROTOCOL_VERSION,
} from '../../server/wire/messages.js';

const TAG = 1;
const STEP_US = 1_000;
const MOST_US = 30 * 60_000_000;

/**
 * A guide's desk in virtual time: the loop's own bench and session core, and the simulated rig on
 * its virtual clock. Questions are answered by `given`, else with what is offered.
 */
export class VirtualDesk implements Desk {
  readonly bench: GuideBench;
  readonly hands: Hands;
  readonly by = 'a test';
  readonly simulated: SimulatedRig;
  readonly views: GuideView[] = [];
  readonly asked: Question[] = [];
  /** Called with every question, before it is answered. */
  onAsk: (question: Question) => void = () => {};
  /** Nothing reaches the board any more. */
  cut = false;
  readonly #bench: Bench;
  readonly #listeners = new Set<(item: BenchItem) => void>();
  readonly #outbox: { name: HostMessageName; message: MessageOf[HostMessageName] }[] = [];
  readonly #send: SendCommand;
  #runner!: SessionRunner;
  #identity: Identity | undefined;
  #told = 0;
  #atUs = 0;

  constructor(
    readonly rig: Rig,
    options: SimulatedRigOptions,
    readonly given: Answers = {},
  ) {
    this.simulated = new SimulatedRig({ seed: 3, trained: true, ...options });
    this.#send = (name, message) => void this.#outbox.push({ name, message });
    this.#bench = new Bench({
      rig: () => rig,
      board: () => this.#identity,
      send: this.#send,
      begin: (runner) => {
        this.#runner = runner;
        this.#linkUp();
        runner.take({ kind: 'begin', firstId: 1_000 });
      },
      ended: () => this.#goIdle(),
    });
    this.#bench.watch(true, false);
    this.#connect();
    this.#goIdle();
    const bench = this.#bench;
    this.bench = {
      get now() {
        return bench.now;
      },
      board: { model: 'simulated', boardId: 0, firmware: 1, simulated: true },
      listen: (take) => {
        this.#listeners.add(take);
        return () => this.#listeners.delete(take);
      },
      attempt: (request) => this.#attempt(request),
      timeFrames: async (on) => this.#bench.watch(true, on),
    };
    this.hands = (command) => this.#do(command);
    this.#advance(100);
  }

  now(): Date {
    return new Date('2026-11-30T10:00:00Z');
  }

  show(view: GuideView): void {
    this.views.push(view);
  }

  async ask(question: Question): Promise<Answers> {
    this.asked.push(question);
    this.onAsk(question);
    const answers: Record<string, number | string> = {};
    for (const field of question.fields) {
      const value = this.given[field.name] ?? field.value;
      if (value === undefined) throw new Error(`no answer to ${field.name}`);
      answers[field.name] = value;
    }
    return answers;
  }

  async pause(ms: number): Promise<void> {
    this.#advance(ms);
  }

  async #attempt(request: TryRequest): Promise<Tried> {
    let over = false;
    const tried = this.#bench.attempt(request).finally(() => {
      over = true;
    });
    // Whoever awaits it hears of it.
    tried.catch(() => {});
    for (let ms = 0; ms < 5_000 && !over; ms++) {
      this.#advance(1);
      await Promise.resolve();
      await Promise.resolve();
    }
    return tried;
  }

  async #do(command: string): Promise<Readonly<Record<string, unknown>>> {
    const [name, value = '', speed = ''] = command.split(' ');
    const { simulated } = this;
    if (name === 'turn') {
      simulated.turn(Number(value), Number(speed));
      // Answered when the hand is there, as the simulated rig's own process does.
      while (simulated.turning) {
        await Promise.resolve();
        this.#advance(20);
      }
    }
    if (name === 'speed') simulated.forcedCmPerS = value === 'off' ? undefined : Number(value);
    if (name === 'touch') simulated.animal.licking.begin(simulated.nowUs, Number(value));
    if (name === 'tap') simulated.tap(Number(value));
    if (name === 'vial') {
      simulated.vial = value === 'on';
      simulated.vialMg = 0;
    }
    return { mg: simulated.vialMg };
  }

  #advance(ms: number): void {
    // A guide that waits for what never comes would wait for ever.
    if (this.#atUs > MOST_US) throw new Error('half an hour has passed and it still waits');
    for (let n = 0; n < ms; n++) {
      for (const { name, message } of this.#outbox.splice(0)) {
        if (!this.cut) this.simulated.board.receive(name, message as never, TAG);
      }
      this.#atUs += STEP_US;
      this.simulated.advanceTo(this.#atUs);
    }
    const { items } = this.#bench;
    const next = items.after(this.#told, 100_000);
    this.#told = next.at(-1)?.number ?? this.#told;
    for (const { event } of next) for (const take of this.#listeners) take(event);
  }

  #connect(): void {
    const { board } = this.simulated;
    const take = (input: RareInput) => this.#runner.take(input);
    const stamp = (boardUs: number) => this.#runner.core.tracker.extend(boardUs);
    const listener: BoardListener = {
      identity: (message) => {
        this.#identity = { ...message };
      },
      sample: (message) => {
        this.#runner.sample(message);
        this.#bench.sample(message, stamp(message.boardUs));
      },
      edge: (message) => {
        take({ kind: 'edge', message });
        this.#bench.edge(message, stamp(message.boardUs));
      },
      outcome: (message) => {
        take({ kind: 'outcome', message });
        this.#bench.outcome(message, stamp(message.boardUs));
      },
      fault: (message) => take({ kind: 'fault', message }),
      clock: (message) => take({ kind: 'clock', message }),
    };
    board.connect(listener);
    board.receive('identify', { nonce: 1, protocol: PROTOCOL_VERSION, newTag: TAG }, 0);
  }

  /** As the loop does between sessions: rules that do nothing, and beats. */
  #goIdle(): void {
    const program = idleRules(this.rig);
    const setup = { rig: this.rig, program, title: '', seed: '', waterTodayNl: 0 };
    this.#runner = new SessionRunner(setup, this.#send);
    this.#linkUp();
  }

  #linkUp(): void {
    const identity = this.#identity!;
    const simulated = (identity.capabilities & CAPABILITY.simulated) !== 0;
    this.#runner.take({
      ...{ kind: 'link up', identity, tag: TAG, sameBoot: false, overNetwork: !simulated },
    });
  }
}

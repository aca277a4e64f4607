import { describe, expect, it } from 'vitest';
import { SessionCore } from '../../server/session/core/sessionCore.js';
import type { StampedDecision } from '../../server/session/decisions.js';
import type { OperatorAct } from '../../server/session/inputs.js';
import { blank } from '../../server/wire/codec.js';
import {
  type Arm,
  type Beat,
  type Identity,
  OUTCOME,
  type Pulse,
  REASON,
  WIRE_TIMES,
} from '../../server/wire/messages.js';
import { setupOf } from './rehearsed.js';

const RULES = `title: Core
belt: 180 cm
operator:
  gate_at: 20 to 80 cm, at first 45 cm
rules:
  water:
    when: spikes rises
    do: give 4 uL
  light:
    when: spikes falls
    do: pulse laser for 20 ms
  induce:
    when: reaches gate_at
    do:
      - pulse gate for 300 ms
      - pulse sync for 10 ms
    within: 1 cm
end: time >= 60 min
`;

const SPIKES = 2;
const SEAM = 1;

/** A session core and the board it thinks it has, frame by frame. */
class Stage {
  readonly commands: { name: string; message: object }[] = [];
  readonly decisions: StampedDecision[] = [];
  readonly core: SessionCore;
  us = 1_000_000;
  count = 0;
  inputs = 0;

  constructor(overNetwork = false) {
    this.core = new SessionCore(setupOf(RULES), {
      command: (name, message) => this.commands.push({ name, message: { ...message } }),
      decision: (decision) => this.decisions.push(decision),
    });
    this.up({ overNetwork });
    this.core.take({ kind: 'begin', firstId: 100 });
  }

  up(more: { overNetwork?: boolean; sameBoot?: boolean; outcomesKept?: number } = {}): void {
    const identity: Identity = {
      ...blank('identity'),
      boardUs: this.us,
      slots: 8,
      outcomesKept: more.outcomesKept ?? 0,
    };
    const { overNetwork = false, sameBoot = false } = more;
    this.core.take({ kind: 'link up', identity, tag: 7, sameBoot, overNetwork });
  }

  /** Samples each millisecond for this long, moving so many counts in each. */
  run(ms: number, countsPerMs = 0): void {
    for (let i = 0; i < ms; i++) {
      this.us += 1_000;
      this.count += countsPerMs;
      const { us: boardUs, count, inputs } = this;
      this.core.sample({ ...blank('sample'), boardUs, count, inputs });
    }
  }

  edge(input: number, level: 0 | 1): void {
    const message = { boardUs: this.us, count: this.count, input, level };
    this.inputs = level === 1 ? this.inputs | (1 << input) : this.inputs & ~(1 << input);
    this.core.take({ kind: 'edge', message });
  }

  /** Passes the seam mark, so that position is known and trusted. */
  home(): void {
    this.run(20, 5);
    this.edge(SEAM, 1);
    this.run(2, 1);
    this.edge(SEAM, 0);
  }

  outcome(id: number, kind: keyof typeof OUTCOME, output: number, onUs = 0, repeated = 0): void {
    this.core.take({
      kind: 'outcome',
      message: {
        ...{ id, kind: OUTCOME[kind], reason: REASON.none, output, repeated },
        ...{ boardUs: this.us, count: this.count, onUs },
      },
    });
  }

  act(act: OperatorAct): void {
    this.core.take({ kind: 'operator', act, by: { who: 'a test', from: 'here' } });
  }

  sent<T>(name: string): T[] {
    return this.commands.filter((one) => one.name === name).map(({ message }) => message as T);
  }
  told(kind: StampedDecision['kind']): StampedDecision[] {
    return this.decisions.filter((decision) => decision.kind === kind);
  }
}

describe('a session core', () => {
  it('asks the board with an expiry 50 ms after the cause, by the stamp of the cause', () => {
    const stage = new Stage();
    stage.home();
    stage.edge(SPIKES, 1);
    const [pulse] = stage.sent<Pulse>('pulse');
    expect(pulse).toMatchObject({ id: 100, output: 0, widthUs: 56_000, repeats: 1 });
    expect(pulse!.expiryUs).toBe(stage.us + 50_000);
  });

  it('beats every 25 ms of board time with the newest stamp that it has finished', () => {
    const stage = new Stage();
    const before = stage.sent<Beat>('beat').length;
    stage.run(250);
    const beats = stage.sent<Beat>('beat').slice(before);
    expect(beats).toHaveLength(10);
    for (let i = 1; i < beats.length; i++) {
      expect(beats[i]!.finishedUs - beats[i - 1]!.finishedUs).toBe(WIRE_TIMES.beatUs);
    }
  });

  it('beats at once when a slot is no longer wanted', () => {
    const stage = new Stage();
    stage.home();
    stage.run(200, 4);
    const [arm] = stage.sent<Arm>('arm');
    expect(arm).toBeDefined();
    expect(stage.sent<Beat>('beat').at(-1)!.wanted).toBe(1 << arm!.slot);
    stage.act({ act: 'hold', what: 'stimulus', on: true });
    expect(stage.commands.at(-1)).toMatchObject({ name: 'beat', message: { wanted: 0 } });
  });

  it('arms at the count of the place, and fires nothing itself when the place is passed', () => {
    const stage = new Stage();
    stage.home();
    const seamCount = 100;
    stage.run(230, 5);
    const [arm] = stage.sent<Arm>('arm');
    expect(arm).toMatchObject({
      output: 2,
      rising: 1,
      count: seamCount + 45 * 25,
      widthUs: 300_000,
    });
    expect(stage.sent('pulse')).toHaveLength(0);
    stage.outcome(arm!.id, 'fired', 2);
    expect(stage.told('fired')).toMatchObject([{ rule: 'induce', armed: true, placeCm: 45 }]);
  });

  it('sends the marks of an armed firing as soon as the board says that it fired', () => {
    const stage = new Stage();
    stage.home();
    stage.run(230, 5);
    const [arm] = stage.sent<Arm>('arm');
    stage.outcome(arm!.id, 'fired', 2);
    expect(stage.sent<Pulse>('pulse')).toMatchObject([
      { output: 5, widthUs: 10_000, expiryUs: stage.us + 50_000 },
    ]);
    // The mark's own outcome is no second firing.
    stage.outcome(arm!.id + 1, 'fired', 5);
    stage.outcome(arm!.id + 1, 'done', 5, 10_000);
    expect(stage.core.engine.view().rules[2]).toMatchObject({ name: 'induce', firings: 1 });
  });

  it('asks again under the same id when no answer comes, and calls it uncertain in the end', () => {
    const stage = new Stage();
    stage.home();
    stage.edge(SPIKES, 1);
    stage.run(1_500);
    const asked = stage.sent<Pulse>('pulse');
    expect(asked.length).toBeGreaterThan(2);
    expect(new Set(asked.map(({ id }) => id))).toEqual(new Set([100]));
    expect(new Set(asked.map(({ expiryUs }) => expiryUs)).size).toBe(1);
    expect(stage.told('uncertain')).toHaveLength(1);
    expect(stage.core.guard.waterUncertainNl).toBe(4_000);
    expect(stage.core.guard.waterGivenNl).toBe(0);
  });

  it('counts a drop by the time that the board says its valve was open', () => {
    const stage = new Stage();
    stage.home();
    stage.edge(SPIKES, 1);
    stage.outcome(100, 'fired', 0);
    stage.run(56);
    stage.outcome(100, 'done', 0, 44_000);
    expect(stage.core.guard.waterGivenNl).toBe(3_000);
    expect(stage.told('pulse done')).toMatchObject([{ rule: 'water', volumeNl: 3_000 }]);
  });

  it('gives back what the board says never fired', () => {
    const stage = new Stage();
    stage.home();
    stage.edge(SPIKES, 1);
    expect(stage.core.guard.waterReservedNl).toBe(4_000);
    stage.outcome(100, 'expired', 0);
    expect(stage.core.guard.waterReservedNl).toBe(0);
    expect(stage.told('missed')).toMatchObject([{ rule: 'water' }]);
  });

  it('gives back what never reached the board before the link was lost', () => {
    const stage = new Stage();
    stage.home();
    stage.edge(SPIKES, 1);
    stage.core.take({ kind: 'link down', reason: 'unplugged' });
    stage.up({ sameBoot: true, outcomesKept: 0 });
    expect(stage.core.guard.waterReservedNl).toBe(0);
    expect(stage.core.guard.waterUncertainNl).toBe(0);
  });

  it('charges what the board says it did while the link was lost', () => {
    const stage = new Stage();
    stage.home();
    stage.edge(SPIKES, 1);
    stage.core.take({ kind: 'link down', reason: 'unplugged' });
    stage.up({ sameBoot: true, outcomesKept: 2 });
    stage.outcome(100, 'fired', 0, 0, 1);
    stage.outcome(100, 'done', 0, 56_000, 1);
    expect(stage.core.guard.waterGivenNl).toBe(4_000);
  });

  it('charges an id that nothing here was waiting for', () => {
    const stage = new Stage();
    stage.home();
    stage.outcome(77, 'done', 0, 56_000);
    expect(stage.core.guard.waterGivenNl).toBe(4_000);
    stage.outcome(77, 'done', 0, 56_000, 1);
    expect(stage.core.guard.waterGivenNl).toBe(4_000);
  });

  it('calls uncertain what a board that restarted had not answered, and holds stimulation', () => {
    const stage = new Stage();
    stage.home();
    stage.edge(SPIKES, 1);
    stage.core.take({ kind: 'link down', reason: 'reset' });
    stage.us = 5_000;
    stage.inputs = 0;
    stage.up({ sameBoot: false });
    expect(stage.core.guard.waterUncertainNl).toBe(4_000);
    expect(stage.core.holds.reason('stimulus')).toMatch(/waits for you/);
    stage.count = 0;
    stage.home();
    stage.run(100);
    stage.edge(SPIKES, 1);
    stage.edge(SPIKES, 0);
    expect(stage.told('withheld')).toMatchObject([{ rule: 'light' }]);
    // The board's clock has begun anew, and what is sent to it goes by that clock.
    const pulse = stage.sent<Pulse>('pulse').at(-1)!;
    expect(pulse.output).toBe(0);
    expect(pulse.expiryUs).toBe(stage.us + 50_000);
    stage.act({ act: 'allow stimulation' });
    stage.run(100);
    stage.edge(SPIKES, 1);
    stage.edge(SPIKES, 0);
    expect(stage.sent<Pulse>('pulse').at(-1)!.output).toBe(1);
  });

  it('never configures nor asks for a real stimulus over a network, and gives water', () => {
    const stage = new Stage(true);
    stage.home();
    const configured = stage.sent<{ output: number }>('configure').map(({ output }) => output);
    expect(configured).toContain(0);
    expect(configured).not.toContain(1);
    expect(configured).not.toContain(2);
    stage.edge(SPIKES, 1);
    stage.edge(SPIKES, 0);
    expect(stage.sent<Pulse>('pulse').map(({ output }) => output)).toEqual([0]);
    expect(stage.told('withheld')).toMatchObject([
      { rule: 'light', reason: 'laser: no real stimulus over a network' },
    ]);
  });

  it('stops everything at once, holds it, and goes on recording', () => {
    const stage = new Stage();
    stage.home();
    stage.act({ act: 'stop everything' });
    expect(stage.sent('quiet')).toEqual([{ outputs: 0xffff }]);
    stage.edge(SPIKES, 1);
    expect(stage.sent('pulse')).toHaveLength(0);
    expect(stage.core.state).toBe('running');
    stage.act({ act: 'hold', what: 'water', on: false });
    stage.run(10);
    stage.edge(SPIKES, 0);
    stage.edge(SPIKES, 1);
    expect(stage.sent<Pulse>('pulse').map(({ output }) => output)).toEqual([0]);
  });

  it('moves a place that the operator chose from the next lap on', () => {
    const stage = new Stage();
    stage.home();
    stage.act({ act: 'choose', name: 'gate_at', value: 60 });
    stage.run(10, 1);
    const [choice] = stage.core.engine.view().choices;
    expect(choice).toMatchObject({ value: 45, queued: 60 });
  });

  it('at the end sets everything idle, waits for the last words, and ends', () => {
    const stage = new Stage();
    stage.home();
    stage.edge(SPIKES, 1);
    stage.outcome(100, 'fired', 0);
    stage.act({ act: 'end', reason: 'enough' });
    expect(stage.sent('quiet')).toEqual([{ outputs: 0xffff }]);
    expect(stage.core.state).toBe('ending');
    stage.outcome(100, 'done', 0, 20_000);
    stage.run(2);
    expect(stage.core.state).toBe('ended');
    expect(stage.told('session ended')).toMatchObject([{ reason: 'enough' }]);
    expect(stage.core.guard.waterGivenNl).toBe(1_000);
    expect(stage.core.guard.waterUncertainNl).toBe(0);
  });
});

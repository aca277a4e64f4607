/**
 * A moving animal for tests of the web and the dashboard: not the simulated rig, only a scripted one
 * that fills every field of the loop's messages. Deterministic, in steps of 50 ms.
 */
import type { NumberedEvent, Setup, Snapshot } from '../../server/loop/protocol.js';
import { FieldPredictor } from '../../server/plasticity/fieldPrediction.js';
import { WINDOW_STEPS } from '../../server/plasticity/positionTrail.js';
import type { Decision } from '../../server/session/decisions.js';

export const BELT_CM = 180;
const STEP_S = 0.05;
const SPOUT_CM = 90;

/** Small linear congruential generator; constants of Numerical Recipes (from memory). */
function randomOf(seed: number): () => number {
  let x = seed >>> 0;
  return () => {
    x = (Math.imul(x, 1664525) + 1013904223) >>> 0;
    return x / 2 ** 32;
  };
}

type Writable<T> = { -readonly [K in keyof T]: T[K] };

export class ScriptedAnimal {
  readonly setup: Setup;
  readonly state: Writable<Snapshot>;
  events: NumberedEvent[] = [];
  private readonly random = randomOf(7);
  private lickAtS = 0;
  private number = 0;
  private serial = 0;
  private targetCm = 45;
  private queuedTarget: number | null = null;
  private marksMade = 0;
  private stimUntilS = 0;
  /** A place that was moved is armed anew once the animal nears it. */
  private waits = false;

  constructor() {
    this.setup = idleSetup();
    this.state = idleState();
  }

  get running(): boolean {
    return this.state.session === 'running';
  }

  begin(rules: string, subject: string, experimenter = '', seed = '7'): void {
    (this.setup as Writable<Setup>).session = session(rules, subject, experimenter, seed);
    Object.assign(this.state, idleState(), { session: 'running', boardUs: this.state.boardUs });
    this.state.phase = 'baseline';
    this.state.trust = 'unknown';
    this.state.trustReason = 'no seam mark yet';
    this.state.record = { state: 'writing', bytes: 0, reason: '', diskFreeGb: 212 };
    this.tell({ kind: 'session began', title: 'Induction with sham laps', seed });
  }

  end(reason: string): void {
    if (!this.running) return;
    this.state.session = 'ended';
    this.state.endedBecause = reason;
    this.state.outputs = 0;
    this.state.record = { ...this.state.record, state: 'off' };
    this.tell({ kind: 'session ended', reason });
  }

  quiet(): void {
    this.state.outputs = 0;
    this.state.held = { stimulus: 'everything was stopped', water: 'everything was stopped' };
  }

  hold(what: 'stimulus' | 'water', on: boolean): void {
    this.state.held = { ...this.state.held, [what]: on ? 'held by the operator' : null };
  }

  mark(): void {
    const { boardUs, lap, positionCm } = this.state;
    const mark = ++this.marksMade;
    this.state.marks = [...this.state.marks, { mark, boardUs, lap, positionCm }];
    this.tell({ kind: 'note', text: '', mark, markedUs: boardUs });
  }

  note(text: string, mark?: number): void {
    this.state.marks = this.state.marks.filter((one) => one.mark !== mark);
    this.tell({ kind: 'note', text, mark: mark ?? null, markedUs: null });
  }

  /** In the next so many laps, 0 at once; undefined takes it back. */
  ask(rule: string, laps: number | undefined): void {
    const { lap } = this.state;
    const asked = laps ? { fromLap: lap + 1, toLap: lap + laps } : null;
    this.state.rules = this.state.rules.map((one) => (one.name === rule ? { ...one, asked } : one));
  }

  putOff(laps: number, minutes: number): void {
    const { putOff, end } = this.state;
    this.state.putOff = { laps: putOff.laps + laps, minutes: putOff.minutes + minutes };
    if (end?.laps) this.state.end = { ...end, laps: end.laps + laps };
  }

  acknowledge(alarm: string, who: string, from: string): void {
    this.state.alarms = this.state.alarms.map((one) =>
      alarm === 'all' || one.alarm === alarm ? { ...one, seenBy: { who, from } } : one,
    );
  }

  choose(value: number): void {
    this.queuedTarget = value;
    this.showChoices();
  }

  /** Lets the animal live `seconds` more; new events are added to `events`. */
  advance(seconds: number): void {
    for (let at = 0; at < seconds - 1e-9; at += STEP_S) this.step();
  }

  tell(decision: Decision, at: Partial<{ lap: number; positionCm: number }> = {}): void {
    const { state } = this;
    this.number++;
    this.events.push({
      number: this.number,
      event: {
        input: state.input,
        boardUs: state.boardUs,
        lap: at.lap ?? state.lap,
        positionCm: at.positionCm ?? state.positionCm,
        speedCmPerS: state.speedCmPerS,
        ...decision,
      },
    });
  }

  private step(): void {
    const { state } = this;
    state.boardUs += STEP_S * 1e6;
    state.input += 50;
    if (!this.running) return;
    state.sessionS += STEP_S;
    state.record = { ...state.record, bytes: state.record.bytes + 1100 };
    const before = state.positionCm ?? 0;
    const learned = Math.min(1, state.lap / 15);
    const near = before > SPOUT_CM - 18 && before < SPOUT_CM + 4;
    const wanted = near ? 26 - 17 * learned : 26 + 5 * Math.sin(state.sessionS / 3);
    const noise = (this.random() - 0.5) * 3;
    state.speedCmPerS += (wanted - state.speedCmPerS) * 0.18 + noise * 0.3;
    const after = before + state.speedCmPerS * STEP_S;
    this.lick(before, near, learned);
    if (after >= BELT_CM) this.nextLap(after - BELT_CM);
    else state.positionCm = after;
    if (this.waits && after > this.targetCm - 20 && after < this.targetCm) {
      this.waits = false;
      this.showChoices();
    }
    if (before < this.targetCm && after >= this.targetCm) this.induce();
    if (before < SPOUT_CM && after >= SPOUT_CM) this.water();
    this.showProgress();
    if (state.sessionS > this.stimUntilS) state.outputs &= ~2;
    if (state.sessionS > this.stimUntilS - 0.2) state.outputs &= ~1;
  }

  private showProgress(): void {
    const { state } = this;
    const induced = state.rules.find(({ name }) => name === 'induce')!;
    const done = state.phase === 'induction' ? induced.firings + induced.shams : state.phaseLap;
    const what =
      state.phase === 'induction' ? 'firings of induce this phase' : 'laps of this phase';
    const of = state.phase === 'induction' ? 20 : 7;
    state.progress = state.phase === 'probe' ? null : { done, of, unit: '', what };
    const ends = 60 + state.putOff.laps;
    state.end = { laps: ends - state.lap, s: null, exact: true, what: 'laps done this session' };
  }

  private lick(positionCm: number, near: boolean, learned: number): void {
    const { state } = this;
    const perS = near ? 5 + 2 * learned : 1.6 * (1 - learned) + 0.1;
    state.lickOn = this.random() < perS * STEP_S && state.sessionS - this.lickAtS > 0.1;
    if (!state.lickOn) return;
    this.lickAtS = state.sessionS;
    state.licks++;
    this.tell({ kind: 'lick', artefact: false }, { positionCm });
  }

  private nextLap(positionCm: number): void {
    const { state } = this;
    state.positionCm = positionCm;
    state.lap++;
    state.phaseLap++;
    if (state.lap === 1) {
      state.trust = 'trusted';
      state.trustReason = 'seam mark met, slip 1.2 mm';
      this.tell({ kind: 'seam', event: 'first', slipMm: null });
      this.tell({ kind: 'trust', trust: 'trusted', reason: 'the first seam mark' });
    } else {
      this.tell({ kind: 'seam', event: 'accepted', slipMm: (this.random() - 0.5) * 4 });
    }
    this.tell({ kind: 'lap began', lap: state.lap });
    if (this.queuedTarget !== null) {
      this.targetCm = this.queuedTarget;
      this.queuedTarget = null;
      this.waits = true;
    }
    this.showChoices();
    const next = state.lap === 8 ? 'induction' : state.lap === 28 ? 'probe' : undefined;
    if (next === undefined) return;
    state.phase = next;
    state.phaseLap = 1;
    this.tell({ kind: 'phase began', phase: next, index: 2, reason: 'the one before ended' });
  }

  private induce(): void {
    const { state } = this;
    if (state.phase !== 'induction') return;
    const serial = ++this.serial;
    if (state.held.stimulus !== null) {
      this.count('induce', 'withheld');
      this.tell({ kind: 'withheld', rule: 'induce', serial, reason: state.held.stimulus });
      return;
    }
    const sham = serial % 3 === 0;
    const late = serial % 7 === 5;
    if (late) {
      this.count('induce', 'missed');
      this.tell({ kind: 'missed', rule: 'induce', serial, reason: '1.4 cm past the place' });
      return;
    }
    this.count('induce', sham ? 'shams' : 'firings');
    if (!sham) {
      state.outputs |= 2;
      this.stimUntilS = state.sessionS + 0.3;
    }
    this.fired('induce', serial, sham, sham ? null : 'gate', this.targetCm);
    if (!sham) this.predict(serial);
  }

  /** As if it had run at this speed throughout. */
  private predict(serial: number): void {
    const { speedCmPerS } = this.state;
    const moved = Float64Array.from({ length: WINDOW_STEPS }, (_, n) => {
      return speedCmPerS * (-3 + (n + 0.5) / 100);
    });
    const predictor = new FieldPredictor(BELT_CM);
    const field = predictor.predict(moved, this.targetCm)!;
    const top = Math.max(...predictor.curve);
    const curve = [...predictor.curve].map((value) => value / top);
    this.tell({ kind: 'field predicted', rule: 'induce', serial, ...field, curve });
  }

  private water(): void {
    const { state } = this;
    const serial = ++this.serial;
    if (state.lap === 0) return;
    if (state.held.water !== null || state.waterUl + 4 > state.waterLimitUl) {
      this.count('water', 'withheld');
      const reason = state.held.water ?? 'water limit of the session';
      this.tell({ kind: 'withheld', rule: 'water', serial, reason });
      return;
    }
    this.count('water', 'firings');
    state.outputs |= 1;
    this.stimUntilS = state.sessionS + 0.25;
    state.waterUl += 4;
    state.waterTodayUl += 4;
    this.fired('water', serial, false, 'valve', SPOUT_CM);
  }

  private fired(
    rule: string,
    serial: number,
    sham: boolean,
    output: string | null,
    placeCm: number,
  ): void {
    const errorMm = 0.3 + this.random() * 0.4;
    const riseCm = placeCm + errorMm / 10;
    const riseUs = output === null ? null : this.state.boardUs;
    const decision = { kind: 'fired' as const, rule, serial, sham, armed: true, output, riseUs };
    this.tell({ ...decision, placeCm, riseCm, errorMm }, { positionCm: riseCm });
  }

  private count(rule: string, what: 'firings' | 'shams' | 'withheld' | 'missed'): void {
    this.state.rules = this.state.rules.map((one) =>
      one.name === rule ? { ...one, [what]: one[what] + 1 } : one,
    );
  }

  private showChoices(): void {
    const { targetCm: value, queuedTarget: queued } = this;
    this.state.choices = [
      {
        name: 'target',
        value,
        queued,
        fromLap: queued === null ? null : this.state.lap + 1,
        waits: this.waits,
      },
      { name: 'volume', value: 4000, queued: null, fromLap: null, waits: false },
      { name: 'train', value: 'short', queued: null, fromLap: null, waits: false },
    ];
    this.state.places = [
      { name: 'zone', fromCm: 80, toCm: 98 },
      { name: 'target', fromCm: this.targetCm, toCm: this.targetCm },
      { name: 'spout', fromCm: SPOUT_CM, toCm: SPOUT_CM },
    ];
    this.state.rules = this.state.rules.map((one) => ({
      ...one,
      armed: one.name === 'water' || this.state.phase === 'induction',
    }));
  }
}

function idleSetup(): Setup {
  return {
    rig: 'bench belt',
    simulated: true,
    beltLengthCm: BELT_CM,
    outputs: [
      { name: 'valve', kind: 'valve' },
      { name: 'gate', kind: 'stimulus' },
      { name: 'sync', kind: 'mark' },
    ],
    inputs: ['lick', 'seam', 'shutter', 'pedal'],
    cellFields: ['depth (um)', 'access resistance (MOhm)', 'file name'],
    buttonBox: [{ input: 'pedal', does: 'hold stimulus' }],
    rulesFiles: ['induction.yaml', 'water-only.yaml'],
    session: null,
  };
}

function session(
  rules: string,
  subject: string,
  experimenter: string,
  seed: string,
): NonNullable<Setup['session']> {
  return {
    folder: `sessions/${subject}`,
    title: 'Induction with sham laps',
    subject,
    experimenter,
    seed,
    startedAt: '2026-12-01T09:30:00Z',
    blinded: false,
    rulesText: `# ${rules}\ntitle: Induction with sham laps\n`,
    rules: ['water', 'induce'],
    phases: ['baseline', 'induction', 'probe'],
    buttons: ['induce_now', 'drop'],
    stimuli: ['induce'],
    asks: [{ rule: 'induce', now: true, laps: 5 }],
    choices: [
      { name: 'target', unit: 'cm', least: 20, most: 160 },
      { name: 'volume', unit: 'nL', least: 1000, most: 8000 },
      { name: 'train', unit: '', options: ['short', 'long'] },
    ],
  };
}

function idleState(): Writable<Snapshot> {
  const rule = (name: string) => ({
    name,
    firings: 0,
    shams: 0,
    withheld: 0,
    missed: 0,
    armed: false,
    asked: null,
  });
  return {
    input: 0,
    boardUs: 0,
    session: 'idle',
    endedBecause: null,
    sessionS: 0,
    link: {
      state: 'up',
      reason: '',
      remedy: '',
      port: '/dev/ttyLAPWING',
      board: 'simulated board 1.0',
      framesPerS: 1000,
      lostFrames: 0,
      badFrames: 0,
    },
    trust: 'unknown',
    trustReason: 'no seam mark yet',
    positionCm: null,
    speedCmPerS: 0,
    lap: 0,
    lickOn: false,
    licks: 0,
    phase: null,
    phaseLap: 0,
    progress: null,
    cell: 0,
    end: null,
    putOff: { laps: 0, minutes: 0 },
    places: [],
    choices: [],
    rules: [rule('water'), rule('induce')],
    outputs: 0,
    inputs: 0,
    waterUl: 0,
    waterUncertainUl: 0,
    waterLimitUl: 400,
    waterTodayUl: 120,
    waterDayLimitUl: 1500,
    alarms: [],
    marks: [],
    held: { stimulus: null, water: null },
    handOnBelt: false,
    record: { state: 'off', bytes: 0, reason: '', diskFreeGb: 212 },
  };
}

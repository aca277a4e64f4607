// One file, so that an input's path from frame to command can be read from top to bottom.
import { Guard } from '../../guard/guard.js';
import type { Program } from '../../rules/engine/program.js';
import { RulesEngine } from '../../rules/engine/rulesEngine.js';
import { withArm } from '../../rules/engine/withArm.js';
import type { Actuator, Inquiry, Instant, Journal } from '../../rules/instant.js';
import type { TrackEvent } from '../../track/events.js';
import { blankInstant, Tracker } from '../../track/tracker.js';
import {
  FAULT,
  type Fault,
  type Identity,
  nameOf,
  type Sample,
  WIRE_TIMES,
} from '../../wire/messages.js';
import type { Decision } from '../decisions.js';
import type { RareInput } from '../inputs.js';
import { beltOf, guardConfigOf } from '../rig/parts.js';
import type { Rig, RigOutput } from '../rig/rig.js';
import { configureOutputs, syncSeed } from './boardSetup.js';
import { ChoiceWatch } from './choiceWatch.js';
import type { CoreOutput } from './coreOutput.js';
import { BY_HAND, Firings } from './firings.js';
import { Holds } from './holds.js';
import type { Marks } from './marks.js';
import { EVERYTHING, Steering } from './steering.js';

export interface SessionSetup {
  readonly rig: Rig;
  readonly program: Program;
  readonly title: string;
  /** The seed of every draw. */
  readonly seed: string;
  /** Given to this animal earlier today, by the records of its sessions. */
  readonly waterTodayNl: number;
  /** What a sealed draw is; by chance where nothing is said, as in a rehearsal. */
  readonly arm?: string;
  /** Told why rules were not tried; a rehearsal asks. */
  readonly inquiry?: Inquiry;
}

/** After the end, the outcomes of what was cut short are waited for this long. */
const DRAIN_US = 500_000;
/** Ids that a killed loop may have sent after the last that it recorded. */
const RESUME_SKIP = 1_000;

/**
 * The whole of a session between its inputs and its commands: track, decide, guard, command.
 *
 * It has no clock, no chance of its own and no I/O, so that a live session, a rehearsal and a replay
 * run this very code. An input's path from frame to command reads here from top to bottom; what each
 * step does lives in its own folder.
 */
export class SessionCore {
  readonly instant: Instant = blankInstant();
  readonly tracker: Tracker;
  readonly engine: RulesEngine;
  readonly guard: Guard;
  readonly holds: Holds;
  readonly firings: Firings;
  /** Which of the operator's changes the board has yet to confirm. */
  readonly changes: ChoiceWatch;
  readonly rig: Rig;
  readonly #setup: SessionSetup;
  readonly #out: CoreOutput;
  #input = -1;
  #state: 'waiting' | 'running' | 'ending' | 'ended' = 'waiting';
  #endReason = '';
  #endedBy: 'rules' | 'operator' = 'rules';
  #linked = false;
  #overNetwork = false;
  #beatUs = Number.NEGATIVE_INFINITY;
  #beganUs = 0;
  /** Frames that the board says it dropped, and whether it must be configured again. */
  #boardBadFrames = 0;
  #configureDue = false;
  #drainedUs = 0;
  #licks = 0;
  readonly #steering: Steering;

  constructor(setup: SessionSetup, out: CoreOutput) {
    this.#setup = setup;
    this.#out = out;
    this.rig = setup.rig;
    this.tracker = new Tracker(beltOf(setup.rig), { tracked: (event) => this.#tracked(event) });
    this.guard = new Guard(guardConfigOf(setup.rig, setup.waterTodayNl));
    this.holds = new Holds(this.guard);
    this.firings = new Firings(this.#firingContext());
    this.changes = new ChoiceWatch(
      setup.program,
      (rule) => this.firings.armedSinceUs(rule),
      (decision) => this.#tell(decision),
    );
    this.#steering = new Steering({
      instant: this.instant,
      tracker: this.tracker,
      holds: this.holds,
      firings: this.firings,
      rig: this.rig,
      out,
      engine: () => this.engine,
      tell: (decision) => this.#tell(decision),
      end: (reason) => this.#end(reason, 'operator'),
    });
    this.engine = new RulesEngine(
      withArm(setup.program, setup.arm),
      setup.seed,
      this.#actuator(),
      this.#journal(),
      setup.inquiry,
    );
  }

  /** Sequence number of the newest input; -1 before the first. */
  get input(): number {
    return this.#input;
  }
  get state(): 'waiting' | 'running' | 'ending' | 'ended' {
    return this.#state;
  }
  get endReason(): string {
    return this.#endReason;
  }
  get endedBy(): 'rules' | 'operator' {
    return this.#endedBy;
  }
  /** Extended board time at which the session began. */
  get beganUs(): number {
    return this.#beganUs;
  }
  /** Given to this animal earlier today. */
  get waterEarlierNl(): number {
    return this.#setup.waterTodayNl;
  }
  /** Licks since the session began, artefacts left out. */
  get licks(): number {
    return this.#licks;
  }
  /** A hand turns the belt: rules are not asked, and nothing counts. */
  get handOnBelt(): boolean {
    return this.#steering.handOnBelt;
  }
  /** Notes that were stamped by a key and have no words yet. */
  get marks(): Marks {
    return this.#steering.marks;
  }

  // ---- inputs --------------------------------------------------------------------------------

  /** A sample: one instant. `m` may be reused by the caller. */
  sample(m: Sample): void {
    this.#input++;
    // A frame that the board dropped may have been a `configure`, which has no answer.
    if (m.badFrames !== this.#boardBadFrames) {
      this.#boardBadFrames = m.badFrames;
      this.#configureDue = true;
    }
    this.tracker.sample(m, this.instant);
    this.#advance();
  }

  /** Any input that is not a sample. */
  take(input: RareInput): void {
    this.#input++;
    switch (input.kind) {
      case 'edge':
        this.tracker.edge(input.message, this.instant);
        this.#advance();
        break;
      case 'outcome':
        this.firings.outcome(input.message);
        break;
      case 'clock':
        this.tracker.clock(input.message);
        break;
      case 'fault':
        this.#fault(input.message);
        break;
      case 'link up':
        this.#linkUp(input.identity, input.sameBoot, input.overNetwork);
        break;
      case 'link down':
        this.#linkDown(input.reason);
        break;
      case 'gap':
        this.#tell({ kind: 'frames lost', frames: input.frames, why: 'numbers were skipped' });
        break;
      case 'bad frame':
        this.#tell({ kind: 'frames lost', frames: 1, why: input.why });
        break;
      case 'operator':
        this.#steering.take(input.act, input.by);
        this.#beat(this.instant.nowUs);
        break;
      case 'alarm': {
        const { kind, alarm, raised, level, text, remedy } = input;
        this.#tell({ kind, alarm, state: raised ? 'raised' : 'cleared', level, text, remedy });
        break;
      }
      case 'resume':
        this.firings.skipIds(RESUME_SKIP);
        this.#tell({ kind: 'link', state: 'resumed', reason: input.note });
        break;
      case 'begin':
        this.firings.idsFrom(input.firstId);
        this.#begin();
        break;
    }
  }

  #advance(): void {
    const { instant } = this;
    if (this.#state === 'running') {
      this.#steering.step();
      if (!this.#steering.handOnBelt) this.engine.step(instant);
      this.firings.check(instant.nowUs);
      this.changes.step(instant.nowUs);
      // Allowances are right only while nothing is under way.
      if (this.#configureDue && this.firings.settled) this.#configure();
    } else if (this.#state === 'ending') {
      this.#drain(instant.nowUs);
    }
    this.#beat(instant.nowUs);
  }

  /**
   * The board lives on beats, and a beat says which input has been finished with: it is sent from
   * here, after the work, and never by a timer.
   */
  #beat(nowUs: number): void {
    const changed = this.firings.takeChanged();
    if (!this.#linked || !(changed || nowUs - this.#beatUs >= WIRE_TIMES.beatUs)) return;
    this.#beatUs = nowUs;
    const finishedUs = this.tracker.toBoardUs(nowUs);
    this.#out.command('beat', { finishedUs, wanted: this.firings.wantedMask });
  }

  #begin(): void {
    this.tracker.unmoved(this.instant);
    this.#beganUs = this.instant.nowUs;
    this.#state = 'running';
    this.#configure();
    this.#tell({ kind: 'session began', title: this.#setup.title, seed: this.#setup.seed });
    this.#steering.begin();
    this.engine.begin(this.instant);
  }

  #fault(m: Fault): void {
    this.#tell({ kind: 'board fault', fault: nameOf(FAULT, m.fault), detail: m.detail });
  }

  #linkUp(identity: Identity, sameBoot: boolean, overNetwork: boolean): void {
    this.#linked = true;
    this.#overNetwork = overNetwork;
    // The board's new time has to be known before anything is stamped with it.
    if (this.#input > 0) this.tracker.linkResumed(sameBoot);
    this.tracker.clock(identity);
    this.tracker.unmoved(this.instant);
    // A board acts on nothing before the first beat under its tag.
    this.#beatUs = Number.NEGATIVE_INFINITY;
    this.#beat(this.instant.nowUs);
    if (!sameBoot && this.#state === 'running') {
      this.holds.set('stimulus', 'restart', 'the board restarted; stimulation waits for you');
    }
    this.#tell({ kind: 'link', state: 'up', reason: sameBoot ? '' : 'the board restarted' });
    this.firings.linkUp(identity, sameBoot, overNetwork);
  }

  #linkDown(reason: string): void {
    this.#linked = false;
    this.firings.linkDown();
    this.#tell({ kind: 'link', state: 'down', reason });
    if (this.#state === 'ending') this.#finish();
  }

  /** Tells the board its own limits: what is not configured there never fires. */
  #configure(): void {
    this.#configureDue = false;
    for (const message of configureOutputs(this.rig, this.guard, this.#overNetwork)) {
      this.#out.command('configure', message);
    }
    const { sync } = this.rig;
    if (sync === undefined) return;
    this.#out.command('sync', {
      output: sync.line,
      running: 1,
      widthUs: sync.widthUs,
      leastGapUs: sync.leastGapUs,
      mostGapUs: sync.mostGapUs,
      seed: syncSeed(this.#setup.seed),
    });
  }

  // ---- the end -------------------------------------------------------------------------------

  #end(reason: string, by: 'rules' | 'operator'): void {
    if (this.#state !== 'running') return;
    this.#state = 'ending';
    this.#endedBy = by;
    this.#endReason = reason;
    this.firings.disarmAll('the session ended');
    this.#out.command('quiet', { outputs: EVERYTHING });
    if (this.rig.sync !== undefined) {
      const { line: output } = this.rig.sync;
      this.#out.command('sync', {
        ...{ output, running: 0, widthUs: 0, leastGapUs: 0, mostGapUs: 0, seed: 0 },
      });
    }
    this.#drainedUs = this.instant.nowUs + DRAIN_US;
    if (!this.#linked) this.#finish();
  }

  /** Waits for the board's last words, so that the water book is right. */
  #drain(nowUs: number): void {
    if (this.firings.settled || nowUs >= this.#drainedUs) this.#finish();
  }

  #finish(): void {
    this.firings.abandon();
    this.#state = 'ended';
    this.#tell({ kind: 'session ended', reason: this.#endReason });
  }

  // ---- the parts speak to each other -----------------------------------------------------------

  #tracked(event: TrackEvent): void {
    switch (event.kind) {
      case 'lick':
        if (this.handOnBelt) return;
        if (!event.artefact) this.#licks++;
        this.#tell({ kind: 'lick', artefact: event.artefact });
        return;
      case 'seam':
        // Travel means other counts now: a slot armed by the old ones would fire at a wrong place.
        if (event.slipMm !== null && event.slipMm !== 0) {
          this.firings.disarmAll('the seam mark corrected the position');
        }
        this.#tell(event);
        return;
      case 'unseen':
        this.firings.disarmAll('the belt moved unseen');
        return;
      default:
        this.#tell(event);
    }
  }

  #tell(decision: Decision): void {
    const { instant } = this;
    this.#out.decision({
      input: this.#input,
      boardUs: instant.nowUs,
      lap: instant.lap,
      positionCm: instant.placed ? instant.positionCm : null,
      speedCmPerS: instant.speedCmPerS,
      ...decision,
    });
  }

  #firingContext(): ConstructorParameters<typeof Firings>[0] {
    const outputs: (RigOutput | undefined)[] = [];
    for (const output of this.rig.outputs) outputs[output.line] = output;
    return {
      instant: this.instant,
      tracker: this.tracker,
      guard: this.guard,
      out: this.#out,
      cmPerCount: this.rig.belt.lengthCm / this.tracker.lapCounts,
      outputs,
      ruleName: (rule) => this.#ruleName(rule),
      tell: (decision) => this.#tell(decision),
      settle: (rule, serial, how) => this.engine.settle(rule, serial, how, this.instant),
      drop: (volumeNl) => this.engine.drop(volumeNl),
      outputIdle: (output) => this.engine.outputIdle(output),
      accounted: () => {
        if (this.#state === 'running') this.#configure();
      },
    };
  }

  #actuator(): Actuator {
    return {
      fire: (request) => this.firings.fire(request),
      arm: (request) => this.firings.arm(request),
      disarm: (rule) => this.firings.disarm(rule, 'its condition no longer holds'),
      stop: (output) => this.firings.stop(output),
      endSession: (reason) => this.#end(reason, 'rules'),
    };
  }

  #journal(): Journal {
    const name = (rule: number) => this.#ruleName(rule);
    return {
      // What drives an output is told when the board says so, and a sham as it is asked.
      fired: (rule, serial, sham) => {
        if (this.#drivesOutput(rule)) return;
        this.#tell({
          ...{ kind: 'fired', rule: name(rule), serial, sham, armed: false, output: null },
          ...{ riseUs: null, placeCm: null, riseCm: null, errorMm: null },
        });
      },
      withheld: (rule, serial, reason) =>
        this.#tell({ kind: 'withheld', rule: name(rule), serial, reason }),
      missed: (rule, serial, reason) =>
        this.#tell({ kind: 'missed', rule: name(rule), serial, reason }),
      drawn: (draw, scope, index, value) => {
        const hidden = this.#setup.arm !== undefined && draw === this.#setup.program.sealed?.draw;
        this.#tell({ kind: 'drawn', draw, scope, index, value: hidden ? 'sealed' : value });
      },
      phaseBegan: (phase, index, reason) =>
        this.#tell({ kind: 'phase began', phase, index, reason }),
      cellBegan: () => {},
      noted: (rule, serial) => this.#steering.remark(`${name(rule)} ${serial}`),
      chosen: (choice, value) => this.changes.inForce(choice, value, this.instant.nowUs),
      fieldPredicted: (rule, serial, field, curve) =>
        this.#tell({ kind: 'field predicted', rule: name(rule), serial, ...field, curve }),
      endForeseen: (laps, us, exact, reason) =>
        this.#tell({
          ...{ kind: 'end foreseen', laps: Number.isNaN(laps) ? null : laps, exact, reason },
          s: Number.isNaN(us) ? null : us / 1_000_000,
        }),
    };
  }

  #drivesOutput(rule: number): boolean {
    return this.#setup.program.rules[rule]!.actions.some(({ kind }) => kind === 'order');
  }

  #ruleName(rule: number): string {
    if (rule === BY_HAND) return 'by hand';
    return this.#setup.program.rules[rule]?.name ?? `rule ${rule}`;
  }
}

import { readFileSync } from 'node:fs';
import { dirname, join, resolve } from 'node:path';
import { Ajv2020, type ErrorObject } from 'ajv/dist/2020.js';
import { isMap, isScalar, LineCounter, type Node, parseDocument } from 'yaml';
import { LapwingError } from '../../errors/codes.js';
import { packageRoot } from '../../packageRoot.js';
import type { Dimension } from '../../rules/ast.js';
import { parseQuantity } from '../../rules/units.js';
import type { AlarmLevel } from '../inputs.js';
import { Calibrated, type Report, UNMEASURED } from './calibrated.js';
import { NOTICE_NAMES, unknownNames } from './noticeNames.js';
import type { Rig, RigBelt, RigButton, RigLick, RigNotify, RigOutput, RigSync } from './rig.js';

const LONGEST_FILE_BYTES = 256 * 1024;
const DEFAULT_BAUD = '500000';

/** One thing wrong with a rig file. */
export interface RigProblem {
  readonly line: number;
  readonly column: number;
  readonly message: string;
}

/** The rig file's outline after the schema has passed: text at every leaf. */
interface RigText {
  rig: string;
  board: { port: string; baud?: string; board_id?: string };
  belt: {
    calibration?: string;
    length?: string;
    counts_per_cm?: string;
    tolerance?: string;
    direction?: string;
    still_below?: string;
    speed_window?: string;
    hysteresis?: string;
    seam?: { input: string; offset?: string; warn?: string; stop?: string };
  };
  inputs: Record<string, InputText>;
  outputs: Record<string, OutputText>;
  water: { per_session: string; per_day: string; largest_drop: string };
  loopback?: { output: string; input: string };
  calibrations?: string;
  sync?: { output: string; width: string; from: string; to: string };
  record?: { folder?: string; when_full?: Rig['whenFull'] };
  rules_folder?: string;
  animals?: string;
  blinding?: { allocation: string; key: string };
  cell_fields?: string[];
  notify?: {
    url: string;
    from?: AlarmLevel;
    body?: string;
    content_type?: string;
    most_per_min?: string;
  };
  viewers_may?: 'only look' | 'hold stimulus';
}
interface InputText {
  line: string;
  use?: string;
  calibration?: string;
  lockout?: string;
  stuck?: string;
  artefact?: string;
  does?: string;
  pressed?: 'high' | 'low';
  debounce?: string;
  long_press?: string;
}
interface OutputText {
  line: string;
  kind: RigOutput['kind'];
  longest_on: string;
  least_gap?: string;
  least_travel?: string;
  per_session?: string;
  duty?: string;
  idle?: string;
  on_silence?: string;
  masking?: 'yes';
  evokes?: 'plateau';
  calibration?: string | { dead: string; per_uL: string; from: string; to: string };
}

/**
 * Reads a rig file from disk.
 * @throws LapwingError RIG_UNREADABLE, or RIG_INVALID with every problem and its place
 */
export function readRig(path: string): Rig {
  let text: string;
  try {
    text = readFileSync(path, 'utf8');
  } catch (error) {
    throw new LapwingError('rigUnreadable', `${path}: ${(error as Error).message}`, {
      cause: error,
    });
  }
  const { rig, problems } = parseRig(path, text);
  if (rig) return rig;
  const lines = problems.map((p) => `${path}:${p.line}:${p.column}: ${p.message}`);
  throw new LapwingError('rigInvalid', lines.join('\n'));
}

/** Parses and checks the text of a rig file; every problem at once. */
export function parseRig(
  path: string,
  text: string,
): { readonly rig?: Rig; readonly problems: readonly RigProblem[] } {
  if (text.length > LONGEST_FILE_BYTES) {
    return { problems: [{ line: 1, column: 1, message: 'longer than 256 KiB' }] };
  }
  const lines = new LineCounter();
  const document = parseDocument(text, { schema: 'failsafe', lineCounter: lines });
  if (document.errors.length > 0) {
    return {
      problems: document.errors.map((error) => {
        const { line, col } = lines.linePos(error.pos[0]);
        return { line, column: col, message: error.message.split('\n')[0]! };
      }),
    };
  }
  const problems: RigProblem[] = [];
  const report = (where: readonly string[], message: string): void => {
    const { line, col } = lines.linePos(offsetOf(document.contents, where));
    problems.push({ line, column: col, message });
  };
  let content: unknown;
  try {
    content = document.toJS({ maxAliasCount: 0 });
  } catch {
    return { problems: [{ line: 1, column: 1, message: 'aliases (*name) are not allowed here' }] };
  }
  if (!validate(content)) {
    for (const error of validate.errors ?? []) {
      report(pointer(error), describe(error));
    }
    return { problems };
  }
  const rig = new RigBuilder(path, text, content as RigText, report).build();
  return problems.length > 0 ? { problems } : { rig, problems };
}

const validate = new Ajv2020({ allErrors: true, verbose: true }).compile(
  JSON.parse(readFileSync(join(packageRoot, 'server/session/rig/rig.schema.json'), 'utf8')),
);

function pointer(error: ErrorObject): string[] {
  const where = error.instancePath.split('/').slice(1);
  const key = error.params.additionalProperty ?? error.params.propertyName;
  if (typeof key === 'string') where.push(key);
  return where.map((part) => part.replace(/~1/g, '/').replace(/~0/g, '~'));
}

function describe(error: ErrorObject): string {
  const known = (error.parentSchema as { properties?: object } | undefined)?.properties;
  const wanted = (error.parentSchema as { description?: string } | undefined)?.description;
  switch (error.keyword) {
    case 'additionalProperties':
      return `unknown key \`${error.params.additionalProperty}\`: expected one of ${Object.keys(known ?? {}).join(', ')}`;
    case 'required':
      return `missing key \`${error.params.missingProperty}\``;
    case 'pattern':
      return `found \`${String(error.data)}\`: expected ${wanted ?? `text like ${error.params.pattern}`}`;
    case 'enum':
      return `found \`${String(error.data)}\`: expected ${(error.params.allowedValues as string[]).join(' or ')}`;
    case 'type':
      return error.params.type === 'object' ? 'expected lines below this key' : 'expected text';
    default:
      return error.message ?? error.keyword;
  }
}

/** Where the key or value at a path stands in the text. */
function offsetOf(root: Node | null, where: readonly string[]): number {
  let node: unknown = root;
  let offset = root?.range?.[0] ?? 0;
  for (const key of where) {
    if (!isMap(node)) break;
    const pair = node.items.find((item) => isScalar(item.key) && item.key.value === key);
    if (!pair) break;
    offset = (pair.key as Node).range?.[0] ?? offset;
    node = pair.value;
  }
  return offset;
}

/** Turns checked text into numbers, and reports what a schema cannot say. */
class RigBuilder {
  private readonly base: string;
  private readonly calibrated: Calibrated;

  constructor(
    private readonly path: string,
    private readonly text: string,
    private readonly file: RigText,
    private readonly report: Report,
  ) {
    this.base = dirname(resolve(path));
    this.calibrated = new Calibrated(join(this.base, this.calibrations), report);
  }

  private get calibrations(): string {
    return this.file.calibrations ?? 'calibrations';
  }

  build(): Rig {
    const { file, base } = this;
    const outputs = Object.entries(file.outputs).map(([name, output]) => this.output(name, output));
    this.noneTwice('inputs', file.inputs);
    this.noneTwice('outputs', file.outputs);
    const water = {
      perSessionNl: this.amount(file.water.per_session, 'volume'),
      perDayNl: this.amount(file.water.per_day, 'volume'),
      largestDropNl: this.amount(file.water.largest_drop, 'volume'),
    };
    if (water.perSessionNl > water.perDayNl) {
      this.report(['water', 'per_session'], 'more water a session than a day');
    }
    return {
      name: file.rig,
      port: file.board.port,
      baudRate: Number(file.board.baud ?? DEFAULT_BAUD),
      boardId: file.board.board_id === undefined ? undefined : Number(file.board.board_id),
      belt: this.belt(),
      lick: this.lick(),
      buttons: this.buttons(),
      inputs: Object.entries(file.inputs).map(([name, { line }]) => ({ name, line: Number(line) })),
      outputs,
      water,
      sync: this.sync(),
      loopback: this.loopback(),
      calibrationsFolder: join(base, this.calibrations),
      calibrations: this.calibrated.used.map((calibration) => ({
        calibration,
        source: `${this.calibrations}/${calibration.name}.json`,
      })),
      whenFull: file.record?.when_full ?? 'water stops',
      recordFolder: resolve(base, file.record?.folder ?? 'records'),
      rulesFolder: resolve(base, file.rules_folder ?? '.'),
      ...(file.animals === undefined ? {} : { animalsFolder: resolve(base, file.animals) }),
      ...(file.blinding && {
        blinding: {
          allocation: resolve(base, file.blinding.allocation),
          key: resolve(base, file.blinding.key),
        },
      }),
      cellFields: file.cell_fields ?? [],
      notify: this.notify(),
      viewersMayHold: file.viewers_may === 'hold stimulus',
      path: this.path,
      text: this.text,
    };
  }

  private amount(text: string, dimension: Dimension): number {
    // The schema's patterns let nothing else through.
    return parseQuantity(text, dimension)!;
  }

  private belt(): RigBelt {
    const { belt, inputs } = this.file;
    const stored = this.calibrated.belt(belt.calibration);
    if (belt.calibration !== undefined) {
      const { length, counts_per_cm, direction } = belt;
      this.calibrated.refuseBoth(['belt'], { length, counts_per_cm, direction });
      this.calibrated.refuseBoth(['belt', 'seam'], { offset: belt.seam?.offset });
    } else {
      for (const key of ['length', 'counts_per_cm'] as const) {
        if (belt[key] === undefined) this.report(['belt'], `missing key \`${key}\``);
      }
    }
    const lengthCm = stored?.lengthCm ?? this.amount(belt.length ?? '1 cm', 'length');
    const countsPerCm = stored?.countsPerCm ?? Number(belt.counts_per_cm ?? 1);
    if (lengthCm <= 0) this.report(['belt', 'length'], 'a belt must be longer than nothing');
    if (countsPerCm <= 0) this.report(['belt', 'counts_per_cm'], 'expected more than 0');
    const seam = belt.seam;
    if (seam && !(seam.input in inputs)) {
      this.report(['belt', 'seam', 'input'], `no input is called \`${seam.input}\``);
    }
    return {
      lengthCm,
      countsPerCm,
      toleranceCm: this.amount(belt.tolerance ?? '5 mm', 'length'),
      reversed: stored?.reversed ?? belt.direction === 'reversed',
      stillBelowCmPerS: this.amount(belt.still_below ?? '1 cm/s', 'speed'),
      speedWindowUs: this.amount(belt.speed_window ?? '200 ms', 'time'),
      hysteresisCm: this.amount(belt.hysteresis ?? '5 mm', 'length'),
      seam: seam && {
        line: Number(inputs[seam.input]?.line),
        offsetCm: stored?.offsetCm ?? this.amount(seam.offset ?? '0 cm', 'length'),
        warnCm: this.amount(seam.warn ?? '1 cm', 'length'),
        stopCm: this.amount(seam.stop ?? '3 cm', 'length'),
      },
    };
  }

  private lick(): RigLick | undefined {
    const sensors = Object.entries(this.file.inputs).filter(([, input]) => input.use === 'lick');
    if (sensors.length > 1) {
      this.report(['inputs', sensors[1]![0]], 'a second lick sensor: one spout has one');
    }
    const [name = '', sensor] = sensors[0] ?? [];
    const stored = this.calibrated.lick(name, sensor?.calibration);
    if (sensor?.calibration !== undefined) {
      const { lockout, stuck } = sensor;
      this.calibrated.refuseBoth(['inputs', name], { lockout, stuck });
    }
    return (
      sensor && {
        line: Number(sensor.line),
        lockoutUs: stored?.lockoutUs ?? this.amount(sensor.lockout ?? '50 ms', 'time'),
        stuckUs: stored?.stuckUs ?? this.amount(sensor.stuck ?? '1 s', 'time'),
        artefactUs: this.amount(sensor.artefact ?? '5 ms', 'time'),
      }
    );
  }

  private buttons(): RigButton[] {
    return Object.entries(this.file.inputs).flatMap(([name, input]) => {
      const { use, does, pressed } = input;
      if (use !== 'button') {
        for (const key of ['does', 'pressed', 'debounce', 'long_press'] as const) {
          if (input[key] !== undefined) this.report(['inputs', name, key], 'only of a button');
        }
        return [];
      }
      if (does === undefined) this.report(['inputs', name], 'a button needs to say what it `does`');
      return {
        ...{ name, line: Number(input.line), does: does ?? '', pressedHigh: pressed !== 'low' },
        debounceUs: this.amount(input.debounce ?? '30 ms', 'time'),
        longUs: this.amount(input.long_press ?? '500 ms', 'time'),
      };
    });
  }

  private notify(): RigNotify | undefined {
    const { notify } = this.file;
    if (notify === undefined) return undefined;
    const unknown = unknownNames(notify.body ?? '');
    if (unknown.length > 0) {
      const known = NOTICE_NAMES.join(', ');
      this.report(['notify', 'body'], `no name \`{${unknown[0]}}\`: expected one of ${known}`);
    }
    return {
      url: notify.url,
      from: notify.from ?? 'warn',
      body: notify.body,
      contentType: notify.content_type ?? 'application/json',
      mostPerMin: Number(notify.most_per_min ?? '6'),
    };
  }

  private output(name: string, output: OutputText): RigOutput {
    const where = ['outputs', name];
    const longestOnUs = this.amount(output.longest_on, 'time');
    const duty = output.duty?.split(/ of /);
    const { calibration } = output;
    const valve = this.valve(name, calibration);
    if (output.kind === 'valve' && calibration === undefined) {
      const more = `the name of one, its line, or \`${UNMEASURED}\` until it is measured`;
      this.report(where, `a valve needs its calibration: ${more}`);
    }
    if (calibration !== undefined && output.kind !== 'valve') {
      this.report([...where, 'calibration'], 'only a valve has a calibration');
    }
    if (output.masking && output.kind !== 'mark') {
      this.report([...where, 'masking'], 'only an output of kind mark can run in shams too');
    }
    if (valve && valve.deadUs + valve.mostNl * valve.usPerNl > longestOnUs) {
      this.report([...where, 'longest_on'], 'shorter than the largest calibrated drop takes');
    }
    return {
      name,
      line: Number(output.line),
      kind: output.kind,
      longestOnUs,
      leastGapUs: this.amount(output.least_gap ?? '0 ms', 'time'),
      leastTravelCm: this.amount(output.least_travel ?? '0 cm', 'length'),
      perSession: output.per_session === undefined ? undefined : Number(output.per_session),
      duty: duty && {
        share: this.amount(duty[0]!, 'number'),
        windowUs: this.amount(duty[1]!, 'time'),
      },
      idleHigh: output.idle === 'high',
      finishOnSilence: output.on_silence === 'finish',
      ...(output.masking === 'yes' ? { masking: true } : {}),
      evokesPlateau: output.evokes === 'plateau',
      valve,
    };
  }

  private valve(name: string, written: OutputText['calibration']): RigOutput['valve'] {
    if (written === undefined || written === UNMEASURED) return undefined;
    if (typeof written === 'string') return this.calibrated.valve(name, written);
    return {
      deadUs: this.amount(written.dead, 'time'),
      usPerNl: this.amount(written.per_uL, 'time') / 1_000,
      leastNl: this.amount(written.from, 'volume'),
      mostNl: this.amount(written.to, 'volume'),
    };
  }

  private loopback(): Rig['loopback'] {
    const { loopback, outputs, inputs } = this.file;
    if (loopback === undefined) return undefined;
    if (outputs[loopback.output]?.kind !== 'mark') {
      this.report(['loopback', 'output'], 'expected an output of kind mark');
    }
    if (!(loopback.input in inputs)) {
      this.report(['loopback', 'input'], `no input is called \`${loopback.input}\``);
    }
    return loopback;
  }

  private sync(): RigSync | undefined {
    const { sync, outputs } = this.file;
    if (!sync) return undefined;
    const output = outputs[sync.output];
    if (output?.kind !== 'mark') {
      this.report(['sync', 'output'], `expected an output of kind mark, found \`${sync.output}\``);
    }
    const widthUs = this.amount(sync.width, 'time');
    const leastGapUs = this.amount(sync.from, 'time');
    const mostGapUs = this.amount(sync.to, 'time');
    if (leastGapUs > mostGapUs) this.report(['sync', 'from'], 'longer than `to`');
    if (widthUs >= leastGapUs) this.report(['sync', 'width'], 'expected less than `from`');
    return { line: Number(output?.line), widthUs, leastGapUs, mostGapUs };
  }

  private noneTwice(section: string, entries: Readonly<Record<string, { line: string }>>): void {
    const seen = new Map<number, string>();
    for (const [name, { line }] of Object.entries(entries)) {
      const other = seen.get(Number(line));
      if (other) this.report([section, name, 'line'], `line ${line} is \`${other}\` already`);
      seen.set(Number(line), name);
      if (Number(line) > 15) this.report([section, name, 'line'], 'expected 0 to 15');
    }
  }
}

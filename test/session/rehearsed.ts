import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { SimulatedRig, type SimulatedRigOptions } from '../../hardware-sim/simulatedRig.js';
import { packageRoot } from '../../server/packageRoot.js';
import { compile } from '../../server/rules/engine/compile.js';
import { checkText } from '../../server/rules/readRules.js';
import type { SessionSetup } from '../../server/session/core/sessionCore.js';
import type { StampedDecision } from '../../server/session/decisions.js';
import type { RareInput } from '../../server/session/inputs.js';
import type { VirtualRig } from '../../server/session/rehearsal.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { factsOf, type Rig } from '../../server/session/rig/rig.js';
import type { SessionRecorder } from '../../server/session/runner.js';
import type { Sample } from '../../server/wire/messages.js';

/** The demo's rig file. */
export const demoRig: Rig = readRig(join(packageRoot, 'hardware-sim/demo/rig.yaml'));

/** A session of these rules on the demo's rig. */
export function setupOf(rulesText: string, seed = 'a seed', rig: Rig = demoRig): SessionSetup {
  const { file, problems } = checkText('rules.yaml', rulesText, factsOf(rig));
  if (file === undefined) throw new Error(problems.map(({ message }) => message).join('\n'));
  const program = compile(file, factsOf(rig));
  return { rig, program, title: file.title, seed, waterTodayNl: 0 };
}

/** A simulated rig wired as the demo's, in virtual time. */
export function virtualRig(
  options: SimulatedRigOptions = {},
): VirtualRig & { readonly simulated: SimulatedRig } {
  const simulated = new SimulatedRig({
    seed: 1,
    trained: true,
    valve: { deadUs: 8_000, usPerUl: 12_000 },
    ...options,
    belt: { countsPerCm: 25, ...options.belt },
  });
  return {
    simulated,
    get nowUs() {
      return simulated.nowUs;
    },
    advanceTo: (us) => simulated.advanceTo(us),
    connect: (listener) => simulated.board.connect(listener),
    receive: (name, message, tag) => simulated.board.receive(name, message, tag),
  };
}

export type KeptInput = { readonly kind: 'sample'; readonly message: Sample } | RareInput;

/** Keeps everything that a session's runner would record. */
export class KeepAll implements SessionRecorder {
  readonly inputs: KeptInput[] = [];
  readonly said: string[] = [];
  readonly decisions: StampedDecision[] = [];

  sample(_input: number, message: Sample): void {
    this.inputs.push({ kind: 'sample', message: { ...message } });
  }
  input(_input: number, what: RareInput): void {
    this.inputs.push(structuredClone(what));
  }
  command(input: number, name: string, message: object): void {
    this.said.push(`${input} ${name} ${JSON.stringify(message)}`);
  }
  decision(decision: StampedDecision): void {
    this.decisions.push(decision);
    this.said.push(`${decision.input} ${JSON.stringify(decision)}`);
  }
  batchEnd(): void {}
}

/** A folder for one test, removed by the returned function. */
export function scratchFolder(): { folder: string; remove(): void } {
  const folder = mkdtempSync(join(tmpdir(), 'lapwing-session-'));
  return { folder, remove: () => rmSync(folder, { recursive: true, force: true }) };
}
